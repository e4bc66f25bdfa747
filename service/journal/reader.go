package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"golang.org/x/sys/unix"
)

// Reader reads what is durable, also while another process writes. It is safe
// for concurrent use. Whatever it gives out has been checked against the chain.
type Reader struct {
	name     string // of the file for the driver, without query_only
	db       *sql.DB
	codec    *codec
	faults   func(op string) error
	onDamage func(*Damage)
}

// OpenReader opens the record in dir for reading only, whether or not a
// service has it open. On a medium that cannot be written it reads as well.
func OpenReader(dir string) (*Reader, error) {
	path, err := filepath.Abs(filepath.Join(dir, File))
	if err != nil {
		return nil, fmt.Errorf("opening the record in %s: %w", dir, err)
	}
	info, err := os.Stat(path)
	if err != nil {
		return nil, fmt.Errorf("opening the record %s: %w: give the data_dir of the service", path, bare(err))
	}
	if info.Size() == 0 {
		return nil, fmt.Errorf("opening the record %s: it is empty", path)
	}
	mode := "rw"
	if unix.Access(dir, unix.W_OK) != nil || unix.Access(path, unix.W_OK) != nil {
		mode = "ro"
	}
	r, err := newReader(path, mode, func(string) error { return nil })
	if err != nil {
		return nil, err
	}
	app, version, err := identify(context.Background(), r.db)
	if err == nil {
		err = foreign(path, app, version)
	}
	if err != nil {
		_ = r.Close()
		return nil, r.failed("opening the record", err)
	}
	return r, nil
}

// readConns is how many reads may go on at once.
const readConns = 4

func newReader(path, mode string, fault func(string) error) (*Reader, error) {
	name := dsn(path, mode)
	if _, err := os.Stat(path + "-wal"); mode == "ro" && err != nil {
		// Nothing can be in a log that is not there, and without a writable
		// folder SQLite could not make the files that it shares with a writer.
		name += "&immutable=1"
	}
	db, err := sql.Open("sqlite", name+"&_pragma=query_only(1)")
	if err != nil {
		return nil, storeError("opening the record", err)
	}
	db.SetMaxOpenConns(readConns)
	c, err := newCodec()
	if err != nil {
		_ = db.Close()
		return nil, err
	}
	return &Reader{name: name, db: db, codec: c, faults: fault, onDamage: func(*Damage) {}}, nil
}

// Close lets go of the file.
func (r *Reader) Close() error {
	r.codec.close()
	if err := r.db.Close(); err != nil {
		return storeError("closing the record", err)
	}
	return nil
}

func (r *Reader) fault(op string) error { return r.faults(op) }

// failed names an error of the store, and passes on what it says about damage.
func (r *Reader) failed(op string, err error) error {
	if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return fmt.Errorf("%s: %w", op, err)
	}
	if d := damageOf(err); d != nil {
		return r.damaged(d)
	}
	return storeError(op, err)
}

func (r *Reader) damaged(d *Damage) error {
	if d.Mend == "" {
		d.Mend = mendDamage
	}
	r.onDamage(d)
	return d
}

// LastOf finds the newest entry of a kind; false when there is none.
func (r *Reader) LastOf(ctx context.Context, kind string) (Entry, bool, error) {
	b, newest, err := r.blockOf(ctx, kind)
	if err != nil {
		return Entry{}, false, r.failed("looking for the newest "+kind, err)
	}
	if newest == 0 {
		return Entry{}, false, nil
	}
	if b == nil {
		return Entry{}, false, r.damaged(&Damage{First: newest, Last: newest, What: "the block with the newest " + kind + " is missing"})
	}
	var found Entry
	err = r.each(b, func(e Entry, _ Digest) error {
		if e.Kind == kind {
			found = e
		}
		return nil
	})
	if err == nil && found.Seq == 0 {
		err = r.damaged(&Damage{First: b.first, Last: b.last, What: "the block holds no " + kind + ", which its index says"})
	}
	return found, err == nil, err
}

// blockOf reads the block that the index names for a kind, and its number, 0
// where the kind never came. Both are of one instant: a moment later the block
// may be pruned for a newer one.
func (r *Reader) blockOf(ctx context.Context, kind string) (*block, uint64, error) {
	if err := r.fault("read"); err != nil {
		return nil, 0, err
	}
	tx, err := r.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return nil, 0, err
	}
	defer func() { _ = tx.Rollback() }()
	var newest int64
	err = tx.QueryRowContext(ctx, `SELECT newest FROM kind WHERE name = ?`, kind).Scan(&newest)
	if errors.Is(err, sql.ErrNoRows) {
		return nil, 0, nil
	}
	if err != nil {
		return nil, 0, err
	}
	blocks, err := pageOf(ctx, tx, `b.first = ?`, `b.first LIMIT 1`, newest)
	if err != nil || len(blocks) == 0 {
		return nil, uint64(newest), err
	}
	return blocks[0], uint64(newest), nil
}

// Last is the newest durable entry; false when there is none.
func (r *Reader) Last(ctx context.Context) (Entry, bool, error) {
	b, err := r.newest(ctx)
	if err != nil || b == nil {
		return Entry{}, false, err
	}
	var last Entry
	err = r.each(b, func(e Entry, _ Digest) error {
		last = e
		return nil
	})
	return last, err == nil, err
}

// Head is the number of the newest durable entry and the digest that vouches
// for everything up to it; zero for an empty record. Written down elsewhere,
// it proves later that nothing before it was changed.
func (r *Reader) Head(ctx context.Context) (uint64, Digest, error) {
	b, err := r.newest(ctx)
	if err != nil || b == nil {
		return 0, Digest{}, err
	}
	return b.last, b.digest, nil
}

func (r *Reader) newest(ctx context.Context) (*block, error) {
	e, err := r.end(ctx)
	return e.last, err
}

// end is how the record ends: the newest block, nil in an empty record, and
// what the index says of the kinds, both of one instant.
type end struct {
	last         *block
	kinds        map[string]kindRow
	blocks, cuts int
}

// end reads how the record ends. Every block has kinds, and the index names
// the newest block of each kind: so the index vouches for the end, which the
// chain cannot do.
func (r *Reader) end(ctx context.Context) (end, error) {
	const op = "reading the end of the record"
	if err := r.fault("read"); err != nil {
		return end{}, r.failed(op, err)
	}
	tx, err := r.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return end{}, r.failed(op, err)
	}
	defer func() { _ = tx.Rollback() }()
	var e end
	newest, err := pageOf(ctx, tx, `b.first = (SELECT max(first) FROM block)`, `b.first LIMIT 1`)
	if err == nil {
		e.kinds, err = readKinds(ctx, tx)
	}
	if err != nil {
		return end{}, r.failed(op, err)
	}
	first := uint64(0)
	if len(newest) > 0 {
		e.last = newest[0]
		first = e.last.first
	}
	named := uint64(0)
	for _, k := range e.kinds {
		named = max(named, k.newest)
	}
	if named != first {
		return end{}, r.damaged(&Damage{First: first, Last: named,
			What: fmt.Sprintf("the newest block is %d and the index says %d: the end is missing", first, named)})
	}
	return e, nil
}

// counts adds how many blocks there are, for whoever shows progress.
func (r *Reader) counts(ctx context.Context, e *end) error {
	err := r.db.QueryRowContext(ctx, `SELECT (SELECT count(*) FROM block), (SELECT count(*) FROM cut)`).Scan(&e.blocks, &e.cuts)
	if err != nil {
		return r.failed("counting the blocks of the record", err)
	}
	return nil
}
