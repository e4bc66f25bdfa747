package encounter

import (
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
)

// Answer says whether a reach touches a keep-out during the guard. The zero
// value is touched.
type Answer struct {
	// Clear is true only if a plane was found between the two at every instant
	// of the guard.
	Clear bool
	// NotBefore is the time after the volume's instant before which nothing
	// touches, rounded down: the guard if Clear, 0 if touched at once.
	NotBefore time.Duration
	// Margin is the distance between the two, never overstated, if Clear. Else
	// it is at most 0, and says about how deep they lie in each other. Unknown
	// is NaN.
	Margin geometry.Length
}

// grain is the margin, in metres, under which a gap counts as a touch: far
// above the rounding of coordinates of 1000 km (1e-10 m) and far below all that
// matters.
const grain = 1e-6

// disc is the horizontal part of a reach over the guard: its centre moves
// straight and its radius grows as r0 at the start, r1 at the end, with q the
// factor of the time squared.
type disc struct{ x0, y0, x1, y1, r0, r1, q float64 }

// slab is the vertical part, in the same way.
type slab struct{ z0, z1, h0, h1, q float64 }

// scene is a reach over the guard, relative to the launch: inside every disc
// and every slab.
type scene struct {
	disc  [2]disc
	slab  [2]slab
	discs int
	slabs int
}

// Touch reports whether r touches the volume at any instant of its guard.
// Unknown is touched: a reach or a volume that is not valid.
//
// Quick first: far away by horizontal distance, then by distance from the axis,
// both by the bound on speed alone. Then whether the axis itself is in the reach
// at once. Then one plane that parts the two over the whole guard. Then a chain
// of planes, each for a part of the guard.
func (v *Volume) Touch(r *Reach) Answer {
	if !v.ready || !r.valid {
		return Answer{Margin: geometry.Length(math.NaN())}
	}
	age := seconds(v.at.Sub(r.at))
	lag := r.lag(age)
	tau0 := age + lag
	tau1 := tau0 + v.guard
	p := r.p.Sub(v.launch)
	column := 0.0
	if !r.altitude {
		column = max(math.Abs(v.high-p.Z), math.Abs(v.low-p.Z))
	}
	l := r.limits(tau1, column)
	if m := v.apart(r, &l, p, tau1); m > grain {
		return Answer{Clear: true, Margin: geometry.Length(m), NotBefore: toDuration(v.guard)}
	}

	var s scene
	r.fill(&s, v, &l, p, age, lag)
	if deep, meets := v.meets(&s); meets {
		return Answer{Margin: geometry.Length(min(deep, 0))}
	}
	best := [shapes]float64{math.Inf(-1), math.Inf(-1)}
	for i := range s.discs {
		for k := range s.slabs {
			v.gaps(&s.disc[i], &s.slab[k], &best)
			if best[cylinder] > grain && best[cone] > grain {
				return Answer{Clear: true, Margin: geometry.Length(min(best[cylinder], best[cone])), NotBefore: toDuration(v.guard)}
			}
		}
	}
	return v.follow(&s, &best)
}

// Against is the answer over several launches of one beam: the earliest touch
// and the least margin of all. Of no volume at all nothing is known: touched.
func Against(volumes []Volume, r *Reach) Answer {
	if len(volumes) == 0 {
		return Answer{Margin: geometry.Length(math.NaN())}
	}
	all := volumes[0].Touch(r)
	for i := range volumes[1:] {
		a := volumes[1+i].Touch(r)
		all.Clear = all.Clear && a.Clear
		all.NotBefore = min(all.NotBefore, a.NotBefore)
		all.Margin = min(all.Margin, a.Margin) // NaN if either is
	}
	return all
}

// toDuration rounds s seconds down.
func toDuration(s float64) time.Duration { return time.Duration(math.Floor(s * 1e9)) }

// apart returns a distance between the volume and every place that the bound
// on speed allows, by two quick estimates; at most 0 if neither parts them.
func (v *Volume) apart(r *Reach, l *limits, p r3.Vector, tau float64) float64 {
	if r.fast {
		return 0
	}
	wide := l.eh + l.v*tau
	// Beyond the volume's shadow.
	d2 := p.X*p.X + p.Y*p.Y
	if limit := v.far + wide; d2 > limit*limit {
		return math.Sqrt(d2) - limit
	}
	if r.steep || !r.altitude {
		return 0
	}
	// Beside the axis, by the half-spaces toward the stated position, for a
	// ball about it that holds the reach.
	tall := l.ez + l.c*tau
	ball := wide + tall
	s := p.Dot(v.b)
	off := math.Sqrt(max(0, p.Norm2()-s*s)) - ball
	ahead := max(0, s+ball)
	return min(v.cosE*off-v.sinE*ahead-v.base, v.cosA*off-v.sinA*ahead-v.extent)
}

// meets reports whether a point of the volume near the axis, under the ceiling,
// is in the scene at the start. No plane could part the two then: this only
// saves time. deep is about how far the two lie in each other.
//
// Level with the point s along the axis, the cylinder holds the places up to its
// radius away, and the cone those up to t away where t <= (s - t) tan A.
func (v *Volume) meets(s *scene) (deep float64, meets bool) {
	if !(v.b.Z > 0) {
		return 0, false
	}
	d := &s.disc[0]
	z := math.Inf(1)
	if v.bh > 1e-6 { // the height at which the axis passes nearest to the disc
		z = (d.x0*v.b.X + d.y0*v.b.Y) * v.b.Z / (v.bh * v.bh)
	}
	low, high := 0.0, v.high-v.extent
	for i := range s.slabs {
		low, high = max(low, s.slab[i].z0-s.slab[i].h0), min(high, s.slab[i].z0+s.slab[i].h0)
	}
	if !(low <= high) {
		return 0, false
	}
	z = min(max(z, low), high)
	along := z / v.b.Z
	x, y := v.b.X*along, v.b.Y*along
	size := 0.0
	if along > v.base {
		size = max(v.base, along*v.sinA/(v.sinA+v.cosA)+v.extent)
	}
	// From the axis toward the disc's centre.
	dx, dy := d.x0-x, d.y0-y
	if off := math.Sqrt(dx*dx + dy*dy); off > size {
		x, y = x+dx*size/off, y+dy*size/off
	} else {
		x, y = d.x0, d.y0
	}
	deep = math.Inf(-1)
	for i := range s.discs {
		d := &s.disc[i]
		out := math.Sqrt((x-d.x0)*(x-d.x0)+(y-d.y0)*(y-d.y0)) - d.r0
		if !(out <= 0) {
			return 0, false
		}
		deep = max(deep, out)
	}
	return deep, true
}

// fill sets out the discs and slabs of the reach over the guard. A disc or slab
// that lies around the other at both ends lies around it at all times (the
// difference of the radii is concave in time, the distance of the centres
// convex), and is left out.
func (r *Reach) fill(s *scene, v *Volume, l *limits, p r3.Vector, age, lag float64) {
	end := age + v.guard
	tau0, tau1 := age+lag, end+lag
	n := 0
	within := false
	if r.course {
		fixed := l.eh + r.speed*r.lambda
		d := disc{
			x0: p.X + r.v.X*age, y0: p.Y + r.v.Y*age, x1: p.X + r.v.X*end, y1: p.Y + r.v.Y*end,
			r0: fixed + (l.evh+l.ah/2*tau0)*tau0, r1: fixed + (l.evh+l.ah/2*tau1)*tau1, q: l.ah / 2,
		}
		within = r.speed*math.Abs(age)+d.r0 <= l.eh+l.v*tau0 && r.speed*math.Abs(end)+d.r1 <= l.eh+l.v*tau1
		s.disc[n] = d
		n++
	}
	if !r.fast && !within {
		s.disc[n] = disc{x0: p.X, y0: p.Y, x1: p.X, y1: p.Y, r0: l.eh + l.v*tau0, r1: l.eh + l.v*tau1}
		n++
	}
	s.discs = n

	n = 0
	within = false
	switch {
	case !r.altitude:
		mid, half := (v.low+v.high)/2, (v.high-v.low)/2
		s.slab[n] = slab{z0: mid, z1: mid, h0: half, h1: half}
		n++
		within = true
	case r.climb:
		w := math.Abs(r.v.Z)
		fixed := l.ez + w*r.lambda
		b := slab{
			z0: p.Z + r.v.Z*age, z1: p.Z + r.v.Z*end,
			h0: fixed + (l.evz+l.az/2*tau0)*tau0, h1: fixed + (l.evz+l.az/2*tau1)*tau1, q: l.az / 2,
		}
		within = w*math.Abs(age)+b.h0 <= l.ez+l.c*tau0 && w*math.Abs(end)+b.h1 <= l.ez+l.c*tau1
		s.slab[n] = b
		n++
	}
	if !r.steep && !within {
		s.slab[n] = slab{z0: p.Z, z1: p.Z, h0: l.ez + l.c*tau0, h1: l.ez + l.c*tau1}
		n++
	}
	s.slabs = n
}
