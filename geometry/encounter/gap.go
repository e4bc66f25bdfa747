package encounter

import "math"

// across is a disc and a slab over the guard, seen along and across the axis.
type across struct {
	a0, b0, s0, a1, b1, s1 float64 // centre: across (two), along
	r0, r1, h0, h1         float64
	lift                   float64 // what the cylinder and the axis' error take from its gap
	tip0, tip1             float64 // what the way along the axis takes from the cone's
}

func (v *Volume) across(d *disc, s *slab) across {
	w := across{
		a0: v.e1.X*d.x0 + v.e1.Y*d.y0,
		b0: v.e2.X*d.x0 + v.e2.Y*d.y0 + v.e2.Z*s.z0,
		s0: v.b.X*d.x0 + v.b.Y*d.y0 + v.b.Z*s.z0,
		a1: v.e1.X*d.x1 + v.e1.Y*d.y1,
		b1: v.e2.X*d.x1 + v.e2.Y*d.y1 + v.e2.Z*s.z1,
		s1: v.b.X*d.x1 + v.b.Y*d.y1 + v.b.Z*s.z1,
		r0: d.r0, r1: d.r1, h0: s.h0, h1: s.h1,
	}
	ahead := max(0, w.s0+w.r0*v.bh+w.h0*v.bz, w.s1+w.r1*v.bh+w.h1*v.bz)
	w.lift = v.base + v.sinE*ahead
	w.tip0, w.tip1 = v.sinA*w.s0+v.extent, v.sinA*w.s1+v.extent
	return w
}

// gaps raises best, for each shape, to the largest distance by which one of its
// sides parts it from the disc and slab at both ends of the guard, and so
// throughout.
//
// Every side is tried until one parts. From then on only better ones matter,
// and where the gap is positive it has one peak: the walk up and down the ring
// from the side that faces the reach ends once it falls. Comparisons are such
// that a gap that is not a number is never the best.
func (v *Volume) gaps(d *disc, s *slab, best *[shapes]float64) {
	w := v.across(d, s)
	from := sector(w.a0+w.a1, w.b0+w.b1)
	for shape := range best {
		best[shape] = v.walk(&w, from, shape, best[shape])
	}
}

// walk goes round the ring of sides.
func (v *Volume) walk(w *across, from, shape int, best float64) float64 {
	for i := range sides / 2 {
		g := v.sideGap(&v.side[(from+i)%sides], w, shape)
		if g > best {
			best = g
		} else if best > grain {
			break
		}
	}
	for i := range sides / 2 {
		g := v.sideGap(&v.side[(from+sides-1-i)%sides], w, shape)
		if g > best {
			best = g
		} else if best > grain {
			break
		}
	}
	return best
}

// sideGap returns the lesser gap of a shape beside f at the two ends.
func (v *Volume) sideGap(f *side, w *across, shape int) float64 {
	m0, m1 := f.x*w.a0+f.y*w.b0, f.x*w.a1+f.y*w.b1
	g0, g1 := m0-w.r0*f.mh-w.h0*f.mz, m1-w.r1*f.mh-w.h1*f.mz
	if shape == cylinder {
		return v.cosE*min(g0, g1) - w.lift
	}
	return min(g0-v.extent, g1-v.extent,
		v.cosA*m0-w.r0*f.nh-w.h0*f.nz-w.tip0, v.cosA*m1-w.r1*f.nh-w.h1*f.nz-w.tip1)
}

// sector returns the side whose direction is within about 27° of (a, b).
func sector(a, b float64) int {
	const eighth = sides / 8
	switch p, q := math.Abs(a), math.Abs(b); {
	case p >= 2*q && a >= 0:
		return 0
	case p >= 2*q:
		return 4 * eighth
	case q >= 2*p && b >= 0:
		return 2 * eighth
	case q >= 2*p:
		return 6 * eighth
	case a >= 0 && b >= 0:
		return eighth
	case b >= 0:
		return 3 * eighth
	case a >= 0:
		return 7 * eighth
	default:
		return 5 * eighth
	}
}
