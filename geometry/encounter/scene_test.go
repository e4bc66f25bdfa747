package encounter

import (
	"math"
	"math/rand/v2"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// trial is everything one question is made of. Tests change parts of it.
type trial struct {
	k      KeepOut
	m      Motion
	r      Report
	at     time.Time
	guard  time.Duration
	enters time.Duration // when the true aircraft is in the true keep-out
	where  r3.Vector     // and where
}

func (t *trial) touch() Answer {
	var v Volume
	v.Set(&t.k, t.at, t.guard)
	w := Of(&t.r, &t.m)
	return v.Touch(&w)
}

func between(g *rand.Rand, low, high float64) float64 { return low + (high-low)*g.Float64() }

func span(g *rand.Rand, low, high float64) time.Duration {
	return time.Duration(between(g, low, high) * 1e9)
}

// extreme is a number in [-1, 1] that is at an end half of the time.
func extreme(g *rand.Rand) float64 {
	switch g.IntN(4) {
	case 0:
		return 1
	case 1:
		return -1
	}
	return between(g, -1, 1)
}

// within is a horizontal vector no longer than size, half of the time as long.
func within(g *rand.Rand, size float64) r3.Vector {
	s, c := math.Sincos(between(g, 0, 2*math.Pi))
	size *= math.Abs(extreme(g))
	return r3.Vector{X: size * c, Y: size * s}
}

// tilted is a unit vector at most angle from the unit vector b.
func tilted(g *rand.Rand, b r3.Vector, angle float64) r3.Vector {
	e1 := b.Ortho()
	e2 := b.Cross(e1)
	s, c := math.Sincos(between(g, 0, 2*math.Pi))
	ts, tc := math.Sincos(angle * math.Abs(extreme(g)))
	return b.Mul(tc).Add(e1.Mul(ts * c)).Add(e2.Mul(ts * s)).Normalize()
}

// someKeepOut draws a keep-out of any size in use.
func someKeepOut(g *rand.Rand) KeepOut {
	elevation := between(g, 25, 90)
	if g.IntN(20) == 0 {
		elevation = 90
	}
	return KeepOut{
		Launch:    r3.Vector{X: between(g, -50, 50), Y: between(g, -50, 50), Z: between(g, 0, 30)},
		Axis:      geometry.FromHorizon(s1.Angle(between(g, 0, 360))*s1.Degree, s1.Angle(elevation)*s1.Degree),
		HalfAngle: s1.Angle(between(g, 0, 6)) * s1.Degree, Radius: geometry.Length(between(g, 0, 600)),
		Ceiling: geometry.Length(between(g, 8000, 20000)), Extent: geometry.Length(between(g, 0, 80)),
		AxisError: s1.Angle(between(g, 0, 0.5)) * s1.Degree, AxisRate: s1.Angle(between(g, 0, 0.2)) * s1.Degree,
	}
}

// pointOf draws a point of the true keep-out about the axis b: of the cone or
// the cylinder, often of its edge, then moved by at most the extent. With out
// it is the outermost on that side, square to b.
func pointOf(g *rand.Rand, k *KeepOut, b r3.Vector, out *r3.Vector) r3.Vector {
	for {
		e1 := b.Ortho()
		e2 := b.Cross(e1)
		s, c := math.Sincos(between(g, 0, 2*math.Pi))
		side := e1.Mul(c).Add(e2.Mul(s))
		along := between(g, 0, 1)
		along *= along * 1.3 * (float64(k.Ceiling) - k.Launch.Z) / math.Max(b.Z, 0.2)
		off := float64(k.Radius)
		if cone := along * math.Tan(k.HalfAngle.Radians()); g.IntN(2) == 0 || out != nil && cone > off {
			off = cone
		}
		far := math.Abs(extreme(g))
		d := r3.Vector{X: g.NormFloat64(), Y: g.NormFloat64(), Z: g.NormFloat64()}.Normalize().Mul(math.Abs(extreme(g)))
		if out != nil {
			side, far, d = *out, 1, *out
		}
		x := k.Launch.Add(b.Mul(along)).Add(side.Mul(off * far))
		if x.Z > float64(k.Ceiling) {
			continue
		}
		return x.Add(d.Mul(float64(k.Extent)))
	}
}

// limit scales a horizontal vector down to the length size.
func limit(v r3.Vector, size float64) r3.Vector {
	if n := math.Hypot(v.X, v.Y); n > size {
		return r3.Vector{X: v.X * size / n, Y: v.Y * size / n}
	}
	return r3.Vector{X: v.X, Y: v.Y}
}

// The ways an aircraft flies in the trials.
const (
	straight = iota
	bangBang // full acceleration one way, then another
	turning  // full sideways acceleration
	climbing // full vertical acceleration, then none left to gain
	pursuit  // full acceleration toward the beam
	restless // another acceleration at each step
	manners
)

// intruder draws a trial whose true aircraft is in the true keep-out at one
// instant of the guard, by flying backward from there to the report. Every
// assumption of the theorem holds, most at its very edge; so the only right
// answer is touched. Motion here is about the site's vertical.
//
// In half of the trials everything conspires: beam and aircraft turn toward
// each other while every error of the report points away.
func intruder(g *rand.Rand, manner int) trial {
	t := trial{k: someKeepOut(g), at: epoch, guard: span(g, 0.5, 6)}
	t.m = Motion{
		HorizontalAcceleration: geometry.Acceleration(between(g, 2, 30)), VerticalAcceleration: geometry.Acceleration(between(g, 1, 8)),
		Speed: geometry.Speed(between(g, 60, 350)), Climb: geometry.Speed(between(g, 5, 40)),
	}
	if g.IntN(20) == 0 {
		t.guard = 0
	}
	vmax, cmax := float64(t.m.Speed), float64(t.m.Climb)
	ah, az := float64(t.m.HorizontalAcceleration), float64(t.m.VerticalAcceleration)
	t.enters = time.Duration(float64(t.guard) * g.Float64())
	turn := t.k.AxisError.Radians() + t.k.AxisRate.Radians()*t.enters.Seconds()
	b := tilted(g, t.k.Axis, turn)
	conspire := g.IntN(2) == 0
	var away r3.Vector // horizontal and vertical part each of length 1, or about
	var x r3.Vector
	if conspire {
		e1 := t.k.Axis.Ortho()
		s, c := math.Sincos(between(g, 0, 2*math.Pi))
		d := e1.Mul(c).Add(t.k.Axis.Cross(e1).Mul(s))
		b = t.k.Axis.Mul(math.Cos(turn)).Add(d.Mul(math.Sin(turn)))
		out := d.Mul(math.Cos(turn)).Sub(t.k.Axis.Mul(math.Sin(turn)))
		x = pointOf(g, &t.k, b, &out)
		h := math.Hypot(d.X, d.Y)
		away = r3.Vector{X: d.X / h, Y: d.Y / h, Z: math.Copysign(1, d.Z)}
	} else {
		x = pointOf(g, &t.k, b, nil)
	}
	t.where = x
	v := within(g, vmax)
	if conspire && g.IntN(3) == 0 { // out along the beam, or in
		v = limit(t.k.Axis.Mul(1e4*extreme(g)), vmax)
	}
	v.Z = cmax * extreme(g)

	t.r = Report{
		Early: span(g, 0, 4), Late: span(g, 0, 2), AltitudeKnown: true, CourseKnown: true, ClimbKnown: true,
		PositionError: Error{Horizontal: geometry.Length(between(g, 0, 300)), Vertical: geometry.Length(between(g, 0, 800))},
		VelocityError: SpeedError{Horizontal: geometry.Speed(between(g, 0, 30)), Vertical: geometry.Speed(between(g, 0, 8))},
	}
	// The report was true that long before the guard begins; rarely after.
	old := span(g, 0, 8)
	if g.IntN(10) == 0 {
		old = -span(g, 0, 0.4)
	}
	const step = 0.05
	push := within(g, ah)
	lift := az * extreme(g)
	if conspire {
		push, lift = away.Mul(-ah), -away.Z*az
	}
	back := (t.enters + old).Seconds()
	sign := 1.0
	if back < 0 {
		back, sign = -back, -1
	}
	toBeam := x.Sub(t.k.Launch).Sub(t.k.Axis.Mul(x.Sub(t.k.Launch).Dot(t.k.Axis)))
	for done, n := 0.0, 0; done < back; n++ {
		dt := math.Min(step, back-done)
		done += dt
		a := r3.Vector{}
		switch manner {
		case bangBang:
			if n%40 == 39 && !conspire {
				push, lift = within(g, ah), az*extreme(g)
			}
			a = r3.Vector{X: push.X, Y: push.Y, Z: lift}
		case turning:
			if s := math.Hypot(v.X, v.Y); s > 1 {
				a = r3.Vector{X: -v.Y * ah / s, Y: v.X * ah / s}
			}
		case climbing:
			a.Z = lift
		case pursuit:
			a = limit(toBeam.Mul(-1e3*sign), ah)
			a.Z = lift
		case restless:
			a = within(g, ah)
			a.Z = az * extreme(g)
		}
		w := v.Sub(a.Mul(sign * dt))
		if math.Hypot(w.X, w.Y) > vmax {
			a.X, a.Y = 0, 0
		}
		if math.Abs(w.Z) > cmax {
			a.Z = 0
		}
		x = x.Sub(v.Mul(sign * dt)).Add(a.Mul(dt * dt / 2))
		v = v.Sub(a.Mul(sign * dt))
	}
	truth := t.at.Add(-old)
	// The true instant is in [At-Early, At+Late].
	t.r.At = truth.Add(time.Duration(float64(t.r.Early)*g.Float64()) - time.Duration(float64(t.r.Late)*g.Float64()))
	switch g.IntN(4) {
	case 0:
		t.r.At = truth.Add(t.r.Early)
	case 1:
		t.r.At = truth.Add(-t.r.Late)
	}
	miss := within(g, float64(t.r.PositionError.Horizontal))
	miss.Z = float64(t.r.PositionError.Vertical) * extreme(g)
	wrong := within(g, float64(t.r.VelocityError.Horizontal))
	wrong.Z = float64(t.r.VelocityError.Vertical) * extreme(g)
	if conspire {
		miss = r3.Vector{X: away.X, Y: away.Y}.Mul(float64(t.r.PositionError.Horizontal))
		miss.Z = away.Z * float64(t.r.PositionError.Vertical)
		wrong = r3.Vector{X: away.X, Y: away.Y}.Mul(float64(t.r.VelocityError.Horizontal))
		wrong.Z = away.Z * float64(t.r.VelocityError.Vertical)
		if v.X*away.X+v.Y*away.Y < 0 { // flying in: seen less far on its way
			t.r.At = truth.Add(t.r.Early)
		} else {
			t.r.At = truth.Add(-t.r.Late)
		}
	}
	t.r.Position = x.Add(miss)
	t.r.Velocity = v.Add(wrong)
	return t
}
