package journal

import (
	"context"
	"fmt"
	"time"
)

// BehindLimit is how long an entry may wait for the store before the record
// counts as not keeping up.
const BehindLimit = time.Second

// State is the journal's condition. The zero State is not sound.
type State struct {
	// Sound is true while nothing is wrong: not damaged, closed or failing, at
	// most half full and BehindLimit behind, and no gap waiting.
	Sound bool

	Durable uint64        // every entry up to this number is on disk, or counted in a gap that is
	Queued  uint64        // newest number taken, lost ones included
	Behind  time.Duration // how long the oldest entry that is not durable has waited
	Bytes   int           // in the queue, of Capacity
	Cap     int
	Half    bool // more than half full
	Full    bool // only the reserve is left: intake must refuse
	Gap     bool // entries were lost and their count is not durable yet

	Err      error   // of the store's newest try; nil once one went through
	Failures uint64  // tries that failed since Open
	Damage   *Damage // found at Open, by Verify or on reading
}

// State tells the present condition. It does no I/O.
func (j *Journal) State() State {
	now := j.clock.Boot()
	j.mu.Lock()
	defer j.mu.Unlock()
	s := State{
		Durable: j.durable, Queued: j.queued, Bytes: j.queue.bytes, Cap: j.queue.capacity,
		Half: j.queue.bytes > j.queue.capacity/2, Full: j.queue.bytes > j.queue.capacity-j.queue.reserve,
		Gap: j.queue.gaps > 0, Err: j.err, Failures: j.failures, Damage: j.damage,
	}
	if born, waiting := j.oldest(); waiting {
		s.Behind = max(now-born, 0)
	}
	s.Sound = !j.closed && !j.ended && s.Err == nil && s.Damage == nil && !s.Gap && !s.Half && s.Behind <= BehindLimit
	return s
}

// oldest is when the oldest entry that is not durable came. j.mu is held.
func (j *Journal) oldest() (time.Duration, bool) {
	for _, blocks := range [][]*pending{j.taken, j.queue.blocks} {
		for _, p := range blocks {
			if p.count > 0 || p.gap != nil {
				return p.born, true
			}
		}
	}
	return 0, false
}

// Notify has a value sent on c, without waiting for room, whenever Durable
// rises, a try fails or damage is found. Stop ends it.
func (j *Journal) Notify(c chan<- struct{}) (stop func()) {
	j.mu.Lock()
	defer j.mu.Unlock()
	j.listeners[c]++
	return func() {
		j.mu.Lock()
		defer j.mu.Unlock()
		if j.listeners[c]--; j.listeners[c] <= 0 {
			delete(j.listeners, c)
		}
	}
}

// changed tells everybody who waits. j.mu is held.
func (j *Journal) changed() {
	close(j.news)
	j.news = make(chan struct{})
	for c := range j.listeners {
		select {
		case c <- struct{}{}:
		default:
		}
	}
}

// Wait returns nil once the entry seq is on disk. It returns ErrFull where the
// entry was lost to a full queue, ErrClosed after Close, and the error of ctx
// when that ends first.
func (j *Journal) Wait(ctx context.Context, seq uint64) error {
	for {
		j.mu.Lock()
		news := j.news
		lost, durable, closed := j.isLost(seq), j.durable >= seq, j.closed
		j.mu.Unlock()
		switch {
		case lost:
			return ErrFull
		case durable:
			return nil
		case closed:
			return ErrClosed
		}
		select {
		case <-news:
		case <-ctx.Done():
			return fmt.Errorf("waiting for entry %d to be on record: %w", seq, ctx.Err())
		}
	}
}

// maxLost is how many runs of lost entries are remembered apart. Beyond it
// the oldest two become one run with all between them, so that Wait errs
// towards lost.
const maxLost = 256

type run struct{ first, last uint64 }

func (j *Journal) isLost(seq uint64) bool {
	for _, r := range j.lost {
		if seq >= r.first && seq <= r.last {
			return true
		}
	}
	return false
}

// noteLost remembers that the entries from first to last are lost. j.mu is
// held.
func (j *Journal) noteLost(first, last uint64) {
	if n := len(j.lost); n > 0 && j.lost[n-1].last == j.queued {
		j.lost[n-1].last = last
		return
	}
	j.lost = append(j.lost, run{first, last})
	if len(j.lost) > maxLost {
		j.lost[1].first = j.lost[0].first
		j.lost = j.lost[1:]
	}
}
