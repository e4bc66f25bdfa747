package closures

import (
	"math"

	"beamward/geometry/crossing"

	"github.com/golang/geo/r3"
)

// shut returns a time in seconds for which the margin surely stays at spare or
// less; 0 where that cannot be told. lift is as for clear.
func (p *passage) shut(beam, axis r3.Vector, r *crossing.Result, spare, lift float64) float64 {
	if !p.followSky || r.InTheWay || r.Part >= len(p.parts) || !(beam.Z > 0.05) {
		return 0
	}
	leap := min(longestShut, beam.Z/8)
	s, ok := p.within(beam, r.Part, float64(r.Slant), leap)
	half := p.allowance + spare + lift
	if !ok || !(half < 1.5) {
		return 0
	}
	t := touch{passage: p, s: s, half: half, narrows: p.axisTurns}
	if lift > 0 {
		t.narrows += (skyTurn + p.axisTurns) * lowLift / lowFades
	}
	t.v = p.w.Add(beam.Mul(s))
	t.along = t.v.Dot(axis)
	most := min(leap/(skyTurn+p.turns), 0.2*t.v.Norm()/(p.swing+s*p.turns))
	guess := min(most, t.leaves(axis))
	for range 4 {
		if t.lasts(beam, axis, guess) {
			return guess
		}
		guess *= 0.4
	}
	return 0
}

// touch is the ball at one distance along the beam that touches the cone.
type touch struct {
	*passage
	s       float64
	half    float64 // half angle of the cone, rad
	narrows float64 // how fast that may shrink, rad/s
	v       r3.Vector
	along   float64 // v along the axis
}

// leaves guesses when the ball leaves the cone: it moves straight.
func (t *touch) leaves(axis r3.Vector) float64 {
	y := t.pole.Cross(t.w).Mul(skyTurn)
	d := t.v.Norm()
	c := math.Cos(min(math.Pi/2, t.half+(t.radius+t.grow*t.s)/d))
	c *= c
	// (v·a + y·a t)² = c (v + y t)²
	ya := y.Dot(axis)
	q2, q1, q0 := ya*ya-c*y.Norm2(), t.along*ya-c*t.v.Dot(y), t.along*t.along-c*d*d
	root := math.Sqrt(q1*q1 - q2*q0)
	if at := max((-q1+root)/q2, (-q1-root)/q2); at > 0 {
		return 0.98 * at
	}
	return math.Inf(1)
}

// lasts reports whether the ball surely touches the cone until a time from now.
// What touches a convex cone is convex: where the ball does at both ends of the
// chord of its way, it does all along that, and its way bends from the chord by
// no more than an eighth of Ω² |w| t².
func (t *touch) lasts(beam, axis r3.Vector, until float64) bool {
	if !(until > 0) {
		return false
	}
	ball := t.radius + t.grow*t.s - skyTurn*t.swing*until*until/8 - t.s*t.turns*until
	half := t.half - t.narrows*until
	touches := func(v r3.Vector, along float64) bool {
		d := v.Norm()
		return math.Atan2(v.Cross(axis).Norm(), along) <= half+math.Asin(min(1, ball/d))
	}
	if !(half > 0) || !touches(t.v, t.along) {
		return false
	}
	sin, cos := math.Sincos(skyTurn * until)
	w := t.w.Mul(cos).Add(t.pole.Cross(t.w).Mul(sin)).Add(t.pole.Mul(t.pole.Dot(t.w) * (1 - cos)))
	v := w.Add(beam.Mul(t.s))
	return touches(v, v.Dot(axis))
}

// within returns the distance nearest to s that surely lies within a part for a
// leap, whatever the true direction.
func (p *passage) within(beam r3.Vector, part int, s, leap float64) (float64, bool) {
	o := &p.parts[part]
	// No line through the launch is higher at s than rises s + s²/2R, nor lower
	// than sinks s.
	rises, sinks := beam.Z+leap+p.grow+tilt, beam.Z-leap-p.grow-tilt
	top := float64(o.Until) - p.launch - topEdge
	until := 2 * top / (rises + math.Sqrt(rises*rises+2*top/leastRadius))
	from := 0.0
	if bottom := float64(o.From) - p.launch + topEdge; bottom > topEdge {
		from = bottom / sinks
	}
	return max(from, min(s, until)), top > 0 && sinks > 0 && from <= until
}
