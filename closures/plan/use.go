package plan

import (
	"math"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Of returns what of allowed spans serves: each less the time to acquire at its
// start, if at least the least span is left.
func (u Use) Of(allowed span.Set) span.Set {
	var out span.Set
	for _, s := range allowed {
		if s = s.Narrow(u.Reacquire, 0); !s.Empty() && s.Length() >= u.MinSpan {
			out = append(out, s)
		}
	}
	return out
}

// holding returns the allowed spans that serve a target, whole: from each one's
// start the time to acquire must pass.
func (u Use) holding(allowed span.Set) span.Set {
	var out span.Set
	for _, s := range allowed {
		if left := s.Narrow(u.Reacquire, 0); !left.Empty() && left.Length() >= u.MinSpan {
			out = append(out, s)
		}
	}
	return out
}

// check refuses times that cannot be meant.
func (u Use) check(name string) error {
	if u.MinSpan < 0 || u.MinSpan > MaxLength || u.Reacquire < 0 || u.Reacquire > MaxLength {
		return closures.Errorf(closures.Invalid, "give from 0 to 14 days", "plan: min_span_s or reacquire_s of target %.64q is out of bounds", name)
	}
	return nil
}

// Planned is what one target can have.
type Planned struct {
	Target Target
	Allowed
	Usable span.Set // of the allowed spans, what serves the target
}

// Longest returns the longest usable span, the earliest of equals; the zero
// Span when there is none.
func (p *Planned) Longest() span.Span { return p.Usable.Longest() }

// Share returns which part of a span is usable.
func (p *Planned) Share(over span.Span) float64 { return share(p.Usable, over) }

// Share returns which part of a span is allowed.
func (a *Allowed) Share(over span.Span) float64 { return share(a.Spans, over) }

func share(s span.Set, over span.Span) float64 {
	if over.Empty() {
		return 0
	}
	return float64(s.Within(over).Total()) / float64(over.Length())
}

// Target returns when a target is allowed, and what of that serves it.
func (p *Planner) Target(t *Target, scratch *Scratch) (Planned, error) {
	if err := t.Use.check(t.Name); err != nil {
		return Planned{}, err
	}
	a, err := p.One(t.Aim, scratch)
	if err != nil {
		return Planned{}, err
	}
	return Planned{Target: *t, Allowed: a, Usable: t.Use.Of(a.Spans)}, nil
}

// SunBelow returns when, within a span, the Sun's centre is surely below an
// elevation, airless: for twilight on charts. What no night covers is left out.
func SunBelow(nights []*sky.Night, over span.Span, elevation s1.Angle) span.Set {
	var out span.Set
	for _, n := range nights {
		part := closures.BinOf(n).Intersect(over)
		if part.Empty() {
			continue
		}
		up := span.Below(func(at time.Time) float64 {
			d := n.Sun(at)
			return (elevation - sky.SunError).Radians() - math.Atan2(d.Z, math.Hypot(d.X, d.Y))
		}, sky.SunRate, part, time.Second)
		out = out.Union(up.Complement(part))
	}
	return out
}
