package crossing

import (
	"math"

	"github.com/golang/geo/r3"
)

// view is a pair for one direction of the beam and one of the axis, in the
// frame at the telescope of the beam b, of the direction ŵ square to it toward
// the beam's line, and of b × ŵ. The beam's points are v(s) = (s + wb, off, 0).
type view struct {
	*Pair
	wb, off    float64 // w along the beam; the distance of its line
	ax, ay, az float64 // the axis
	line       line
	ahead      float64 // the turn of the beam that is looked ahead at most
	closest    float64 // the s at which the beam is most in the way
	clear      float64 // the distance there, less that at which it is in the way

	// Of the rates.
	a, b, c, vertex, still, free float64
}

// parallel is the part of |w| below which the beam's line is taken to pass
// through the telescope.
const parallel = 1e-12

func (v *view) look(p *Pair, b, a r3.Vector) {
	v.Pair = p
	v.line = line{out: p.center.launch.Dot(b), north: p.center.pole.Dot(b)}
	v.ahead = max(leastTurn, b.Z/2)
	v.wb, v.ax = p.w.Dot(b), a.Dot(b)
	// Two products, so that aside is square to b even where w is nearly along it.
	aside := b.Cross(p.w.Cross(b))
	turn := a.Cross(b)
	if off := aside.Norm(); off > parallel*math.Sqrt(p.w2) {
		v.off = off
		v.ay, v.az = a.Dot(aside)/off, turn.Dot(aside)/off
	} else {
		v.off, v.ay, v.az = 0, turn.Norm(), 0
	}

	// The beam is in the way where |v(s)| <= keep + 2 grow s; the difference is
	// convex in s.
	u := 2 * p.grow
	cos := math.Sqrt(1 - u*u)
	if v.closest = v.off*u/cos - v.wb; v.closest > 0 {
		v.clear = v.off*cos + u*v.wb - p.keep
	} else {
		v.closest, v.clear = 0, math.Sqrt(p.w2)-p.keep
	}
}

// halfTan returns tan(F/2) of F = θ - asin(R/|v|), which lies in (-π/2, π], at
// a distance along the beam at which this is not in the way. It orders points
// as F does and needs no arcs.
func (v *view) halfTan(s float64) float64 {
	x, r := s+v.wb, v.radius+v.grow*s
	d2 := x*x + v.off*v.off
	rim := math.Sqrt(d2 - r*r)
	dot := v.ax*x + v.ay*v.off
	k := v.ax*v.off - v.ay*x
	cross := math.Sqrt(v.az*v.az*d2 + k*k)
	sin, cos := cross*rim-dot*r, dot*rim+cross*r // times |v|²
	if cos >= 0 {
		return sin / (d2 + cos)
	}
	return (d2 - cos) / max(sin, 0) // F is above a right angle: its sine is not negative
}

// valley returns the s at which F is stationary on the beam's whole line, and
// whether there is one. A plane through the telescope with the unit normal n
// touches every ball where n·w = R at the launch and n·b = grow; of the two
// such planes the one on the axis's side counts. Its point nearest to the axis
// lies in the direction in which the ball at s touches it where
// a·(n × w) + s a·(n × b) = 0.
func (v *view) valley() (s float64, ok bool) {
	q := v.grow
	beta := (v.radius - q*v.wb) / v.off
	gamma2 := 1 - q*q - beta*beta
	if !(gamma2 > 0) {
		return 0, false // each ball hides or is hidden by its neighbours: the least is at an end
	}
	gamma := -math.Copysign(math.Sqrt(gamma2), v.az)
	w := (q*v.off-beta*v.wb)*v.az + gamma*(v.wb*v.ay-v.off*v.ax)
	b := gamma*v.ay - beta*v.az
	return -w / b, true // b = 0: infinite or NaN, never between two ends
}
