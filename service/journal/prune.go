package journal

import (
	"context"
	"fmt"
	"slices"
	"time"
)

// Retention says what Prune may take away. The zero Retention takes nothing.
type Retention struct {
	// Before is the time from which on everything is kept: a block goes only
	// if all its entries are older.
	Before time.Time
	// KeepKinds are kinds whose newest entry is kept whatever its age.
	// KindDurable is always among them.
	KeepKinds []string
	// DropLists lets the texts of pruned blocks go too, but for KeepLists,
	// which names those still in use: a text is recorded once, and what uses
	// it may be far younger. Texts that came with an Append since Open are
	// kept, recorded before or not.
	DropLists bool
	KeepLists []string
}

// Pruned is what Prune took away.
type Pruned struct {
	Blocks  int
	Entries uint64
	Lists   int
}

// pruneBlocks is how many blocks go in one transaction, so that the writer
// never waits long.
const pruneBlocks = 200

// Prune takes the entries out of old blocks and leaves their digests. Neither
// the newest durable entry nor anything after it goes; without a durable entry
// nothing does. What goes is proved first: a damaged block is evidence, ends
// the pruning with its *Damage and stays. The space is used again by what
// comes.
func (j *Journal) Prune(ctx context.Context, keep Retention) (Pruned, error) {
	var gone Pruned
	if keep.Before.IsZero() {
		return gone, nil
	}
	durable, ok, err := j.LastOf(ctx, KindDurable)
	if err != nil || !ok {
		return gone, err
	}
	spare, err := j.newestOf(ctx, keep.KeepKinds)
	if err != nil {
		return gone, err
	}
	limit, err := j.one(ctx, `b.first <= ? AND b.last >= ?`, int64(durable.Seq), int64(durable.Seq))
	if err != nil || limit == nil {
		return gone, j.failed("pruning the record", err)
	}
	after := int64(0)
	for {
		page, err := j.page(ctx, `b.body IS NOT NULL AND b.first > ? AND b.first < ? AND b.at_max < ?`,
			fmt.Sprintf(`b.first LIMIT %d`, pruneBlocks), after, int64(limit.first), keep.Before.UnixMicro())
		if err != nil {
			return gone, j.failed("pruning the record", err)
		}
		if len(page) == 0 {
			break
		}
		after = int64(page[len(page)-1].first)
		page = slices.DeleteFunc(page, func(b *block) bool { return slices.Contains(spare, b.first) })
		if err := j.pruneSome(ctx, page, &gone); err != nil {
			return gone, err
		}
	}
	if keep.DropLists {
		err = j.pruneLists(ctx, keep.KeepLists, &gone)
	}
	return gone, err
}

func (j *Journal) newestOf(ctx context.Context, names []string) ([]uint64, error) {
	kinds, err := readKinds(ctx, j.db)
	if err != nil {
		return nil, j.failed("pruning the record", err)
	}
	var firsts []uint64
	for _, name := range names {
		firsts = append(firsts, kinds[name].newest)
	}
	return firsts, nil
}

// pruneSome proves and prunes a page in one transaction.
func (j *Journal) pruneSome(ctx context.Context, page []*block, gone *Pruned) error {
	type row struct {
		b       *block
		content Digest
	}
	var rows []row
	for _, b := range page {
		content := b.prev
		err := j.each(b, func(_ Entry, c Digest) error {
			content = c
			return nil
		})
		if err != nil {
			return err
		}
		rows = append(rows, row{b, content})
	}
	j.writing.Lock()
	defer j.writing.Unlock()
	if j.isClosed() {
		return ErrClosed
	}
	var done Pruned
	err := j.store.transact(ctx, "prune", func() error {
		for _, x := range rows {
			_, err := j.store.conn.ExecContext(ctx, `UPDATE block SET body = NULL, content = ? WHERE first = ?`, x.content[:], int64(x.b.first))
			if err != nil {
				return err
			}
			done.Blocks++
			done.Entries += uint64(x.b.count)
		}
		return nil
	})
	if err != nil {
		return storeError("pruning the record", err)
	}
	gone.Blocks += done.Blocks
	gone.Entries += done.Entries
	return nil
}

func (j *Journal) isClosed() bool {
	j.mu.Lock()
	defer j.mu.Unlock()
	return j.closed
}
