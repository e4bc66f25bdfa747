package journal

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"sync"
	"time"
)

// Clock is what the journal needs of the service's clock.
type Clock interface {
	// Boot is the time since boot, counting suspend.
	Boot() time.Duration
	// Wall is UTC; it stamps what is cut off.
	Wall() time.Time
	// AfterFunc calls f after d unless stopped before.
	AfterFunc(d time.Duration, f func()) (stop func() bool)
}

// Options say where and how. The zero value of a bound is its default.
type Options struct {
	Dir   string // data_dir; made with mode 0700 where it is missing
	Clock Clock

	Capacity int           // bytes that may wait for the store, the reserve included; 64 MiB
	Reserve  int           // of these, what is left for the engine's own entries once intake refuses; 1 MiB
	BlockAge time.Duration // an entry waits at most so long for others; 100 ms

	// Fault, where set, is called before each step of the store ("open",
	// "begin", "list", "block", "commit", "prune", "read") and, as
	// "committed", after a commit. An error from it counts as the store's. It
	// is for tests, which may also be slow in it.
	Fault func(op string) error
}

func (o *Options) complete() error {
	switch {
	case o.Dir == "":
		return errors.New("opening the record: no data_dir is set")
	case o.Clock == nil:
		return errors.New("opening the record: no clock is given")
	}
	if o.Capacity == 0 {
		o.Capacity = 64 << 20
	}
	if o.Reserve == 0 {
		o.Reserve = min(1<<20, o.Capacity/4)
	}
	if o.BlockAge == 0 {
		o.BlockAge = 100 * time.Millisecond
	}
	if o.Capacity < 0 || o.Reserve < 0 || o.Reserve > o.Capacity/2 || o.BlockAge < 0 {
		return fmt.Errorf("opening the record: capacity %d, reserve %d and block age %v do not go together", o.Capacity, o.Reserve, o.BlockAge)
	}
	if o.Fault == nil {
		o.Fault = func(string) error { return nil }
	}
	return nil
}

// Journal is the record, open for writing. Its methods are safe for concurrent
// use. The embedded Reader sees what is durable.
type Journal struct {
	*Reader
	opt   Options
	clock Clock
	lock  *os.File
	wake  chan struct{} // to Run: something may be ripe

	writing sync.Mutex // held while the store is used; taken before mu
	store   *store
	head    Digest    // of the newest block known to be on disk
	sealed  []*sealed // what taken became
	cut     *Cut

	mu        sync.Mutex
	queue     queue
	taken     []*pending // by the writer, until they are durable
	durable   uint64
	queued    uint64
	lists     map[string]Digest // sums of the texts on record or queued
	named     map[string]bool   // digests that came with an Append since Open
	lost      []run
	err       error
	failures  uint64
	damage    *Damage
	closed    bool
	ended     bool // Run has returned
	armed     bool // a timer will wake Run
	news      chan struct{}
	listeners map[chan<- struct{}]int
}

// Open takes hold of the record in opt.Dir, making an empty one where there is
// none. It fails for what must be mended before a start: a folder that others
// can reach, that is in use or not writable, a file of something else. A
// record that is damaged is opened, with State.Damage set.
func Open(opt Options) (*Journal, error) {
	if err := opt.complete(); err != nil {
		return nil, err
	}
	dir, err := filepath.Abs(opt.Dir)
	if err != nil {
		return nil, fmt.Errorf("opening the record in %s: %w", opt.Dir, err)
	}
	if err := prepareDir(dir); err != nil {
		return nil, err
	}
	held, err := lock(dir)
	if err != nil {
		return nil, err
	}
	j, err := open(opt, filepath.Join(dir, File))
	if err != nil {
		_ = held.Close()
		return nil, err
	}
	j.lock = held
	return j, nil
}

func open(opt Options, path string) (*Journal, error) {
	if err := prepareFile(path); err != nil {
		return nil, err
	}
	j := &Journal{
		opt: opt, clock: opt.Clock, wake: make(chan struct{}, 1),
		store:     &store{path: path, fault: opt.Fault},
		queue:     queue{capacity: opt.Capacity, reserve: opt.Reserve},
		lists:     map[string]Digest{},
		named:     map[string]bool{},
		news:      make(chan struct{}),
		listeners: map[chan<- struct{}]int{},
	}
	ctx := context.Background()
	failed := j.store.open(ctx)
	if failed != nil && damageOf(failed) == nil {
		j.store.close()
		return nil, storeError("opening the record", failed)
	}
	r, err := newReader(path, "rw", opt.Fault)
	if err != nil {
		j.store.close()
		return nil, err
	}
	r.onDamage = j.noteDamage
	j.Reader = r
	if failed == nil {
		failed = j.restore(ctx)
	}
	if failed != nil {
		d := damageOf(failed)
		if d == nil {
			_ = r.Close()
			j.store.close()
			return nil, storeError("opening the record", failed)
		}
		j.noteDamage(d)
	}
	return j, nil
}

func (j *Journal) noteDamage(d *Damage) {
	j.mu.Lock()
	defer j.mu.Unlock()
	if j.damage == nil {
		j.damage = d
		j.changed()
	}
}

// Append queues entries, whose numbers must rise, and the texts that they
// name. It never waits and does no I/O; it copies what it keeps. Either all of
// the call is queued or nothing: on ErrFull the entries are counted in a gap
// entry, on any other error they are not counted at all.
func (j *Journal) Append(entries []Entry, blobs ...Blob) error {
	cost := 0
	for i := range entries {
		if err := entries[i].check(); err != nil {
			return err
		}
		if entries[i].Kind == KindGap {
			return fmt.Errorf("recording entry %d: kind %q is the journal's own", entries[i].Seq, KindGap)
		}
		cost += entries[i].size()
	}
	now := j.clock.Boot()
	j.mu.Lock()
	defer j.mu.Unlock()
	if j.closed {
		return ErrClosed
	}
	last := j.queued
	for i := range entries {
		if entries[i].Seq <= last {
			return fmt.Errorf("%w: %d after %d", ErrOrder, entries[i].Seq, last)
		}
		last = entries[i].Seq
	}
	fresh, err := j.fresh(blobs)
	if err != nil {
		return err
	}
	for _, b := range fresh {
		cost += b.cost()
	}
	if !j.queue.fits(cost) {
		if len(entries) > 0 {
			j.queue.lose(entries, now)
			j.noteLost(entries[0].Seq, last)
			j.queued = last
			j.arm(true)
		}
		return ErrFull
	}
	for _, b := range blobs {
		j.lists[b.digest] = b.sum
		j.named[b.digest] = true
	}
	j.queue.add(entries, fresh, now)
	j.queued = last
	if len(entries) > 0 {
		j.arm(j.queue.tail().urgent || len(j.queue.blocks) > 1)
	}
	return nil
}

// fresh leaves out the texts that are on record or queued. j.mu is held.
func (j *Journal) fresh(blobs []Blob) ([]Blob, error) {
	var fresh []Blob
	seen := map[string]Digest{}
	for _, b := range blobs {
		if b.digest == "" {
			return nil, errors.New("recording a text: it was not made by Pack")
		}
		sum, known := j.lists[b.digest]
		if !known {
			sum, known = seen[b.digest]
		}
		switch {
		case !known:
			seen[b.digest] = b.sum
			fresh = append(fresh, b)
		case sum != b.sum:
			return nil, fmt.Errorf("%w: %s", ErrConflict, b.digest)
		}
	}
	return fresh, nil
}

// Close ends the writer's work with one last try to write what is queued, and
// lets go of the folder. Run must have returned. The error tells what is not
// on record.
func (j *Journal) Close() error {
	err := j.Flush(context.Background())
	j.writing.Lock()
	defer j.writing.Unlock()
	j.mu.Lock()
	if j.closed {
		j.mu.Unlock()
		return nil
	}
	j.closed = true
	j.changed()
	j.mu.Unlock()
	errReader := j.Reader.Close()
	j.store.close()
	return errors.Join(err, errReader, j.lock.Close())
}
