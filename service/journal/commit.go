package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
)

// commit writes the blocks as one transaction behind the block whose digest is
// prev, and returns once they are on disk. It opens the file where need be; on
// error it closes it, and nothing or everything was written: the next call
// with the same blocks finds out which.
func (s *store) commit(ctx context.Context, prev Digest, blocks []*sealed) (err error) {
	defer func() {
		if err != nil {
			s.close()
		}
	}()
	if err := s.ready(ctx); err != nil {
		return err
	}
	if err := s.begin(ctx); err != nil {
		return err
	}
	digest, err := s.headDigest(ctx)
	switch {
	case err != nil:
		return err
	case digest == blocks[len(blocks)-1].digest:
		// The call before got its transaction through and was told otherwise.
		_, err := s.conn.ExecContext(ctx, `ROLLBACK`)
		return err
	case digest != prev:
		return &Damage{What: "another program wrote to the record", Mend: mendDamage}
	}
	kinds := map[string]kindRow{}
	for _, b := range blocks {
		if err := s.write(ctx, b, kinds); err != nil {
			return err
		}
	}
	if err := s.end(ctx); err != nil {
		return err
	}
	for name, k := range kinds {
		s.kinds[name] = k
	}
	return nil
}

// ready has the file open, and open under its own name.
func (s *store) ready(ctx context.Context) error {
	if s.conn == nil {
		return s.open(ctx)
	}
	info, err := os.Stat(s.path)
	if err != nil || !os.SameFile(s.info, info) {
		return errMoved
	}
	return nil
}

func (s *store) begin(ctx context.Context) error {
	if err := s.fault("begin"); err != nil {
		return err
	}
	_, err := s.conn.ExecContext(ctx, `BEGIN IMMEDIATE`)
	return err
}

// end commits. The fault "committed" stands for a transaction that went
// through while its caller was told that it did not.
func (s *store) end(ctx context.Context) error {
	if err := s.fault("commit"); err != nil {
		return err
	}
	if _, err := s.conn.ExecContext(ctx, `COMMIT`); err != nil {
		return err
	}
	return s.fault("committed")
}

// headDigest is the digest of the newest block, zero when there is none.
func (s *store) headDigest(ctx context.Context) (Digest, error) {
	var last uint64
	var b []byte
	err := s.head.QueryRowContext(ctx).Scan(&last, &b)
	if errors.Is(err, sql.ErrNoRows) {
		return Digest{}, nil
	}
	if err != nil {
		return Digest{}, err
	}
	var d Digest
	if copy(d[:], b) != len(d) || len(b) != len(d) {
		return Digest{}, &Damage{First: last, Last: last, What: "the newest block's digest has the wrong length", Mend: mendDamage}
	}
	return d, nil
}

// write inserts one block, its texts before it, and notes in kinds which kinds
// are newest there.
func (s *store) write(ctx context.Context, b *sealed, kinds map[string]kindRow) error {
	var mask uint64
	for _, name := range b.kinds {
		k, known := kinds[name]
		if !known {
			k, known = s.kinds[name]
		}
		stmt, args := s.oldKind, []any{int64(b.first), k.id}
		if !known {
			k.id = s.nextKind(kinds)
			stmt, args = s.newKind, []any{k.id, name, int64(b.first)}
		}
		if _, err := stmt.ExecContext(ctx, args...); err != nil {
			return err
		}
		k.newest = b.first
		kinds[name] = k
		mask |= k.bit()
	}
	for _, l := range b.blobs {
		if err := s.fault("list"); err != nil {
			return err
		}
		if _, err := s.list.ExecContext(ctx, int64(b.first), l.digest, l.sum[:], l.size, l.packed); err != nil {
			return err
		}
	}
	if err := s.fault("block"); err != nil {
		return err
	}
	_, err := s.insert.ExecContext(ctx, int64(b.first), int64(b.last), b.count, b.atMin, b.atMax,
		int64(mask), len(b.lists), b.size, b.digest[:], b.body)
	if err != nil {
		return fmt.Errorf("block %d: %w", b.first, err)
	}
	return nil
}

// nextKind is the lowest id above all in use, those of this transaction
// included.
func (s *store) nextKind(kinds map[string]kindRow) int64 {
	id := int64(0)
	for _, m := range []map[string]kindRow{s.kinds, kinds} {
		for _, k := range m {
			id = max(id, k.id+1)
		}
	}
	return id
}

// transact runs do between BEGIN and COMMIT, opening the file where need be
// and closing it on error.
func (s *store) transact(ctx context.Context, op string, do func() error) (err error) {
	defer func() {
		if err != nil {
			s.close()
		}
	}()
	if err := s.ready(ctx); err != nil {
		return err
	}
	if err := s.fault(op); err != nil {
		return err
	}
	if err := s.begin(ctx); err != nil {
		return err
	}
	if err := do(); err != nil {
		return err
	}
	return s.end(ctx)
}
