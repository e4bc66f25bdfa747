package plan

import (
	"cmp"
	"slices"
	"time"
)

// Opening is a target that the beam could have from an instant on.
type Opening struct {
	Index int // among the plans that were given
	Until time.Time
	For   time.Duration // from the end of its time to acquire until Until
}

// OpenFor returns the targets that nothing foreseeable closes at an instant nor
// for at least so long after their time to acquire, those of higher priority
// first, then those that stay open longer. What is not foreseeable, only a
// permit tells.
func OpenFor(plans []Planned, at time.Time, atLeast time.Duration) []Opening {
	var out []Opening
	for i := range plans {
		p := &plans[i]
		s, ok := p.Spans.Next(at)
		if !ok || !s.Contains(at) {
			continue
		}
		left := s.Until.Sub(at) - p.Target.Use.Reacquire
		if left > 0 && left >= atLeast && left >= p.Target.Use.MinSpan {
			out = append(out, Opening{Index: i, Until: s.Until, For: left})
		}
	}
	slices.SortStableFunc(out, func(a, b Opening) int {
		return cmp.Or(cmp.Compare(plans[b.Index].weight(), plans[a.Index].weight()), cmp.Compare(b.For, a.For))
	})
	return out
}

// weight is the target's priority; one that is not said counts as 1.
func (p *Planned) weight() float64 { return p.Target.weight() }

func (t *Target) weight() float64 {
	if t.Priority == 0 {
		return 1
	}
	return t.Priority
}
