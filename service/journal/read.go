package journal

import (
	"context"
	"database/sql"
	"errors"
	"slices"
	"time"
)

// Query says which entries to read. The zero Query is all of them.
type Query struct {
	From, To     uint64    // numbers, both included; To 0: to the end
	Since, Until time.Time // times of entries, [Since, Until); zero: without bound
	Kinds        []string  // none: every kind
	NewestFirst  bool

	// Pruned is told of each block whose entries are gone. Without it such a
	// block ends the reading with a *PrunedError.
	Pruned func(first, last uint64, count int) error
}

// ErrStop, returned by the function that takes the entries, ends a reading
// without an error.
var ErrStop = errors.New("stop reading")

const pageBlocks = 256

// Read gives the durable entries that match, in order, to yield, whose error
// it returns. A block that does not match its digest ends it with a *Damage
// before any of its entries is given out.
func (r *Reader) Read(ctx context.Context, q Query, yield func(Entry) error) error {
	err := r.blocks(ctx, q, func(b *block) error {
		if b.body == nil && q.Pruned != nil {
			return errors.Join(r.pruned(b), q.Pruned(b.first, b.last, b.count))
		}
		return r.entries(b, q, yield)
	})
	if errors.Is(err, ErrStop) {
		return nil
	}
	return err
}

// pruned proves a block without entries.
func (r *Reader) pruned(b *block) error {
	err := r.each(b, func(Entry, Digest) error { return nil })
	var p *PrunedError
	if errors.As(err, &p) {
		return nil
	}
	return err
}

func (r *Reader) entries(b *block, q Query, yield func(Entry) error) error {
	if !q.NewestFirst {
		return r.each(b, func(e Entry, _ Digest) error {
			if !q.wants(e) {
				return nil
			}
			return yield(e)
		})
	}
	var found []Entry
	err := r.each(b, func(e Entry, _ Digest) error {
		if q.wants(e) {
			found = append(found, e)
		}
		return nil
	})
	if err != nil {
		return err
	}
	for _, e := range slices.Backward(found) {
		if err := yield(e); err != nil {
			return err
		}
	}
	return nil
}

func (q *Query) wants(e Entry) bool {
	switch {
	case e.Seq < q.From, q.To != 0 && e.Seq > q.To:
		return false
	case !q.Since.IsZero() && e.At.Before(q.Since), !q.Until.IsZero() && !e.At.Before(q.Until):
		return false
	}
	return len(q.Kinds) == 0 || slices.Contains(q.Kinds, e.Kind)
}

// blocks shows each block that may hold an entry that q wants.
func (r *Reader) blocks(ctx context.Context, q Query, see func(*block) error) error {
	const op = "reading the record"
	if err := r.fault("read"); err != nil {
		return r.failed(op, err)
	}
	where, args, some, err := r.bounds(ctx, &q)
	if err != nil {
		return r.failed(op, err)
	}
	if !some {
		return nil
	}
	where += ` AND b.first >= ? AND b.first <= ?`
	lo, hi := int64(0), int64(1<<63-1)
	order := `b.first LIMIT 256`
	if q.NewestFirst {
		order = `b.first DESC LIMIT 256`
	}
	for {
		page, err := r.page(ctx, where, order, append(slices.Clone(args), lo, hi)...)
		if err != nil {
			return r.failed(op, err)
		}
		for _, b := range page {
			if err := ctx.Err(); err != nil {
				return r.failed(op, err)
			}
			if err := see(b); err != nil {
				return err
			}
		}
		if len(page) < pageBlocks {
			return nil
		}
		if end := int64(page[len(page)-1].first); q.NewestFirst {
			hi = end - 1
		} else {
			lo = end + 1
		}
	}
}

// bounds turns q into a condition on blocks; some is false where nothing can
// match.
func (r *Reader) bounds(ctx context.Context, q *Query) (where string, args []any, some bool, err error) {
	where = `b.last >= ?`
	args = []any{clamp(q.From)}
	if q.From > 0 {
		// The condition on last alone would walk all blocks before.
		where += ` AND b.first >= ifnull((SELECT max(first) FROM block WHERE first <= ?), 0)`
		args = append(args, clamp(q.From))
	}
	if q.To != 0 {
		where += ` AND b.first <= ?`
		args = append(args, clamp(q.To))
	}
	if !q.Since.IsZero() || !q.Until.IsZero() {
		since, until := int64(-1<<63), int64(1<<63-1)
		slack := until
		if !q.Since.IsZero() {
			since = q.Since.UnixMicro()
		}
		if !q.Until.IsZero() {
			until = q.Until.UnixMicro()
			// No block spans more than twice maxBlockSpan.
			slack = until + (2 * maxBlockSpan).Microseconds()
		}
		var lo, hi sql.NullInt64
		row := r.db.QueryRowContext(ctx, `SELECT min(first), max(first) FROM block WHERE at_max >= ? AND at_max <= ? AND at_min <= ?`, since, slack, until)
		if err := row.Scan(&lo, &hi); err != nil {
			return "", nil, false, err
		}
		if !lo.Valid {
			return "", nil, false, nil
		}
		where += ` AND b.first BETWEEN ? AND ? AND b.at_max >= ? AND b.at_min <= ?`
		args = append(args, lo.Int64, hi.Int64, since, until)
	}
	if len(q.Kinds) == 0 {
		return where, args, true, nil
	}
	kinds, err := readKinds(ctx, r.db)
	if err != nil {
		return "", nil, false, err
	}
	var mask uint64
	for _, name := range q.Kinds {
		if k, known := kinds[name]; known {
			mask |= k.bit()
		}
	}
	where += ` AND b.kinds & ? != 0`
	return where, append(args, int64(mask)), mask != 0, nil
}

func clamp(seq uint64) int64 { return int64(min(seq, 1<<63-1)) }
