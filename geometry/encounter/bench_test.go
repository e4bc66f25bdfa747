package encounter

import (
	"math/rand/v2"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// reachBudget is what one reach against one keep-out may cost, in ns.
const reachBudget = 300

var epoch = time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC)

// usual is the keep-out of an ordinary installation, with the beam at azimuth
// az and elevation el in degrees.
func usual(az, el float64) KeepOut {
	return KeepOut{
		Launch: r3.Vector{Z: 12}, Axis: geometry.FromHorizon(s1.Angle(az)*s1.Degree, s1.Angle(el)*s1.Degree),
		HalfAngle: 2 * s1.Degree, Radius: 300, Ceiling: 17550, Extent: 50,
		AxisError: 0.15 * s1.Degree, AxisRate: 0.01 * s1.Degree,
	}
}

// airliner is a report a second old of an airliner at p.
func airliner(p r3.Vector) Report {
	return Report{
		At: epoch.Add(-time.Second), Early: time.Second, Late: 200 * time.Millisecond,
		Position: p, PositionError: Error{Horizontal: 70, Vertical: 60}, AltitudeKnown: true,
		Velocity: r3.Vector{X: 230, Y: 20, Z: 3}, VelocityError: SpeedError{Horizontal: 10, Vertical: 3},
		CourseKnown: true, ClimbKnown: true,
	}
}

const usualGuard = 2700 * time.Millisecond

func BenchmarkTouch(b *testing.B) {
	k := usual(40, 60)
	var v Volume
	if !v.Set(&k, epoch, usualGuard) {
		b.Fatal("keep-out refused")
	}
	on := k.Axis.Mul(9000)
	m := Civil()
	for _, c := range []struct {
		name  string
		p     r3.Vector
		clear bool
	}{
		{"far", r3.Vector{X: 90e3, Y: 30e3, Z: 9000}, true},
		{"beside", on.Add(r3.Vector{X: 9000}), true},
		{"near", on.Add(r3.Vector{X: 3100, Y: -200}), true},
		{"grazing", on.Add(r3.Vector{X: 1560, Y: -200}), true},
		{"entering", on.Add(r3.Vector{X: -1800}), false},
		{"inside", on, false},
	} {
		for _, mode := range []string{"known", "old", "bare"} {
			r := airliner(c.p)
			switch mode {
			case "old":
				r.At = r.At.Add(-12 * time.Second)
			case "bare":
				r.CourseKnown, r.ClimbKnown, r.AltitudeKnown = false, false, false
			}
			w := Of(&r, &m)
			b.Run(c.name+"/"+mode, func(b *testing.B) {
				b.ReportAllocs()
				var a Answer
				for b.Loop() {
					a = v.Touch(&w)
				}
				if mode == "known" && a.Clear != c.clear {
					b.Errorf("clear %v, margin %v", a.Clear, a.Margin)
				}
				b.ReportMetric(reachBudget, "budget-ns")
				b.ReportMetric(float64(a.Margin), "margin-m")
				b.ReportMetric(a.NotBefore.Seconds(), "notbefore-s")
			})
		}
	}
}

func BenchmarkSet(b *testing.B) {
	k := usual(40, 60)
	var v Volume
	b.ReportAllocs()
	for b.Loop() {
		v.Set(&k, epoch, usualGuard)
	}
}

func BenchmarkOf(b *testing.B) {
	r := airliner(r3.Vector{X: 9000, Y: 30, Z: 9000})
	m := Civil()
	b.ReportAllocs()
	var w Reach
	for b.Loop() {
		w = Of(&r, &m)
	}
	_ = w
}

func BenchmarkQuiet(b *testing.B) {
	k := usual(40, 60)
	d := k.Dome(30*s1.Degree, usualGuard)
	r := airliner(r3.Vector{X: 90e3, Y: 30e3, Z: 9000})
	m := Civil()
	w := Of(&r, &m)
	b.ReportAllocs()
	var at time.Time
	for b.Loop() {
		at = d.Quiet(&w)
	}
	b.ReportMetric(at.Sub(epoch).Seconds(), "quiet-s")
}

// BenchmarkTraffic asks about aircraft all over the sky within 40 km of the
// site, 1 to 4 s after their reports, as a decision does.
func BenchmarkTraffic(b *testing.B) {
	g := rand.New(rand.NewPCG(37, 41))
	k, m := usual(40, 60), Civil()
	var v Volume
	if !v.Set(&k, epoch, usualGuard) {
		b.Fatal("keep-out refused")
	}
	var reach [1000]Reach
	touched := 0
	for i := range reach {
		r := airliner(r3.Vector{X: between(g, -40e3, 40e3), Y: between(g, -40e3, 40e3), Z: between(g, 500, 12e3)})
		r.At = epoch.Add(-span(g, 1, 4))
		r.Velocity = within(g, 280)
		reach[i] = Of(&r, &m)
		if !v.Touch(&reach[i]).Clear {
			touched++
		}
	}
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		v.Touch(&reach[i%len(reach)])
		i++
	}
	b.ReportMetric(reachBudget, "budget-ns")
	b.ReportMetric(float64(touched), "touched-of-1000")
}
