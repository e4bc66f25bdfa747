package clock

import (
	"sync"
	"time"
)

// Real is the machine's clock.
type Real struct{ f *follower }

// NewReal anchors at the kernel's present wall time. stepLimit is the
// disagreement from which on a step is reported; it must be above zero. It
// fails where the boot clock cannot be read.
func NewReal(stepLimit time.Duration) (*Real, error) {
	f, err := newFollower(linux{}, stepLimit, AssessEvery)
	if err != nil {
		return nil, err
	}
	return &Real{f: f}, nil
}

// Now gives both clocks and a state at most AssessEvery old.
func (r *Real) Now() Reading { return r.f.now() }

// Wall is this clock's wall time, UTC.
func (r *Real) Wall() time.Time { w, _ := r.f.read(); return w }

// Boot is the time since the machine booted, counting suspend.
func (r *Real) Boot() time.Duration { _, b := r.f.read(); return b }

// Read is Wall and Boot of one instant, for the price of one system call.
func (r *Real) Read() (time.Time, time.Duration) { return r.f.read() }

// State assesses the clock anew.
func (r *Real) State() State { return r.f.stateNow() }

// Reanchor takes the kernel's wall time and forgets what was reported.
func (r *Real) Reanchor() Reading { return r.f.reanchor() }

// Tick sends every d, without drift; ticks that were missed are dropped.
func (r *Real) Tick(d time.Duration) (<-chan struct{}, func()) {
	if d <= 0 {
		panic("clock: a tick must be longer than zero")
	}
	t := &realTicker{c: make(chan struct{}, 1), every: d, next: time.Now().Add(d)}
	t.mu.Lock()
	t.timer = time.AfterFunc(d, t.fire)
	t.mu.Unlock()
	return t.c, t.stop
}

type realTicker struct {
	c     chan struct{}
	every time.Duration

	mu      sync.Mutex
	next    time.Time // with its monotonic part
	timer   *time.Timer
	stopped bool
}

func (t *realTicker) fire() {
	t.mu.Lock()
	defer t.mu.Unlock()
	if t.stopped {
		return
	}
	send(t.c)
	now := time.Now()
	t.next = t.next.Add(t.every)
	if t.next.Before(now) {
		t.next = now.Add(t.every)
	}
	t.timer.Reset(t.next.Sub(now))
}

func (t *realTicker) stop() {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.stopped = true
	t.timer.Stop()
}

// Timer sends once after d.
func (r *Real) Timer(d time.Duration) (<-chan struct{}, func() bool) {
	c := make(chan struct{}, 1)
	return c, time.AfterFunc(d, func() { send(c) }).Stop
}

// AfterFunc calls f after d on its own goroutine.
func (r *Real) AfterFunc(d time.Duration, f func()) func() bool {
	return time.AfterFunc(d, f).Stop
}

func send(c chan struct{}) {
	select {
	case c <- struct{}{}:
	default:
	}
}
