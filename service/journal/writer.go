package journal

import (
	"context"
	"errors"
	"fmt"
	"time"
)

// How long Run waits after a try that failed: twice as long each time.
const (
	firstRetry = 50 * time.Millisecond
	lastRetry  = 2 * time.Second
)

// Run moves the queue to the store until ctx ends; then it tries once more to
// write everything and returns an error if something is left. A journal has at
// most one Run.
func (j *Journal) Run(ctx context.Context) error {
	defer func() {
		j.mu.Lock()
		defer j.mu.Unlock()
		j.ended = true
		j.changed()
	}()
	j.poke()
	retry := firstRetry
	for {
		wrote, err := j.writeOnce(context.WithoutCancel(ctx), false)
		switch {
		case err != nil:
			if !j.pause(ctx, retry) {
				return j.Flush(context.WithoutCancel(ctx))
			}
			retry = min(2*retry, lastRetry)
			continue
		case wrote:
			retry = firstRetry
			if ctx.Err() == nil {
				continue
			}
		}
		select {
		case <-j.wake:
		case <-ctx.Done():
			return j.Flush(context.WithoutCancel(ctx))
		}
	}
}

// pause waits for d; false when ctx ended.
func (j *Journal) pause(ctx context.Context, d time.Duration) bool {
	over := make(chan struct{})
	stop := j.clock.AfterFunc(d, func() { close(over) })
	defer stop()
	select {
	case <-over:
		return true
	case <-ctx.Done():
		return false
	}
}

// Flush writes all that is queued, in the caller's goroutine, and returns when
// it is on disk. It tries once; on error everything stays queued. A simulator
// uses it in place of Run.
func (j *Journal) Flush(ctx context.Context) error {
	for {
		wrote, err := j.writeOnce(ctx, true)
		if err != nil {
			s := j.State()
			return fmt.Errorf("entries %d to %d are not on record: %w", s.Durable+1, s.Queued, err)
		}
		if !wrote {
			return nil
		}
	}
}

// writeOnce moves one transaction's worth: what an earlier try left, else what
// is ripe, or everything. It says whether something was written.
func (j *Journal) writeOnce(ctx context.Context, all bool) (bool, error) {
	j.writing.Lock()
	defer j.writing.Unlock()
	j.mu.Lock()
	if j.closed {
		j.mu.Unlock()
		return false, nil
	}
	if len(j.taken) == 0 {
		j.taken = j.queue.take(j.clock.Boot(), j.opt.BlockAge, all)
		j.sealed = nil
	}
	taken := j.taken
	if len(taken) == 0 {
		j.rearm()
	}
	j.mu.Unlock()
	if len(taken) == 0 {
		return false, nil
	}
	err := j.put(ctx, taken)
	j.mu.Lock()
	defer j.mu.Unlock()
	defer j.changed()
	if j.err = err; err != nil {
		j.failures++
		return false, err
	}
	last := j.sealed[len(j.sealed)-1]
	j.durable, j.head = last.last, last.digest
	j.queue.done(taken)
	j.taken, j.sealed = nil, nil
	return true, nil
}

// put seals what was taken, once, and commits it. j.writing is held.
func (j *Journal) put(ctx context.Context, taken []*pending) error {
	if j.sealed == nil {
		prev := j.head
		blocks := make([]*sealed, 0, len(taken))
		for _, p := range taken {
			b, err := p.seal(prev, j.codec)
			if err != nil {
				return err
			}
			prev = b.digest
			blocks = append(blocks, b)
		}
		j.sealed = blocks
	}
	err := j.store.commit(ctx, j.head, j.sealed)
	if err == nil {
		return nil
	}
	var d *Damage
	if errors.As(err, &d) {
		j.noteDamage(d)
	}
	return storeError("writing the record", err)
}

// arm sees to it that Run looks at the queue: now, or when the tail is old
// enough. j.mu is held.
func (j *Journal) arm(now bool) {
	if now {
		j.poke()
		return
	}
	if !j.armed {
		j.armed = true
		j.clock.AfterFunc(j.opt.BlockAge, j.ring)
	}
}

// ring is the timer's call.
func (j *Journal) ring() {
	j.mu.Lock()
	j.armed = false
	j.mu.Unlock()
	j.poke()
}

// rearm sets the timer for a tail that is not ripe yet. j.mu is held.
func (j *Journal) rearm() {
	t := j.queue.tail()
	if t == nil || t.count == 0 || j.armed {
		return
	}
	j.armed = true
	j.clock.AfterFunc(max(t.born+j.opt.BlockAge-j.clock.Boot(), 0), j.ring)
}

func (j *Journal) poke() {
	select {
	case j.wake <- struct{}{}:
	default:
	}
}
