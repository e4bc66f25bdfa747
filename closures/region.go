package closures

import (
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// touches returns when, within over, light about the aim might lie in the
// region: separation less the asterism and every error at most the radius. It
// errs to longer. dst is the caller's memory.
func (q *Question) touches(f *Foreseen, r *Region, over span.Span, dst span.Set) span.Set {
	return q.within(f, r, over, dst, 1)
}

// holds returns when, within over, all light about the aim must lie in the
// region: separation and the asterism and every error at most the radius. It
// errs to shorter. dst and spare are the caller's memory.
func (q *Question) holds(f *Foreseen, r *Region, over span.Span, dst, spare span.Set) (held, used span.Set) {
	used = q.within(f, r, over, spare, -1)
	whole := [1]span.Span{over}
	return span.AppendSubtract(dst, whole[:], used), used
}

// Within returns when, over the question's span, light about the aim might lie
// in a region, and when all of it must.
func (q *Question) Within(f *Foreseen, r *Region) (might, must span.Set) {
	must, _ = q.holds(f, r, q.Over, nil, nil)
	return q.touches(f, r, q.Over, nil), must
}

// within searches for when the signed margin of the region is used up. With
// sign 1 the margin is positive where the aim is certainly outside; with sign
// -1 it is positive where the aim is certainly inside. Both start from how far
// the aim lies outside the region (negative: inside).
func (q *Question) within(f *Foreseen, r *Region, over span.Span, dst span.Set, sign float64) span.Set {
	dst = dst[:0]
	if over.Empty() {
		return dst
	}
	switch r.Shape {
	case WholeSky:
		if sign > 0 {
			return appendSpan(dst, over)
		}
		return dst
	case ICRSCone:
		return q.inCone(r, over, dst, sign)
	case TrackCone:
		return q.inTrack(r, over, dst, sign)
	case HorizonBox:
		return q.inBox(f, r, over, dst, sign)
	}
	return appendSpan(dst, over) // no such shape: might be in it, need not be
}

// pad is what the margin loses at a night: the asterism and every error.
func (q *Question) pad(n *sky.Night, turned bool) float64 {
	p := q.extent()
	if turned {
		p += n.Error()
	}
	return p.Radians()
}

// turnedForSky reports whether the aim must be turned by a night to be
// compared with ICRS.
func (q *Question) turnedForSky() bool { return q.Aim.Frame == Horizon || q.Aim.Frame == OfDate }

// searchSky is search for a margin against ICRS, before what the asterism and
// the errors take of it. An aim that is stated in ICRS needs no night for that,
// so that what lies before the first one or behind the last is known too.
func (q *Question) searchSky(dst span.Set, rate float64, over span.Span, margin func(n *sky.Night, at time.Time) float64) span.Set {
	if q.turnedForSky() {
		return q.search(dst, rate, over, func(n *sky.Night, at time.Time) float64 { return margin(n, at) - q.pad(n, true) })
	}
	dst = dst[:0]
	there := q.Aim.reach(over)
	if there.Empty() {
		return appendSpan(dst, over)
	}
	pad := q.extent().Radians() + rate*q.Slack.Seconds()
	dst = appendSpan(dst, span.Span{From: over.From, Until: there.From})
	dst = span.AppendBelowRated(dst, func(at time.Time) (float64, float64) { return margin(nil, at) - pad, rate }, there, q.Edge)
	return appendSpan(dst, span.Span{From: there.Until, Until: over.Until})
}

func (q *Question) inCone(r *Region, over span.Span, dst span.Set, sign float64) span.Set {
	direction, rate := q.inSky()
	if rate == 0 && q.Aim.Frame == ICRS {
		// A fixed aim keeps its separation: one look serves the span.
		m := sign*(geometry.Separation(q.Aim.Direction, r.Direction)-r.Radius).Radians() - q.extent().Radians()
		return q.always(m, over, dst)
	}
	return q.searchSky(dst, rate, over, func(n *sky.Night, at time.Time) float64 {
		return sign * (geometry.Separation(direction(n, at), r.Direction) - r.Radius).Radians()
	})
}

// always is the search with a constant margin.
func (q *Question) always(m float64, over span.Span, dst span.Set) span.Set {
	if m > 0 {
		return dst
	}
	return appendSpan(dst, over)
}

// inTrack searches along a moving cone. It is nowhere outside its points but
// that, to be might in, it stays at its ends for as long as any lead or tail
// may reach: a closed window that starts with the track is widened too.
func (q *Question) inTrack(r *Region, over span.Span, dst span.Set, sign float64) span.Set {
	track := Aim{Frame: Table, Points: r.Points}
	first, last := r.Points[0].At, r.Points[len(r.Points)-1].At
	there := span.Span{From: first, Until: last.Add(1)} // both ends belong to it
	if sign > 0 {
		there = there.Widen(MaxLeadOrTail, MaxLeadOrTail)
	}
	part := over.Intersect(there)
	direction, rate := q.inSky()
	rate += track.ownRate()
	if sign < 0 && !part.Empty() {
		dst = appendSpan(dst, span.Span{From: over.From, Until: part.From})
	}
	if !part.Empty() {
		found := q.searchSky(nil, rate, part, func(n *sky.Night, at time.Time) float64 {
			on := at
			if on.Before(first) {
				on = first
			} else if on.After(last) {
				on = last
			}
			return sign * (geometry.Separation(direction(n, at), track.own(on)) - r.Radius).Radians()
		})
		for _, s := range found {
			dst = appendSpan(dst, s)
		}
	}
	if sign < 0 {
		from := over.From
		if !part.Empty() {
			from = part.Until
		}
		dst = appendSpan(dst, span.Span{From: from, Until: over.Until})
	}
	return dst
}

func (q *Question) inBox(f *Foreseen, r *Region, over span.Span, dst span.Set, sign float64) span.Set {
	direction, rate := q.overhead()
	turned := q.Aim.Frame != Horizon
	through := rate
	if r.Observed {
		through *= sky.RefractionStretch + sky.RefractionErrorSlope
	}
	margin := func(n *sky.Night, at time.Time) float64 {
		d := direction(n, at)
		pad := q.pad(n, turned)
		if r.Observed {
			var e s1.Angle
			d, e = f.Air.Refract(d)
			pad = pad*sky.RefractionStretch + e.Radians()
		}
		return sign*r.Box.Margin(d) - pad
	}
	if rate == 0 && !turned && len(q.Nights) > 0 {
		return q.always(margin(q.Nights[0], over.From), over, dst)
	}
	return q.search(dst, through, over, margin)
}
