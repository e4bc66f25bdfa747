package encounter

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Until the quiet time, Touch is clear for every aim, instant and guard.
func TestQuietAircraftTouchNothing(t *testing.T) {
	g := rand.New(rand.NewPCG(13, 17))
	quiet, edges := 0, 0
	for range 20000 {
		c := grazing(g, 10)
		switch g.IntN(6) {
		case 0:
			c.r.AltitudeKnown = false
		case 1:
			c.r.CourseKnown = false
		case 2:
			c.r.Velocity = c.r.Velocity.Mul(between(g, 1, 3))
		}
		c.r.Early, c.r.Late = span(g, 0, 6), span(g, 0, 6)
		s, k := math.Sincos(between(g, 0, 2*math.Pi))
		away := between(g, 20e3, 150e3)
		c.r.Position = r3.Vector{X: away * s, Y: away * k, Z: c.r.Position.Z}
		if g.IntN(2) == 0 { // straight for the beam
			c.r.Velocity = r3.Vector{X: -s, Y: -k}.Mul(between(g, 250, 349))
		}
		lowest := s1.Angle(between(g, 15, 60)) * s1.Degree
		d := c.k.Dome(lowest, c.guard)
		w := Of(&c.r, &c.m)
		until := d.Quiet(&w)
		left := until.Sub(c.r.At) - c.guard
		if until.IsZero() || left < 0 {
			continue
		}
		quiet++
		for range 4 {
			at := c.r.At.Add(time.Duration(float64(left) * g.Float64()))
			switch g.IntN(4) {
			case 0:
				at = c.r.At.Add(left)
			}
			// The aim that comes nearest, or any other.
			elevation, azimuth := lowest, s1.Angle(math.Atan2(s, k))
			if g.IntN(2) == 0 {
				elevation = s1.Angle(between(g, lowest.Radians(), math.Pi/2))
				azimuth = s1.Angle(between(g, 0, 2*math.Pi))
			}
			c.k.Axis, c.at = geometry.FromHorizon(azimuth, elevation+1e-12), at
			if a := c.touch(); !a.Clear {
				t.Fatalf("quiet until %v, yet %+v at %v\n%+v", until.Sub(c.r.At), a, at.Sub(c.r.At), c)
			}
			// The whole time as one guard, from just before a report stamped
			// ahead.
			whole := c
			whole.at = c.r.At.Add(-time.Second)
			whole.guard = until.Sub(whole.at)
			whole.k.AxisRate = 0
			if a := whole.touch(); !a.Clear {
				t.Fatalf("quiet until %v, yet %+v for that guard\n%+v", until.Sub(c.r.At), a, whole)
			}
		}
		// Not much too early either: 10 s later, straight for it, it touches.
		c.k.Axis, c.at = geometry.FromHorizon(s1.Angle(math.Atan2(s, k)), lowest), until.Add(10*time.Second)
		c.r.CourseKnown, c.r.AltitudeKnown = false, false
		if !c.touch().Clear {
			edges++
		}
	}
	t.Logf("%d quiet aircraft; %d touch 10 s after the quiet time, knowing least", quiet, edges)
	if quiet < 5000 || edges < quiet/2 {
		t.Errorf("%d quiet, %d of them touch soon after: the test lost its edge", quiet, edges)
	}
}

// Where nothing can be said, the quiet time is none.
func TestQuietIsNeverGuessed(t *testing.T) {
	k, m := usual(40, 60), Civil()
	sound := airliner(r3.Vector{X: 90e3, Z: 9e3})
	w := Of(&sound, &m)
	d := k.Dome(30*s1.Degree, usualGuard)
	if q := d.Quiet(&w).Sub(epoch); q < 60*time.Second || q > 300*time.Second {
		t.Errorf("an airliner 90 km away is quiet for %v", q)
	}
	fast := sound
	fast.Velocity = r3.Vector{X: -500}
	near := sound
	near.Position = r3.Vector{X: 3000, Z: 9e3}
	for name, r := range map[string]Report{"faster than the bound": fast, "near": near} {
		w := Of(&r, &m)
		if q := d.Quiet(&w); !q.IsZero() {
			t.Errorf("%s: quiet until %v", name, q)
		}
	}
	var none Reach
	if q := d.Quiet(&none); !q.IsZero() {
		t.Errorf("no report: quiet until %v", q)
	}
	nan := k
	nan.Radius = geometry.Length(math.NaN())
	for name, d := range map[string]Dome{
		"zero dome":                 {},
		"beam down to its angle":    k.Dome(2*s1.Degree, usualGuard),
		"elevation not a number":    k.Dome(s1.Angle(math.NaN()), usualGuard),
		"elevation over the zenith": k.Dome(91*s1.Degree, usualGuard),
		"guard below zero":          k.Dome(30*s1.Degree, -1),
		"radius not a number":       nan.Dome(30*s1.Degree, usualGuard),
	} {
		if q := d.Quiet(&w); !q.IsZero() {
			t.Errorf("%s: quiet until %v", name, q)
		}
	}
}
