package journal

import (
	"context"
	"errors"
	"fmt"
)

// Cut is a torn last block that Open took off. What it held is not on record
// any more, holds and lists included; the row is kept in the table cut.
type Cut struct {
	First, Last uint64 // as the row said, which may itself be torn
	Why         string
}

// String is the notice for operators.
func (c *Cut) String() string {
	return fmt.Sprintf("the record's last block, entries %d to %d, was torn and is cut off: %s: place again what was placed at its time", c.First, c.Last, c.Why)
}

// Cut is what Open had to take off the end of the record; nil when nothing.
func (j *Journal) Cut() *Cut { return j.cut }

// restore takes up the chain at the end of the file. It checks all that a
// restart reads: from the block with the newest durable entry to the end, or
// everything where there is none. Its error is *Damage, or the store's.
func (j *Journal) restore(ctx context.Context) error {
	e, err := j.end(ctx)
	if err != nil {
		return j.restoreHead(ctx, err)
	}
	last := e.last
	if last == nil {
		return nil
	}
	if err := last.prove(j.codec, nil); err != nil {
		if last, err = j.cutLast(ctx, last, err); err != nil || last == nil {
			return err
		}
	}
	j.head = last.digest
	j.durable, j.queued = last.last, last.last
	if err := j.knowLists(ctx); err != nil {
		return err
	}
	return j.checkTail(ctx)
}

// restoreHead takes up the chain at the last block that is there, for a record
// whose end is missing, so that the record can go on behind the damage. How
// many entries the missing blocks held is not known; the numbers of one full
// block are left out, so that no number is likely to be used twice.
func (j *Journal) restoreHead(ctx context.Context, why error) error {
	last, err := j.one(ctx, `b.first = (SELECT max(first) FROM block)`)
	if err != nil || last == nil {
		return why
	}
	var d *Damage
	if errors.As(why, &d) {
		j.queued = min(d.Last, 1<<62) + MaxBlockEntries
	}
	j.head, j.durable = last.digest, last.last
	j.queued = max(j.queued, last.last)
	return why
}

// cutLast takes off a last block that does not prove itself, provided that the
// one before does. It returns the new last block.
func (j *Journal) cutLast(ctx context.Context, last *block, why error) (*block, error) {
	// The numbers in a torn row are not to be trusted, but the engine must not
	// use one of them again.
	j.queued = max(last.first, last.last) & (1<<63 - 1)
	j.head, j.durable = last.digest, j.queued
	before, err := j.one(ctx, `first = (SELECT max(first) FROM block WHERE first < ?)`, int64(last.first))
	if err != nil {
		return nil, err
	}
	if before != nil {
		if err := before.prove(j.codec, nil); err != nil {
			return nil, &Damage{First: before.first, Last: last.last, Mend: mendDamage,
				What: fmt.Sprintf("the last two blocks do not match their digests: %v; %v", err, why)}
		}
	}
	if err := j.store.cut(ctx, last, why.Error(), j.clock.Wall().UnixMicro()); err != nil {
		return nil, err
	}
	j.cut = &Cut{First: last.first, Last: last.last, Why: why.Error()}
	j.head, j.durable, j.queued = Digest{}, 0, 0
	return before, nil
}

// cut moves the block into the table cut, with its texts dropped, and points
// the kinds at the blocks that now are newest.
func (s *store) cut(ctx context.Context, b *block, why string, at int64) (err error) {
	defer func() {
		if err != nil {
			_, _ = s.conn.ExecContext(ctx, `ROLLBACK`)
		}
	}()
	if err := s.begin(ctx); err != nil {
		return err
	}
	first := int64(b.first)
	for _, q := range []struct {
		text string
		args []any
	}{
		{`INSERT INTO cut (at, why, first, last, count, size, digest, body) SELECT ?, ?, first, last, count, size, digest, body FROM block WHERE first = ?`, []any{at, why, first}},
		{`DELETE FROM block WHERE first = ?`, []any{first}},
		{`DELETE FROM list WHERE block = ?`, []any{first}},
		{`UPDATE kind SET newest = ifnull((SELECT max(first) FROM block WHERE kinds & (1 << min(id, 63)) != 0), 0) WHERE newest = ?`, []any{first}},
		{`DELETE FROM kind WHERE newest = 0`, nil},
	} {
		if _, err := s.conn.ExecContext(ctx, q.text, q.args...); err != nil {
			return err
		}
	}
	if err := s.end(ctx); err != nil {
		return err
	}
	s.kinds, err = readKinds(ctx, s.conn)
	return err
}

// knowLists loads the sums of all texts that are on record and not pruned.
func (j *Journal) knowLists(ctx context.Context) error {
	rows, err := j.db.QueryContext(ctx, `SELECT digest, sum FROM list WHERE text IS NOT NULL`)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() {
		var name string
		var sum []byte
		if err := rows.Scan(&name, &sum); err != nil {
			return err
		}
		var d Digest
		if copy(d[:], sum) != len(d) || len(sum) != len(d) {
			return &Damage{What: "the sum of list " + name + " has the wrong length", Mend: mendDamage}
		}
		j.lists[name] = d
	}
	return rows.Err()
}

// checkTail proves every block that a restart reads, newest first, down to one
// with a durable entry, and that the index names that one.
func (j *Journal) checkTail(ctx context.Context) error {
	kinds, err := readKinds(ctx, j.db)
	if err != nil {
		return err
	}
	var found uint64
	err = j.blocks(ctx, Query{NewestFirst: true}, func(b *block) error {
		if b.body == nil {
			return &Damage{First: b.first, Last: b.last, What: "entries that a restart needs are pruned", Mend: mendDamage}
		}
		err := j.each(b, func(e Entry, _ Digest) error {
			if e.Kind == KindDurable {
				found = b.first
			}
			return nil
		})
		if err == nil && found != 0 {
			return ErrStop
		}
		return err
	})
	if err != nil && !errors.Is(err, ErrStop) {
		return err
	}
	if named := kinds[KindDurable].newest; named != found {
		return &Damage{First: found, Last: found, Mend: mendDamage,
			What: fmt.Sprintf("the newest durable entry is in block %d and the index says %d", found, named)}
	}
	return nil
}
