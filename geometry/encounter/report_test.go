package encounter

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// The hard bounds against the normal distribution: a 2-D normal exceeds r with
// the chance exp(-r²/2σ²), an error on a line with erfc(r/σ√2).
func TestHardBoundsAreExceededOnceInTenMillion(t *testing.T) {
	r95 := math.Sqrt(-2 * math.Log(0.05)) // of σ = 1
	r := float64(HardHorizontal(geometry.Length(r95)))
	if p := math.Exp(-r * r / 2); !(p <= 1e-7 && p > 0.98e-7) {
		t.Errorf("horizontal: exceeded with the chance %g", p)
	}
	h95 := math.Sqrt2 * math.Erfcinv(0.05)
	h := float64(HardVertical(geometry.Length(h95)))
	if p := math.Erfc(h / math.Sqrt2); !(p <= 1e-7 && p > 0.95e-7) {
		t.Errorf("vertical: exceeded with the chance %g", p)
	}
	if HardSpeed(10) != 23.2 || HardClimb(10) != geometry.Speed(HardVertical(10)) {
		t.Errorf("speeds: %v and %v", HardSpeed(10), HardClimb(10))
	}
}

// An aircraft that flies over the ellipsoid, its bounds about its own vertical,
// stays in the reach in the site's flat frame: near, far, and where verticals
// lean by degrees. Its speeds and accelerations are at their bounds.
func TestReachHoldsOnTheCurvedEarth(t *testing.T) {
	g := rand.New(rand.NewPCG(19, 23))
	sites := []earth.Position{
		{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450},
		{Lat: 0, Lon: 0, Height: 0}, {Lat: 60 * s1.Degree, Lon: 10 * s1.Degree, Height: 100}, {Lat: 84 * s1.Degree, Lon: -170 * s1.Degree, Height: 0},
	}
	m := Civil()
	ah, az, vmax, cmax := float64(m.HorizontalAcceleration), float64(m.VerticalAcceleration), float64(m.Speed), float64(m.Climb)
	used := 0.0
	for range 1500 {
		at := sites[g.IntN(len(sites))]
		site := earth.FrameAt(at)
		s, k := math.Sincos(between(g, 0, 2*math.Pi))
		away := between(g, 0, 1) * between(g, 0, 250e3)
		p := earth.Position{
			Lat: at.Lat + s1.Angle(away*k/6.36e6), Lon: at.Lon + s1.Angle(away*s/(6.37e6*math.Cos(at.Lat.Radians()))),
			Height: geometry.Length(between(g, 0, 15000)),
		}
		v := within(g, vmax)
		v.Z = cmax * extreme(g)
		r := Report{
			At: epoch, AltitudeKnown: true, CourseKnown: true, ClimbKnown: true,
			PositionError: Error{Horizontal: geometry.Length(between(g, 0, 300)), Vertical: geometry.Length(between(g, 0, 1000))},
			VelocityError: SpeedError{Horizontal: geometry.Speed(between(g, 0, 20)), Vertical: geometry.Speed(between(g, 0, 10))},
		}
		// Reported with errors about its own vertical.
		miss := within(g, float64(r.PositionError.Horizontal))
		miss.Z = float64(r.PositionError.Vertical) * extreme(g)
		wrong := within(g, float64(r.VelocityError.Horizontal))
		wrong.Z = float64(r.VelocityError.Vertical) * extreme(g)
		own := earth.FrameAt(p)
		seen := position(own.ECEF(miss))
		r.Position, r.Velocity = Place(site, seen, geometry.Speed(v.X+wrong.X), geometry.Speed(v.Y+wrong.Y), geometry.Speed(v.Z+wrong.Z))
		switch g.IntN(4) {
		case 0:
			r.CourseKnown = false
		case 1:
			r.Position, r.Velocity = Place(site, seen, geometry.Speed(v.X+wrong.X), geometry.Speed(v.Y+wrong.Y), 0)
			r.ClimbKnown = false
		}
		w := Of(&r, &m)
		if w.Contradicts() {
			t.Fatalf("a report within its bounds contradicts them\n%+v", r)
		}
		const step = 0.1
		push, lift := within(g, ah), az*extreme(g)
		turn := g.IntN(3)
		for u := 0.0; u < 12; u += step {
			a := r3.Vector{X: push.X, Y: push.Y}
			if n := math.Hypot(v.X, v.Y); turn == 0 && n > 1 {
				a = r3.Vector{X: -v.Y * ah / n, Y: v.X * ah / n}
			} else if turn == 1 {
				a = r3.Vector{}
			}
			a.Z = lift
			next := v.Add(a.Mul(step))
			if math.Hypot(next.X, next.Y) > vmax {
				a.X, a.Y = 0, 0
			}
			if math.Abs(next.Z) > cmax {
				a.Z = 0
			}
			// One step along the local tangent, then onto the curve again: the
			// velocity keeps its local components.
			mid := v.Add(a.Mul(step / 2))
			own := earth.FrameAt(p)
			flat := position(own.ECEF(r3.Vector{X: mid.X * step, Y: mid.Y * step}))
			p = earth.Position{Lat: flat.Lat, Lon: flat.Lon, Height: p.Height + geometry.Length(mid.Z*step)}
			v = v.Add(a.Mul(step))
			x := site.ENU(p.ECEF())
			when := epoch.Add(time.Duration((u + step) * 1e9))
			if !w.Holds(x, when, 0) {
				t.Fatalf("after %.1f s at %v, %.0f m from the site, the aircraft is outside the reach\n%+v", u+step, x, math.Hypot(x.X, x.Y), r)
			}
		}
		used = max(used, away)
	}
	t.Logf("up to %.0f km from the site", used/1000)
}

// position inverts Position.ECEF by a few steps, for this test.
func position(x r3.Vector) earth.Position {
	p := earth.Position{Lat: s1.Angle(math.Atan2(x.Z, math.Hypot(x.X, x.Y))), Lon: s1.Angle(math.Atan2(x.Y, x.X))}
	for range 6 {
		d := earth.FrameAt(p).ENU(x)
		p.Lat += s1.Angle(d.Y / (6.37e6 + float64(p.Height)))
		p.Lon += s1.Angle(d.X / ((6.37e6 + float64(p.Height)) * math.Cos(p.Lat.Radians())))
		p.Height += geometry.Length(d.Z)
	}
	return p
}

// With no error and no acceleration to hide in, what is left is what the lean
// of verticals and the Earth's curve make of level flight and steady climbs.
func TestReachHoldsSteadyFlightFarAway(t *testing.T) {
	site := earth.FrameAt(earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450})
	m := Motion{Speed: 350, Climb: 30}
	for _, v := range []r3.Vector{{Y: 350}, {Y: 200, Z: 30}, {Y: -250, Z: -30}, {Z: 30}} { // along the meridian: a parallel is a turn
		for _, known := range []bool{true, false} {
			p := earth.Position{Lat: -30 * s1.Degree, Lon: -4.5 * s1.Degree, Height: 6000}
			r := Report{At: epoch, AltitudeKnown: true, CourseKnown: true, ClimbKnown: known}
			r.Position, r.Velocity = Place(site, p, geometry.Speed(v.X), geometry.Speed(v.Y), 0)
			if known {
				r.Position, r.Velocity = Place(site, p, geometry.Speed(v.X), geometry.Speed(v.Y), geometry.Speed(v.Z))
			}
			w := Of(&r, &m)
			const step = 0.05
			for u := step; u < 30; u += step {
				p.Height += geometry.Length(v.Z * step / 2)
				flat := position(earth.FrameAt(p).ECEF(r3.Vector{X: v.X * step, Y: v.Y * step}))
				p = earth.Position{Lat: flat.Lat, Lon: flat.Lon, Height: p.Height + geometry.Length(v.Z*step/2)}
				if x := site.ENU(p.ECEF()); !w.Holds(x, epoch.Add(time.Duration(u*1e9)), 0) {
					t.Fatalf("velocity %v, climb known %v: after %.2f s outside the reach", v, known, u)
				}
			}
		}
	}
}

// An aircraft of unknown altitude touches the keep-out that it is in, though
// its stated point, high above on its own vertical, lies beyond the keep-out's
// far end.
func TestColumnLeansWithItsOwnVertical(t *testing.T) {
	site := earth.FrameAt(earth.Position{Lat: 40 * s1.Degree})
	for az := 0.0; az < 360; az += 15 {
		c := trial{at: epoch, guard: time.Second}
		c.k = KeepOut{Axis: geometry.FromHorizon(s1.Angle(az)*s1.Degree, 22*s1.Degree), Radius: 5, Ceiling: 17000}
		x := c.k.Axis.Mul(16990 / c.k.Axis.Z) // on the axis, 42 km out
		p := position(site.ECEF(x))
		p.Height = 60e3
		c.r = Report{At: epoch}
		c.r.Position, _ = Place(site, p, 0, 0, 0)
		if beyond := math.Hypot(c.r.Position.X, c.r.Position.Y) - math.Hypot(x.X, x.Y); beyond < 200 {
			t.Fatalf("the column leans by only %.0f m", beyond)
		}
		if a := c.touch(); a.Clear {
			t.Errorf("azimuth %v: %+v", az, a)
		}
	}
}

// Place against the definition: a position moved for a short time.
func TestPlaceTurnsVelocities(t *testing.T) {
	site := earth.FrameAt(earth.Position{Lat: 50 * s1.Degree, Lon: 20 * s1.Degree, Height: 1000})
	p := earth.Position{Lat: 51 * s1.Degree, Lon: 22 * s1.Degree, Height: 11000}
	x, v := Place(site, p, 200, -100, 5)
	own := earth.FrameAt(p)
	moved := site.ENU(own.ECEF(r3.Vector{X: 200, Y: -100, Z: 5}))
	if d := moved.Sub(x).Sub(v).Norm(); !(d < 1e-6) {
		t.Errorf("off by %g m/s", d)
	}
	if level := math.Abs(v.Z - 5); !(level > 1) {
		t.Errorf("the lean of 2° shows in the climb by only %g m/s", level)
	}
}

// A report that contradicts the bound on speed keeps a reach that holds it.
func TestFasterThanTheBound(t *testing.T) {
	m := Civil()
	r := airliner(r3.Vector{X: 30e3, Z: 9e3})
	r.Velocity = r3.Vector{X: -600, Z: -80}
	w := Of(&r, &m)
	if !w.Contradicts() || !w.Valid() {
		t.Fatalf("contradicts %v, valid %v", w.Contradicts(), w.Valid())
	}
	for s := 0.0; s < 20; s++ {
		x := r.Position.Add(r.Velocity.Mul(s))
		if !w.Holds(x, r.At.Add(time.Duration(s*1e9)), 0) {
			t.Errorf("after %v s its own course is outside the reach", s)
		}
	}
	if ok := airliner(r3.Vector{}); func() bool { w := Of(&ok, &m); return w.Contradicts() }() {
		t.Error("an ordinary airliner contradicts the bounds")
	}
}

// The replacement rule.
func TestReplaces(t *testing.T) {
	m := Civil()
	first := airliner(r3.Vector{X: 10e3, Y: 5e3, Z: 9e3})
	w := Of(&first, &m)
	after := func(d time.Duration, change func(*Report)) Report {
		r := first
		r.At = r.At.Add(d)
		r.Position = r.Position.Add(r.Velocity.Mul(d.Seconds()))
		change(&r)
		return r
	}
	for _, c := range []struct {
		name string
		want bool
		r    Report
	}{
		{"the same again", true, first},
		{"straight on", true, after(time.Second, func(*Report) {})},
		{"a turn", true, after(2*time.Second, func(r *Report) { r.Velocity = r3.Vector{X: 228, Y: 40, Z: 0} })},
		{"no velocity", true, after(time.Second, func(r *Report) { r.CourseKnown, r.ClimbKnown = false, false })},
		{"no altitude", true, after(time.Second, func(r *Report) { r.AltitudeKnown = false; r.Position.Z = 0 })},
		{"an older one", false, after(-time.Millisecond, func(*Report) {})},
		{"a jump aside", false, after(time.Second, func(r *Report) { r.Position.Y += 2000 })},
		{"a jump in height", false, after(time.Second, func(r *Report) { r.Position.Z += 600 })},
		{"a jump with a large error", false, after(time.Second, func(r *Report) { r.Position.Y += 2000; r.PositionError.Horizontal = 5000 })},
		{"turned about at once", false, after(time.Second, func(r *Report) { r.Velocity.X = -r.Velocity.X })},
		{"a climb out of nothing", false, after(time.Second, func(r *Report) { r.Velocity.Z = 28 })},
		{"not a number", false, after(time.Second, func(r *Report) { r.Position.X = math.NaN() })},
		{"velocity not a number", false, after(time.Second, func(r *Report) { r.Velocity.X = math.NaN() })},
		{"a jump long after", true, after(30*time.Second, func(r *Report) { r.Position.Y += 2000 })},
		{"farther than it can fly", false, after(30*time.Second, func(r *Report) { r.Position.X += 8000; r.CourseKnown = false })},
	} {
		if got := Replaces(&w, &c.r); got != c.want {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
	var none Reach
	if Replaces(&none, &first) {
		t.Error("a reach that is everywhere is replaced")
	}
}

// Reports of one aircraft whose errors are within their bounds mostly replace
// each other, and after a jump the union lasts only until the reach has grown.
func TestOrdinaryReportsReplaceEachOther(t *testing.T) {
	g := rand.New(rand.NewPCG(29, 31))
	m := Civil()
	kept, total := 0, 0
	for range 300 {
		r := airliner(r3.Vector{X: between(g, -5e4, 5e4), Y: between(g, -5e4, 5e4), Z: 9e3})
		x, v := r.Position, r.Velocity
		old := Of(&r, &m)
		for range 60 {
			a := within(g, 15)
			x = x.Add(v.Mul(0.5)).Add(a.Mul(0.125))
			v = v.Add(a.Mul(0.5))
			v = r3.Vector{X: limit(v, 300).X, Y: limit(v, 300).Y, Z: v.Z}
			next := r
			next.At = old.at.Add(500 * time.Millisecond)
			// r95 is the bound over 2.32; σ is r95 over 2.4477.
			sigma := float64(r.PositionError.Horizontal) / 2.32 / 2.4477
			next.Position = x.Add(r3.Vector{X: g.NormFloat64() * sigma, Y: g.NormFloat64() * sigma})
			speed := float64(r.VelocityError.Horizontal) / 2.32 / 2.4477
			next.Velocity = v.Add(r3.Vector{X: g.NormFloat64() * speed, Y: g.NormFloat64() * speed})
			total++
			if Replaces(&old, &next) {
				kept++
			}
			old = Of(&next, &m)
		}
	}
	t.Logf("%d of %d reports replace the one before", kept, total)
	if kept < total*999/1000 {
		t.Errorf("only %d of %d", kept, total)
	}
}
