package clock

import (
	"container/heap"
	"errors"
	"time"
)

var errBroken = errors.New("the virtual clock is broken")

// timer is one waiting wish. due is in monotonic time; order breaks ties in
// the order of making.
type timer struct {
	due   int64
	order uint64
	every int64 // 0: once
	fire  func()
	index int // in the heap; -1 when not in it
}

type timerHeap []*timer

func (h timerHeap) Len() int { return len(h) }
func (h timerHeap) Less(i, j int) bool {
	if h[i].due != h[j].due {
		return h[i].due < h[j].due
	}
	return h[i].order < h[j].order
}
func (h timerHeap) Swap(i, j int) {
	h[i], h[j] = h[j], h[i]
	h[i].index, h[j].index = i, j
}
func (h *timerHeap) Push(x any) {
	t := x.(*timer)
	t.index = len(*h)
	*h = append(*h, t)
}
func (h *timerHeap) Pop() any {
	old := *h
	t := old[len(old)-1]
	old[len(old)-1] = nil
	*h = old[:len(old)-1]
	t.index = -1
	return t
}

// Settle sets what Advance calls after the timers of each instant have fired,
// before it moves on: a simulator waits there until its goroutines are idle.
func (v *Virtual) Settle(f func()) {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.settle = f
}

// Advance moves all clocks by d, stopping at every timer on the way: timers
// fire at their instant, in the order of their instants and, at one instant,
// in the order in which they were made. AfterFunc's functions run on the
// caller's goroutine, so they must not call Advance. Timers that are due now
// fire also for d = 0; a negative d does nothing.
func (v *Virtual) Advance(d time.Duration) {
	if d < 0 {
		return
	}
	v.moving.Lock()
	defer v.moving.Unlock()
	v.mu.Lock()
	until := v.now.mono + int64(d)
	for {
		fired := v.fireOne(until)
		if fired == nil {
			break
		}
		settle := v.settle
		last := len(v.timers) == 0 || v.timers[0].due > v.now.mono
		v.mu.Unlock()
		fired()
		if last && settle != nil {
			settle()
		}
		v.mu.Lock()
	}
	v.move(until)
	v.mu.Unlock()
}

// fireOne takes the earliest timer due by until and moves the clocks to its
// instant. v.mu is held.
func (v *Virtual) fireOne(until int64) func() {
	if len(v.timers) == 0 || v.timers[0].due > until {
		return nil
	}
	t := v.timers[0]
	v.move(t.due)
	if t.every > 0 {
		t.due += t.every
		v.made++
		t.order = v.made
		heap.Fix(&v.timers, 0)
	} else {
		heap.Pop(&v.timers)
	}
	return t.fire
}

func (v *Virtual) move(mono int64) {
	d := max(mono-v.now.mono, 0)
	v.now.wall += d
	v.now.boot += d
	v.now.mono += d
}

// Next is the time from now to the earliest timer; false when none waits.
func (v *Virtual) Next() (time.Duration, bool) {
	v.mu.Lock()
	defer v.mu.Unlock()
	if len(v.timers) == 0 {
		return 0, false
	}
	return time.Duration(max(v.timers[0].due-v.now.mono, 0)), true
}

func (v *Virtual) add(d, every time.Duration, fire func()) *timer {
	v.mu.Lock()
	defer v.mu.Unlock()
	v.made++
	t := &timer{due: v.now.mono + int64(max(d, 0)), order: v.made, every: int64(every), fire: fire}
	heap.Push(&v.timers, t)
	return t
}

func (v *Virtual) drop(t *timer) bool {
	v.mu.Lock()
	defer v.mu.Unlock()
	if t.index < 0 {
		return false
	}
	heap.Remove(&v.timers, t.index)
	return true
}

// Tick sends every d of virtual time.
func (v *Virtual) Tick(d time.Duration) (<-chan struct{}, func()) {
	if d <= 0 {
		panic("clock: a tick must be longer than zero")
	}
	c := make(chan struct{}, 1)
	t := v.add(d, d, func() { send(c) })
	return c, func() { v.drop(t) }
}

// Timer sends once after d of virtual time.
func (v *Virtual) Timer(d time.Duration) (<-chan struct{}, func() bool) {
	c := make(chan struct{}, 1)
	t := v.add(d, 0, func() { send(c) })
	return c, func() bool { return v.drop(t) }
}

// AfterFunc calls f after d of virtual time, inside the owner's Advance.
func (v *Virtual) AfterFunc(d time.Duration, f func()) func() bool {
	t := v.add(d, 0, f)
	return func() bool { return v.drop(t) }
}
