package clock

import (
	"errors"
	"sync"
	"time"
)

const (
	// SlewRate is the most by which this clock's wall time runs fast or slow
	// while it absorbs a small disagreement: 500 ppm, MAXFREQ of Linux's
	// timex.h. A 100 ms disagreement takes 200 s.
	SlewRate = 500e-6
	slewDiv  = 2000 // 1 / SlewRate, for whole numbers

	// AssessEvery is the oldest State that a Reading of a Real carries.
	AssessEvery = 100 * time.Millisecond

	// DefaultStepLimit is the disagreement from which on a step is reported.
	DefaultStepLimit = 100 * time.Millisecond

	// leastSuspend is the growth of boot time over monotonic time that counts
	// as a suspend. The kernel changes the two only on resume, by whole
	// milliseconds and more, so this only has to pass the spread of a sample.
	leastSuspend = int64(time.Millisecond)
)

// follower keeps a wall time on the boot clock and watches the kernel's wall
// clock beside it.
type follower struct {
	mu    sync.Mutex
	k     kernel
	limit int64 // step limit, ns
	every int64 // assess at least so often, ns of boot time; 0 is at each reading

	// wall(boot) = anchorWall + (boot - anchorBoot) + what was slewed of slew
	anchorWall, anchorBoot int64
	slew                   int64 // signed, still to be absorbed from the anchor on
	away                   int64 // boot - mono at the start or the last Reanchor
	last                   int64 // newest boot time seen
	stepped                bool
	state                  State
}

// newFollower anchors at the kernel's present wall time. It fails when a clock
// cannot be read or the limit is not positive.
func newFollower(k kernel, limit, every time.Duration) (*follower, error) {
	if !(limit > 0) {
		return nil, errors.New("starting the clock: the step limit must be above zero")
	}
	f := &follower{k: k, limit: int64(limit), every: int64(every)}
	s, err := k.sample()
	if err != nil {
		return nil, err
	}
	f.anchor(s)
	f.assess()
	return f, nil
}

func (f *follower) anchor(s sample) {
	f.anchorWall, f.anchorBoot, f.slew = s.wall, s.boot, 0
	f.away, f.last, f.stepped = s.boot-s.mono, s.boot, false
	f.state = State{}
}

// wallAt is this clock's wall time at a boot time not before the anchor. It
// rises strictly: the slew takes at most 1/2000 of the progress.
func (f *follower) wallAt(boot int64) int64 {
	d := boot - f.anchorBoot
	part := d / slewDiv
	switch {
	case f.slew >= 0:
		part = min(part, f.slew)
	default:
		part = max(-part, f.slew)
	}
	return f.anchorWall + d + part
}

// at reads the boot clock. On failure, or where it went back, it holds the
// newest instant seen and says so in the state.
func (f *follower) at() int64 {
	boot, err := f.k.boot()
	switch {
	case err != nil:
		f.fault("the boot clock cannot be read")
		return f.last
	case boot < f.last:
		f.fault("the boot clock went back")
		return f.last
	}
	f.last = boot
	return boot
}

func (f *follower) fault(text string) {
	f.state.Fault = text
	f.state.Known, f.state.Synchronised = false, false
}

// now is a reading with a state no older than every.
func (f *follower) now() Reading {
	f.mu.Lock()
	defer f.mu.Unlock()
	boot := f.at()
	if f.state.Fault != "" || boot-int64(f.state.Assessed) >= f.every {
		f.assess()
		boot = max(boot, f.last)
	}
	return f.reading(boot)
}

func (f *follower) reading(boot int64) Reading {
	return Reading{Wall: time.Unix(0, f.wallAt(boot)).UTC(), Boot: time.Duration(boot), State: f.state}
}

// read is a reading without any assessment: one system call.
func (f *follower) read() (time.Time, time.Duration) {
	f.mu.Lock()
	defer f.mu.Unlock()
	boot := f.at()
	return time.Unix(0, f.wallAt(boot)).UTC(), time.Duration(boot)
}

// assess compares the clocks, follows a small disagreement and reports a large
// one.
func (f *follower) assess() {
	s, err := f.k.sample()
	if err != nil {
		f.fault("the kernel's clocks cannot be read")
		return
	}
	if s.boot < f.last-s.spread {
		f.fault("the boot clock went back")
		return
	}
	s.boot = max(s.boot, f.last)
	f.last = s.boot

	ours := f.wallAt(s.boot)
	diff := s.wall - ours
	sure := beyond(diff, s.spread)
	if abs(sure) > f.limit {
		f.stepped = true
		if abs(sure) > abs(int64(f.state.Step)) {
			f.state.Step = time.Duration(sure)
		}
	}
	f.anchorWall, f.anchorBoot, f.slew = ours, s.boot, 0
	if !f.stepped {
		f.slew = diff
	}
	if away := s.boot - s.mono - f.away; away > leastSuspend+s.spread {
		f.state.Suspended = max(f.state.Suspended, time.Duration(away))
	}
	f.state.Offset = time.Duration(diff)
	f.state.Assessed = time.Duration(s.boot)
	f.state.Fault = ""

	d := f.k.discipline()
	f.state.Known, f.state.Synchronised = d.known, d.known && d.synchronised
	f.state.MaxError, f.state.Leap, f.state.Note = d.maxError, d.leap, d.note
}

func (f *follower) stateNow() State {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.assess()
	return f.state
}

// reanchor takes the kernel's wall time. Where the clocks cannot be read it
// keeps the anchor and the reports, with the fault.
func (f *follower) reanchor() Reading {
	f.mu.Lock()
	defer f.mu.Unlock()
	s, err := f.k.sample()
	if err != nil || s.boot < f.last-s.spread {
		f.fault("the kernel's clocks cannot be read")
		return f.reading(f.last)
	}
	s.boot = max(s.boot, f.last)
	f.anchor(s)
	f.assess()
	return f.reading(f.last)
}

// beyond is v brought towards zero by the uncertainty u.
func beyond(v, u int64) int64 {
	switch {
	case v > u:
		return v - u
	case v < -u:
		return v + u
	}
	return 0
}

func abs(v int64) int64 {
	if v < 0 {
		return -v
	}
	return v
}
