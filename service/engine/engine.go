package engine

import (
	"errors"
	"sync/atomic"
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
)

// Clock is what the engine needs of the service's clock.
type Clock interface {
	// Read gives the UTC wall time and the time since boot, counting suspend.
	Read() (wall time.Time, boot time.Duration)
	// AfterFunc calls f after d unless stopped before. f does not block.
	AfterFunc(d time.Duration, f func()) (stop func() bool)
}

// ClockReport is what the clock says of itself. The zero report vouches for
// nothing.
type ClockReport struct {
	Step         time.Duration // wall time against this clock, past the step limit, since the last Reanchor
	Suspended    bool          // the machine slept since the last Reanchor
	Synchronised bool          // by the kernel's own word
	MaxErrorSaid bool          // the kernel gave a bound
	MaxError     time.Duration
	Fault        string // fixed text: time itself could not be read
}

// Options are what the engine is made from. Clock, Record, Rules and Boot are
// needed.
type Options struct {
	Clock    Clock
	Health   func() ClockReport // nil: nothing vouches for the clock, and every beam stays shuttered
	Reanchor func()             // acknowledges a step or a suspend once it is told; nil: it is told for ever
	Record   Record
	Rules    *closures.Rules
	Boot     closures.Boot
	Durable  closures.Durable // what outlived the last run: see Restore
	After    uint64           // the newest number on record
	Build    string

	// Prepare makes the sky of the 12 h bin that holds an instant; nil: sky.Prepare.
	Prepare func(r *closures.Rules, at time.Time) (*sky.Night, error)
	// Watchdog is called at the end of each turn in which all is well.
	Watchdog func()
	// Report is told of what an operator must see, such as a panic with its
	// stack. It must not block.
	Report    func(error)
	Simulated bool
}

// Engine owns the state. Its exported methods are safe for concurrent use.
type Engine struct {
	opt      Options
	in       *intake
	view     atomic.Pointer[View]
	watchers watchers
	stats    counters
	owned    atomic.Bool   // by Run or a Stepper
	ripe     chan struct{} // nights are prepared
	nights0  prepared

	// The rest belongs to the owner.
	state    *closures.State
	rules    *closures.Rules
	foreseen *closures.Foreseen
	book     closures.Book
	holds    []closures.HoldPlaced
	nights   []*sky.Night
	known    *closures.Known
	knownAt  time.Duration
	version  uint64           // of what is durable
	kept     closures.Durable // as of version
	seq      uint64           // newest number given
	at       time.Time        // of the newest turn
	boot     time.Duration
	cost     time.Duration // of the newest turn

	gates    []gate
	recorded []closures.Decision // the newest on record of each beam; zero: none
	tally    tally
	keptAt   time.Duration // when the newest Kept entry was queued
	keptDue  bool
	begun    *Begun // to be recorded before anything else

	own        []closures.Body // facts of the engine's own for the next turn
	carried    []pending       // of a batch that was lost to a panic
	deferred   []pending       // devices' words that contradict those of the last turn
	says       map[deviceSays]uint8
	condition  Condition
	recordTold time.Duration
	clockSaid  ClockReport
	clockTold  time.Duration
	tellAnew   bool // clock and record are told in this turn whether due or not
	reanchor   bool
	moved      bool // the site's place or the Earth's rotation was set anew
	lost       bool // an entry was lost and the core has not been told
	torn       bool // an entry was lost since the record last began
	started    bool
	stopping   bool
	panics     int // turns in a row

	waiters []*waiter
	told    time.Duration // when watchers were last told
	facts   []closures.Fact
	waits   []*waiter

	beforeStep func() // a test's way to make the core panic
}

// New makes an engine whose view is shuttered. It fails for rules that cannot
// be met and for options that are missing.
func New(opt Options) (*Engine, error) {
	switch {
	case opt.Clock == nil:
		return nil, errors.New("making the engine: no clock is given")
	case opt.Record == nil:
		return nil, errors.New("making the engine: no record is given")
	case opt.Boot.ID == "" || opt.Boot.At.IsZero():
		return nil, errors.New("making the engine: the start has no name or no instant")
	}
	if opt.Health == nil {
		opt.Health = func() ClockReport { return ClockReport{} }
	}
	if opt.Prepare == nil {
		opt.Prepare = func(r *closures.Rules, at time.Time) (*sky.Night, error) {
			return sky.Prepare(r.Site.Position, at, r.Site.UT1)
		}
	}
	if opt.Report == nil {
		opt.Report = func(error) {}
	}
	state, err := closures.New(opt.Rules, opt.Boot, opt.Durable)
	if err != nil {
		return nil, err
	}
	e := &Engine{opt: opt, says: map[deviceSays]uint8{}, ripe: make(chan struct{}, 1), seq: opt.After, at: opt.Boot.At}
	e.in = newIntake(&e.stats)
	_, e.boot = opt.Clock.Read()
	e.take(state, "")
	e.shutter(opt.Boot.At, e.boot, closures.CodeStarting, "no decision has been made since the start")
	return e, nil
}
