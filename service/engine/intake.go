package engine

import (
	"sync"
	"sync/atomic"
	"time"

	"beamward/closures"
)

// Intake is what became of a fact that was offered.
type Intake uint8

// The zero value is refused, with an error.
const (
	Refused    Intake = iota
	Accepted          // it waits for the next batch
	Superseded        // it waits, and an older one of its source and subject gave way; or a newer one waits already
)

// Bounds of what may wait for the next batch. Beyond them intake refuses with
// closures.Busy, and the sender tries again.
const (
	MaxPeople  = 4096  // people's words
	MaxDevices = 65536 // devices' words that are never superseded
	MaxLatest  = 65536 // pairs of source and subject
	maxBatch   = 20000 // facts of one turn; the rest follow in the next
)

// MaxAhead is how far ahead of its arrival a fact may say that it was.
const MaxAhead = 500 * time.Millisecond

// pending is a fact that waits for its batch.
type pending struct {
	from closures.Source
	body closures.Body
	wall time.Time     // when it arrived
	boot time.Duration // likewise
	kind kind
	gone bool // superseded
	wait *waiter
	key  subject
}

// intake is where facts wait. Everything in it is guarded by mu; the counters
// are not.
type intake struct {
	mu      sync.Mutex
	people  []pending
	devices []pending
	latest  []pending // in order of arrival of the newest; some are gone
	live    int
	index   map[subject]int // into latest
	far     far
	full    bool // the record takes only what closes
	closed  bool

	spare [3][]pending // for take

	awake  atomic.Bool   // a value was sent on news and not yet taken up
	news   chan struct{} // something waits
	urgent chan struct{} // a person's word waits
	stats  *counters
}

func newIntake(s *counters) *intake {
	return &intake{index: map[subject]int{}, news: make(chan struct{}, 1), urgent: make(chan struct{}, 1), stats: s}
}

var (
	errStopping = closures.Errorf(closures.Busy, "try again when it is back", "the service is stopping")
	errCrowded  = closures.Errorf(closures.Busy, "try again in a moment", "too many facts wait to be taken in")
	errNoRecord = closures.Errorf(closures.Busy, "look at the store's disk; try again when the record keeps up", "the record's queue is full")
	errOwnKind  = closures.Errorf(closures.Invalid, "send another kind", "facts of this kind are the service's own")
	errAhead    = closures.Errorf(closures.Invalid, "set the sender's clock", "the fact is dated more than 500 ms ahead")
)

// offer takes a fact in, or says why not. It does not wait.
func (in *intake) offer(p pending) (Intake, error) {
	p.kind = kindOf(p.body)
	l := p.kind.lane()
	if err := in.check(&p, l); err != nil {
		in.stats.refused[p.kind].Add(1)
		return Refused, err
	}
	in.mu.Lock()
	done, err := in.put(p, l)
	in.mu.Unlock()
	switch done {
	case Refused:
		in.stats.refused[p.kind].Add(1)
		return Refused, err
	case Superseded:
		in.stats.superseded[p.kind].Add(1)
	}
	in.stats.accepted[p.kind].Add(1)
	if l == lanePeople {
		poke(in.urgent)
	} else if !in.awake.Swap(true) {
		poke(in.news)
	}
	return done, nil
}

// check refuses what no state of the lanes would let in.
func (in *intake) check(p *pending, l lane) error {
	if l == laneOwn {
		return errOwnKind
	}
	if said := saidBy(p.body); said.After(p.wall.Add(MaxAhead)) {
		return errAhead
	}
	return nil
}

func (in *intake) put(p pending, l lane) (Intake, error) {
	switch {
	case in.closed:
		return Refused, errStopping
	case in.full && !p.kind.onlyCloses():
		return Refused, errNoRecord
	}
	switch l {
	case lanePeople:
		if len(in.people) >= MaxPeople {
			return Refused, errCrowded
		}
		in.people = append(in.people, p)
		return Accepted, nil
	case laneDevices:
		if len(in.devices) >= MaxDevices {
			return Refused, errCrowded
		}
		in.devices = append(in.devices, p)
		return Accepted, nil
	}
	if p.wait != nil { // somebody waits for this very one: it is not superseded
		if len(in.devices) >= MaxDevices {
			return Refused, errCrowded
		}
		in.devices = append(in.devices, p)
		return Accepted, nil
	}
	p.key = subjectOf(p.from, p.body)
	if done, kept := in.far.keep(&p); kept {
		return done, nil
	}
	return in.putLatest(p)
}

// putLatest replaces what waits for the same subject. The newer goes to the
// end, so that facts of one source stay in the order in which it sent them.
func (in *intake) putLatest(p pending) (Intake, error) {
	i, waits := in.index[p.key]
	if !waits {
		if in.live >= MaxLatest {
			return Refused, errCrowded
		}
		in.index[p.key] = len(in.latest)
		in.latest = append(in.latest, p)
		in.live++
		return Accepted, nil
	}
	old := &in.latest[i]
	if saidBy(p.body).Before(saidBy(old.body)) {
		old.body = carry(old.body, p.body)
		return Superseded, nil
	}
	p.body = carry(p.body, old.body)
	old.gone, old.body = true, nil
	in.index[p.key] = len(in.latest)
	in.latest = append(in.latest, p)
	if len(in.latest) > 2*in.live+64 {
		in.compact()
	}
	return Superseded, nil
}

// compact drops what gave way.
func (in *intake) compact() {
	kept := in.latest[:0]
	for i := range in.latest {
		if p := &in.latest[i]; !p.gone {
			in.index[p.key] = len(kept)
			kept = append(kept, *p)
		}
	}
	clear(in.latest[len(kept):])
	in.latest = kept
}

// setFull tells intake whether the record has room.
func (in *intake) setFull(full bool) {
	in.mu.Lock()
	defer in.mu.Unlock()
	in.full = full
}

func (in *intake) setRules(r *closures.Rules) {
	in.mu.Lock()
	defer in.mu.Unlock()
	in.far.setRules(r)
}

// close refuses everything from here on.
func (in *intake) close() {
	in.mu.Lock()
	defer in.mu.Unlock()
	in.closed = true
}

func poke(c chan struct{}) {
	select {
	case c <- struct{}{}:
	default:
	}
}
