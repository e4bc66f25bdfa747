package encounter

import (
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
)

// Report is one accepted report of one aircraft: assumption (R) of the package
// comment. Vectors are in the site's frame, X east, Y north, Z up, in metres
// and metres a second, converted from the ellipsoid exactly (Place).
//
// The zero value of each Known field claims the least. Every number must be
// finite and every error and latency at least zero, also those that the Known
// fields leave unused; else the reach is everywhere.
type Report struct {
	// At is the instant that the report claims for its position and velocity.
	// The true one lies in [At-Early, At+Late].
	At          time.Time
	Early, Late time.Duration

	Position      r3.Vector
	PositionError Error
	// AltitudeKnown false: the aircraft may be at any height of the keep-out.
	// Position is then any point on the vertical through it, say at the
	// site's height.
	AltitudeKnown bool

	// Velocity counts in X and Y if CourseKnown, in Z if ClimbKnown. Where it
	// was measured at another instant than the position, its error must hold
	// the acceleration in between. With only the course known, X and Y are
	// those of level flight.
	Velocity      r3.Vector
	VelocityError SpeedError
	CourseKnown   bool
	ClimbKnown    bool
}

// Error is a hard bound on the error of a position, about the aircraft's own
// vertical.
type Error struct{ Horizontal, Vertical geometry.Length }

// SpeedError is a hard bound on the error of a velocity.
type SpeedError struct{ Horizontal, Vertical geometry.Speed }

// Reach is every place where an aircraft could be, given one report and the
// bounds on its motion: R(u) of the package comment, ready to be asked. The
// zero value is everywhere: it touches every keep-out.
type Reach struct {
	at                  time.Time
	early, late, lambda float64 // s; lambda is the larger of the two
	p, v                r3.Vector
	speed               float64 // m/s, horizontal part of v
	away                float64 // m, horizontal distance of p from the site
	eh, ez, evh, evz    float64
	ah, az, vmax, cmax  float64
	altitude            bool
	course, climb       bool
	fast, steep         bool // the report contradicts the bound on speed, on climb
	valid               bool
}

// Of returns the reach of an aircraft that moves within m and was reported as
// r. A number that is not finite or an error below zero gives the reach that
// is everywhere.
//
// A report whose speed exceeds m's by more than its error contradicts (M): for
// it the bound on speed is dropped and that on acceleration stays, so that the
// reach only grows. The same holds for the climb rate.
func Of(r *Report, m *Motion) Reach {
	eh, ez := float64(r.PositionError.Horizontal), float64(r.PositionError.Vertical)
	evh, evz := float64(r.VelocityError.Horizontal), float64(r.VelocityError.Vertical)
	if !m.valid() || !geometry.FiniteVector(r.Position) || !geometry.FiniteVector(r.Velocity) || !geometry.Finite(eh, ez, evh, evz) ||
		!(eh >= 0 && ez >= 0 && evh >= 0 && evz >= 0 && r.Early >= 0 && r.Late >= 0) {
		return Reach{}
	}
	w := Reach{
		at: r.At, early: seconds(r.Early), late: seconds(r.Late),
		p: r.Position, v: r.Velocity,
		eh: eh, ez: ez, evh: evh, evz: evz,
		ah: float64(m.HorizontalAcceleration), az: float64(m.VerticalAcceleration), vmax: float64(m.Speed), cmax: float64(m.Climb),
		altitude: r.AltitudeKnown, course: r.CourseKnown, climb: r.ClimbKnown,
		valid: true,
	}
	w.lambda = max(w.early, w.late)
	w.away = math.Hypot(w.p.X, w.p.Y)
	if !w.course {
		w.v.X, w.v.Y = 0, 0
	}
	if !w.climb {
		w.v.Z = 0
	}
	w.speed = math.Hypot(w.v.X, w.v.Y)
	// The claimed velocity is in the site's frame, whose vertical leans from
	// the aircraft's by at most away/leastRadius: what leans over is no
	// contradiction.
	lean := min(1, (w.away+w.eh)/leastRadius)
	w.fast = w.course && !(w.speed-evh <= w.vmax+lean*(w.cmax+evz))
	w.steep = w.climb && !(math.Abs(w.v.Z)-evz <= w.cmax+lean*(w.vmax+evh))
	return w
}

// Valid reports whether the reach is bounded at all.
func (r *Reach) Valid() bool { return r.valid }

// Contradicts reports whether the report claims a speed or a climb rate that
// the bounds on motion exclude, whatever its error. Its reach is then larger
// than the bounds would give, and the theorem's assumption (M) is in doubt.
func (r *Reach) Contradicts() bool { return r.fast || r.steep }

func seconds(d time.Duration) float64 { return float64(d) * 1e-9 }

// leastRadius is less than any radius of curvature of the WGS 84 ellipsoid,
// whose least is a(1-e²) = 6335.4 km, at the equator along the meridian. Over
// a horizontal distance d verticals lean by less than d/leastRadius.
const leastRadius = 6.3e6

// limits are the bounds about the site's vertical: those about the aircraft's
// own, enlarged by the lean between the two.
type limits struct{ eh, ez, evh, evz, ah, az, v, c float64 }

// lag returns L such that τ(u) = u - At + L bounds |u - m| for every instant u
// from age seconds after At on. It is Early, but for a report whose true
// instant may lie after u, by Late or since it is stamped ahead of the clock.
func (r *Reach) lag(age float64) float64 { return max(r.early, r.late-2*age) }

// limits returns the bounds that hold until tau seconds after the true
// instant. column is the height, up or down from the stated position, that an
// aircraft of unknown altitude may be at; a point on its vertical leans by
// that much times the lean.
func (r *Reach) limits(tau, column float64) limits {
	v := r.vmax
	if r.fast {
		v = r.speed + r.evh + r.ah*tau
	}
	c := r.cmax
	if r.steep {
		c = math.Abs(r.v.Z) + r.evz + r.az*tau
	}
	lean := min(1, (r.away+r.eh+v*tau)/leastRadius)
	l := limits{
		eh:  r.eh + lean*r.ez,
		ez:  r.ez + lean*r.eh,
		evh: r.evh + lean*r.evz,
		evz: r.evz + lean*r.evh,
		// Level flight follows the Earth's curve, which bends it down by v²/R.
		ah: r.ah + lean*r.az + v*c/leastRadius,
		az: r.az + lean*r.ah + v*v/leastRadius,
		v:  v + lean*c,
		c:  c + lean*v,
	}
	if !r.altitude {
		l.eh += lean * (column + c*tau)
	}
	if !r.climb {
		l.evh += lean * c
	}
	if !r.course {
		l.evz += lean * v
	}
	return l
}

// Holds reports whether the aircraft could be at x at the instant u: whether x
// is in R(u). Heights do not count where the altitude is unknown; column is
// then the height range within which the answer is wanted. A reach that is not
// valid holds everything.
func (r *Reach) Holds(x r3.Vector, u time.Time, column geometry.Length) bool {
	if !r.valid || !geometry.FiniteVector(x) || !geometry.Finite(float64(column)) {
		return true
	}
	t := seconds(u.Sub(r.at))
	tau := t + r.lag(t)
	l := r.limits(tau, math.Abs(float64(column)))
	out := false
	if r.course {
		d := math.Hypot(x.X-r.p.X-r.v.X*t, x.Y-r.p.Y-r.v.Y*t)
		out = out || d > l.eh+r.speed*r.lambda+l.evh*tau+l.ah*tau*tau/2
	}
	if !r.fast {
		out = out || math.Hypot(x.X-r.p.X, x.Y-r.p.Y) > l.eh+l.v*tau
	}
	if r.altitude && r.climb {
		out = out || math.Abs(x.Z-r.p.Z-r.v.Z*t) > l.ez+math.Abs(r.v.Z)*r.lambda+l.evz*tau+l.az*tau*tau/2
	}
	if r.altitude && !r.steep {
		out = out || math.Abs(x.Z-r.p.Z) > l.ez+l.c*tau
	}
	return !out
}
