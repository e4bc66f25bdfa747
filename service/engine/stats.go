package engine

import (
	"sync/atomic"
	"time"
)

// counters are counted where things happen and read by Stats.
type counters struct {
	accepted   [numKinds]atomic.Uint64
	superseded [numKinds]atomic.Uint64
	refused    [numKinds]atomic.Uint64
	batches    atomic.Uint64
	facts      atomic.Uint64
	panics     atomic.Uint64
	lost       atomic.Uint64
	decide     histogram
	lag        histogram
}

func (c *counters) turn(facts int, took time.Duration) {
	c.batches.Add(1)
	c.facts.Add(uint64(facts))
	c.decide.observe(took)
}

// Bounds are the upper bounds of a histogram's buckets; one more is open.
var bounds = [...]time.Duration{
	10 * time.Microsecond, 20 * time.Microsecond, 50 * time.Microsecond, 100 * time.Microsecond, 200 * time.Microsecond, 500 * time.Microsecond,
	time.Millisecond, 2 * time.Millisecond, 5 * time.Millisecond, 10 * time.Millisecond, 20 * time.Millisecond, 50 * time.Millisecond,
	100 * time.Millisecond, 200 * time.Millisecond, 500 * time.Millisecond, time.Second,
}

type histogram struct {
	buckets [len(bounds) + 1]atomic.Uint64
	sum     atomic.Int64 // nanoseconds
}

func (h *histogram) observe(d time.Duration) {
	d = max(d, 0)
	i := 0
	for i < len(bounds) && d > bounds[i] {
		i++
	}
	h.buckets[i].Add(1)
	h.sum.Add(int64(d))
}

// Histogram is a count of durations. Counts has one more than Bounds: what is
// longer than the last.
type Histogram struct {
	Bounds []time.Duration
	Counts []uint64
	Sum    time.Duration
}

func (h *histogram) read() Histogram {
	out := Histogram{Bounds: append([]time.Duration(nil), bounds[:]...), Counts: make([]uint64, len(h.buckets)), Sum: time.Duration(h.sum.Load())}
	for i := range h.buckets {
		out.Counts[i] = h.buckets[i].Load()
	}
	return out
}

// KindCount is what became of the facts of one kind.
type KindCount struct {
	Kind       string
	Accepted   uint64 // taken in, superseded ones included
	Superseded uint64 // gave way to a newer one before their batch
	Refused    uint64 // by intake or by the core
}

// Stats is what the engine has counted since its start.
type Stats struct {
	Kinds    []KindCount // that were seen, in a fixed order
	Batches  uint64
	Facts    uint64 // applied, the engine's own included
	Panics   uint64
	Lost     uint64 // entries that the record refused
	CutOff   uint64 // watchers
	Watchers int
	Decide   Histogram // from the reading of the clock to the decisions, a turn
	Lag      Histogram // from the arrival of a fact to its turn
}

// Stats reads the counters.
func (e *Engine) Stats() Stats {
	c := &e.stats
	s := Stats{
		Batches: c.batches.Load(), Facts: c.facts.Load(), Panics: c.panics.Load(), Lost: c.lost.Load(),
		Decide: c.decide.read(), Lag: c.lag.read(),
	}
	for k := kindNone; k < numKinds; k++ {
		n := KindCount{Kind: kindNames[k], Accepted: c.accepted[k].Load(), Superseded: c.superseded[k].Load(), Refused: c.refused[k].Load()}
		if n.Accepted+n.Refused > 0 {
			s.Kinds = append(s.Kinds, n)
		}
	}
	e.watchers.mu.Lock()
	defer e.watchers.mu.Unlock()
	s.CutOff, s.Watchers = e.watchers.cutOff, len(e.watchers.all)
	return s
}
