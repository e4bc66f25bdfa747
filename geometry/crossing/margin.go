package crossing

import (
	"math"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

// Result is how far a beam is from a field. The zero Result is not an answer.
type Result struct {
	// Margin is the angle at the telescope by which the beam is clear, in
	// radians: not clear where zero or less, unknown where NaN.
	Margin float64
	// Rate bounds the change of the margin, in rad/s, until it can have reached
	// zero: as long as beam and axis keep to their rates, for times t up to
	// |Margin|/Rate a positive margin is at least Margin - Rate t, and one of
	// zero or less at most Margin + Rate t.
	Rate float64
	// InTheWay says that the beam comes within twice its radius of the sphere
	// about the telescope's aperture. Margin is then -π less the allowances.
	InTheWay bool
	// Part is the index of the part in which the margin is least.
	Part int
	// Slant is the distance from the launch of the point of least margin;
	// Pair.HeightAt gives its height.
	Slant geometry.Length
}

// And returns the answer for both of two things that must be clear: the least
// margin, with a rate that bounds the change of the two together. One that is
// unknown makes the whole unknown.
func (r Result) And(o Result) Result {
	switch {
	case math.IsNaN(r.Margin) || math.IsNaN(r.Rate):
		return r
	case math.IsNaN(o.Margin) || math.IsNaN(o.Rate):
		return o
	}
	if o.Margin < r.Margin {
		r, o = o, r
	}
	if r.Margin > 0 {
		r.Rate = max(r.Rate, o.Rate*(r.Margin/o.Margin))
	}
	return r
}

func unknown() Result { return Result{Margin: math.NaN(), Rate: math.NaN()} }

// offUnit is how far the square of a direction's length may be from 1.
const offUnit = 1e-6

// Margin returns how far the beam is from the telescope's field, for the unit
// vectors of the beam and of the telescope's axis in the frame of the beam's
// site. A vector that is not finite or not of unit length, or a pair that was
// not prepared, gives NaN.
func (p *Pair) Margin(beam, axis r3.Vector) Result {
	b2, a2 := beam.Norm2(), axis.Norm2()
	if !p.ready || !(math.Abs(b2-1) <= offUnit && math.Abs(a2-1) <= offUnit) {
		return unknown()
	}
	var v view
	v.look(p, beam.Mul(1/math.Sqrt(b2)), axis.Mul(1/math.Sqrt(a2)))
	if !(v.clear > 0) {
		return p.inTheWay(&v)
	}
	var (
		valley, isOne = v.valley()
		margins       [MaxParts]float64
		extents       [MaxParts]extent
		r             = Result{Margin: math.Inf(1)}
		at            float64
	)
	for i := range p.parts[:p.n] {
		o := &p.parts[i]
		e := o.extent(&v)
		// NaN, once there, stays: no number is less.
		s, t := e.from, v.halfTan(e.from)
		if u := v.halfTan(e.until); u < t || math.IsNaN(u) {
			s, t = e.until, u
		}
		if isOne && valley > e.from && valley < e.until {
			if u := v.halfTan(valley); u < t || math.IsNaN(u) {
				s, t = valley, u
			}
		}
		m := 2*math.Atan(t) - o.allowance
		if m < r.Margin || math.IsNaN(m) {
			r.Margin, r.Part, at = m, i, s
		}
		margins[i], extents[i] = m, e
	}
	r.Slant = geometry.Length(at)
	if r.Margin > 0 {
		v.prepare()
		for i := range p.parts[:p.n] {
			r.Rate = max(r.Rate, r.Margin*v.haste(&p.parts[i], extents[i], margins[i]))
		}
	} else {
		r.Rate = v.rise(&p.parts[r.Part], at, -r.Margin)
	}
	if math.IsNaN(r.Margin) || math.IsNaN(r.Rate) {
		return unknown()
	}
	return r
}

// HeightAt returns the height above the ellipsoid of a point of the beam.
func (p *Pair) HeightAt(beam r3.Vector, slant geometry.Length) geometry.Length {
	if !p.ready {
		return geometry.Length(math.NaN())
	}
	return earth.FromECEF(p.frame.ECEF(p.launch.Add(beam.Mul(float64(slant))))).Height
}

// inTheWay is the answer where the beam passes the telescope too closely, which
// it does until it has turned by the depth of its intrusion over the distance.
func (p *Pair) inTheWay(v *view) Result {
	r := Result{InTheWay: true, Slant: geometry.Length(v.closest)}
	for i := range p.parts[:p.n] {
		if m := -math.Pi - p.parts[i].allowance; m < r.Margin {
			r.Margin, r.Part = m, i
		}
	}
	r.Rate = -r.Margin * p.omegaB * v.closest / max(-v.clear, leastLength)
	if math.IsNaN(v.clear) || math.IsNaN(r.Rate) {
		return unknown()
	}
	return r
}

// leastLength keeps quotients finite, in metres.
const leastLength = 1e-9
