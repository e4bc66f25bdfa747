package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"path/filepath"
)

// Backup writes a whole copy of what is durable into a new file, which it
// never puts in the place of another, and proves the copy's end against the
// record. A restore is a new data_dir (mode 0700) with this file in it, named
// record.db. The service may go on meanwhile.
func (r *Reader) Backup(ctx context.Context, path string) (err error) {
	path, err = filepath.Abs(path)
	if err != nil {
		return fmt.Errorf("backing up the record: %w", err)
	}
	if _, err := os.Lstat(path); err == nil {
		return fmt.Errorf("backing up the record: %s is there already: choose a new name", path)
	}
	part := path + ".part"
	// Left over from a backup that was broken off.
	if err := os.Remove(part); err != nil && !errors.Is(err, os.ErrNotExist) {
		return fmt.Errorf("backing up the record: removing %s: %w", part, bare(err))
	}
	f, err := os.OpenFile(part, os.O_CREATE|os.O_EXCL|os.O_RDWR, 0o600)
	if err != nil {
		return fmt.Errorf("backing up the record: making %s: %w: choose a folder that this user can write", part, bare(err))
	}
	defer func() {
		_ = f.Close()
		if err != nil {
			_ = os.Remove(part)
		}
	}()
	seq, head, err := r.Head(ctx)
	if err != nil {
		return err
	}
	if err := r.vacuumInto(ctx, part); err != nil {
		return err
	}
	if err := errors.Join(f.Sync(), proveCopy(ctx, part, seq, head)); err != nil {
		return fmt.Errorf("backing up the record: checking the copy: %w", err)
	}
	// Link, unlike rename, never replaces.
	if err := os.Link(part, path); err != nil {
		return fmt.Errorf("backing up the record: naming the copy %s: %w", path, err)
	}
	if err := errors.Join(os.Remove(part), syncDir(filepath.Dir(path))); err != nil {
		return fmt.Errorf("backing up the record: %w", err)
	}
	return nil
}

// vacuumInto needs a connection of its own, since the others may not write.
func (r *Reader) vacuumInto(ctx context.Context, path string) error {
	if err := r.fault("read"); err != nil {
		return r.failed("backing up the record", err)
	}
	db, err := sql.Open("sqlite", r.name)
	if err != nil {
		return storeError("backing up the record", err)
	}
	defer db.Close()
	if _, err := db.ExecContext(ctx, `VACUUM INTO ?`, path); err != nil {
		return r.failed("backing up the record", err)
	}
	return nil
}

// proveCopy checks that the copy holds the record's block that ended with seq,
// and that this block and the copy's last one prove themselves.
func proveCopy(ctx context.Context, path string, seq uint64, head Digest) error {
	c, err := newReader(path, "ro", func(string) error { return nil })
	if err != nil {
		return err
	}
	defer c.Close()
	if seq == 0 {
		return nil
	}
	for _, where := range []string{`b.last = ?`, `b.first = (SELECT max(first) FROM block) AND ? > 0`} {
		b, err := c.one(ctx, where, int64(seq))
		if err != nil {
			return err
		}
		if b == nil || (b.last == seq && b.digest != head) {
			return errChain
		}
		if err := b.prove(c.codec, nil); err != nil {
			return err
		}
	}
	return nil
}
