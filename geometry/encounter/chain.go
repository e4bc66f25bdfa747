package encounter

import (
	"math"

	"beamward/geometry"
)

// arc is c + b t - q t², q >= 0: a gap less the grain as a function of the time
// after the guard's beginning.
type arc struct{ c, b, q float64 }

func (a *arc) at(t float64) float64 { return a.c + (a.b-a.q*t)*t }

// end returns the later root, for an arc that is positive somewhere; infinity
// if it never falls.
func (a *arc) end() float64 {
	root := math.Sqrt(max(0, a.b*a.b+4*a.q*a.c))
	switch {
	case a.b >= 0 && a.q > 0:
		return (a.b + root) / (2 * a.q)
	case a.b < 0:
		return 2 * a.c / (root - a.b)
	default:
		return math.Inf(1)
	}
}

// arcs holds those gaps of one shape that are positive at some time, over both
// discs and both slabs.
type arcs struct {
	list [4 * (sides + planes)]arc
	n    int
	best float64 // greatest of the lesser gaps at the two ends
}

// follow is Touch for the shapes that no side parts for the whole guard, those
// whose best is not above the grain: with every plane, and with chains of them.
func (v *Volume) follow(s *scene, best *[shapes]float64) Answer {
	var a arcs
	until, parted := v.guard, true
	for shape, g := range best {
		if g > grain {
			continue
		}
		a.n, a.best = 0, g
		for i := range s.discs {
			for k := range s.slabs {
				v.collect(&a, &s.disc[i], &s.slab[k], shape)
			}
		}
		best[shape] = a.best
		to, ok := a.chain(v.guard)
		until, parted = min(until, to), parted && ok
	}
	margin := min(best[cylinder], best[cone])
	switch {
	case parted && margin > grain:
		return Answer{Clear: true, Margin: geometry.Length(margin), NotBefore: toDuration(v.guard)}
	case parted:
		return Answer{Clear: true, Margin: grain, NotBefore: toDuration(v.guard)}
	case math.IsInf(margin, -1):
		margin = math.NaN()
	}
	return Answer{Margin: geometry.Length(min(margin, 0)), NotBefore: toDuration(until)}
}

// collect adds the gaps of all planes of a shape from one disc and slab.
func (v *Volume) collect(a *arcs, d *disc, s *slab, shape int) {
	w := v.across(d, s)
	// No gap rises by more than this above both its ends.
	bump := (d.q + s.q) * v.guard * v.guard / 4
	per := 0.0
	if v.guard > 0 {
		per = 1 / v.guard
	}
	add := func(g0, g1, q float64) {
		if g0 > a.best && g1 > a.best {
			a.best = min(g0, g1)
		}
		if g0 > -bump || g1 > -bump {
			a.list[a.n] = arc{c: g0 - grain, b: (g1-g0)*per + q*v.guard, q: q}
			a.n++
		}
	}
	for i := range v.side {
		f := &v.side[i]
		m0, m1 := f.x*w.a0+f.y*w.b0, f.x*w.a1+f.y*w.b1
		if m0 < 0 && m1 < 0 {
			continue
		}
		g0, g1 := m0-w.r0*f.mh-w.h0*f.mz, m1-w.r1*f.mh-w.h1*f.mz
		if shape == cylinder {
			add(v.cosE*g0-w.lift, v.cosE*g1-w.lift, v.cosE*(d.q*f.mh+s.q*f.mz))
		} else if g0 > v.extent+grain && g1 > v.extent+grain {
			add(v.cosA*m0-w.r0*f.nh-w.h0*f.nz-w.tip0, v.cosA*m1-w.r1*f.nh-w.h1*f.nz-w.tip1, d.q*f.nh+s.q*f.nz)
		}
	}
	ends := func(from, to int) {
		for i := from; i < to; i++ {
			f := &v.plane[i]
			add(f.n.X*d.x0+f.n.Y*d.y0+f.n.Z*s.z0-d.r0*f.nh-s.h0*f.nz-f.sigma[shape],
				f.n.X*d.x1+f.n.Y*d.y1+f.n.Z*s.z1-d.r1*f.nh-s.h1*f.nz-f.sigma[shape], d.q*f.nh+s.q*f.nz)
		}
	}
	ends(0, firstCorner)
	// A corner's plane passes the launch at 45° to the axis: it leaves the
	// centre on the volume's side as long as that is nearer to the axis.
	if w.s0 < 0 || w.s1 < 0 || w.a0*w.a0+w.b0*w.b0 > w.s0*w.s0 || w.a1*w.a1+w.b1*w.b1 > w.s1*w.s1 {
		ends(firstCorner, firstRight)
	}
	// The walls are alike on both sides: those on the other one part less.
	if w.a0 > 0 || w.a1 > 0 {
		ends(firstRight, firstLeft)
	}
	if w.a0 <= 0 || w.a1 <= 0 {
		ends(firstLeft, planes)
	}
}

// chain reports whether the planes, one after the other, part throughout, and
// else up to which time.
//
// For one plane the gap is a concave function of time, so the times at which it
// parts form one interval, open at both ends. A plane that parts at the time
// reached carries on to its own end; if none does, none of any choice would.
// A plane that was left is never taken again, which bounds the rounds.
func (a *arcs) chain(guard float64) (until float64, ok bool) {
	for moved := true; moved; {
		moved = false
		for i := range a.list[:a.n] {
			if p := &a.list[i]; p.at(until) > 0 {
				if end := p.end(); end > until {
					until, moved = end, true
				}
			}
			if until > guard {
				return guard, true
			}
		}
	}
	return until, false
}
