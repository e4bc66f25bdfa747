package clock

import (
	"sync"
	"time"
)

// Virtual is a clock that stands still until its owner moves it. Its wall,
// boot and monotonic times move together in Advance and apart in Step and
// Suspend, and it passes them through the same rules as Real does the
// kernel's. It assesses at every reading.
type Virtual struct {
	f *follower

	moving sync.Mutex // one mover at a time; held while timers fire

	mu     sync.Mutex
	now    sample
	disc   discipline
	broken bool
	timers timerHeap
	made   uint64 // timers made so far, for their order
	settle func()
}

// virtualBoot is the boot time at which a virtual clock starts, so that a
// forgotten zero shows.
const virtualBoot = time.Hour

// NewVirtual is a clock at the wall time start (taken in UTC, to the
// nanosecond), synchronised, with a maximum error of 1 ms and the default step
// limit.
func NewVirtual(start time.Time) *Virtual { return newVirtual(start, DefaultStepLimit) }

// NewStepped is the same clock for a demonstration: its owner calls Advance in
// steps as small as it likes, and everything that waits on the clock happens
// at the instant it asked for.
func NewStepped(start time.Time) *Virtual { return newVirtual(start, DefaultStepLimit) }

func newVirtual(start time.Time, limit time.Duration) *Virtual {
	v := &Virtual{
		now:  sample{wall: start.UnixNano(), boot: int64(virtualBoot), mono: int64(virtualBoot)},
		disc: discipline{known: true, synchronised: true, maxError: time.Millisecond},
	}
	f, err := newFollower(virtualKernel{v}, limit, 0)
	if err != nil {
		panic("clock: " + err.Error()) // a fixed positive limit and a source that answers
	}
	v.f = f
	return v
}

type virtualKernel struct{ v *Virtual }

func (k virtualKernel) boot() (int64, error) {
	s, err := k.sample()
	return s.boot, err
}

func (k virtualKernel) sample() (sample, error) {
	k.v.mu.Lock()
	defer k.v.mu.Unlock()
	if k.v.broken {
		return sample{}, errBroken
	}
	return k.v.now, nil
}

func (k virtualKernel) discipline() discipline {
	k.v.mu.Lock()
	defer k.v.mu.Unlock()
	return k.v.disc
}

// Now gives both clocks and their state at this instant.
func (v *Virtual) Now() Reading { return v.f.now() }

// Wall is this clock's wall time, UTC.
func (v *Virtual) Wall() time.Time { w, _ := v.f.read(); return w }

// Boot is this clock's boot time, which starts at one hour.
func (v *Virtual) Boot() time.Duration { _, b := v.f.read(); return b }

// Read is Wall and Boot of one instant.
func (v *Virtual) Read() (time.Time, time.Duration) { return v.f.read() }

// State assesses the clock anew.
func (v *Virtual) State() State { return v.f.stateNow() }

// Reanchor takes the virtual kernel's wall time and forgets what was reported.
func (v *Virtual) Reanchor() Reading { return v.f.reanchor() }

// Step sets the virtual kernel's wall clock by d, either way, as an operator
// or a time service would. No timer fires.
func (v *Virtual) Step(d time.Duration) {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.now.wall += int64(d)
}

// Suspend lets d pass on the wall and boot clocks while the monotonic clock,
// and with it every timer, stands still.
func (v *Virtual) Suspend(d time.Duration) {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.now.wall += int64(max(d, 0))
	v.now.boot += int64(max(d, 0))
}

// Discipline sets what the virtual kernel says of itself. Not known is never
// synchronised.
func (v *Virtual) Discipline(known, synchronised bool, maxError time.Duration) {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.disc = discipline{known: known, synchronised: known && synchronised, maxError: maxError}
}

// Break makes every read fail until Break(false).
func (v *Virtual) Break(broken bool) {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.broken = broken
}
