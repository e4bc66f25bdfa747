package recheck_test

import (
	"fmt"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
)

// checkBudget is what one look may cost, in ns.
const checkBudget = 50_000

// A look beside the decision that it judges, with many windows, neighbours and
// aircraft. "anew" is the first look after the lists or the aim changed.
func BenchmarkCheck(b *testing.B) {
	for _, c := range []struct {
		name                          string
		windows, neighbours, aircraft int
	}{{"quiet", 0, 0, 0}, {"50000-windows-10-neighbours-500-aircraft", 50_000, 10, 500}, {"50000-windows-2-neighbours-5000-aircraft", 50_000, 2, 5000}} {
		r := busyRules()
		r.Neighbours = nil
		for i := range c.neighbours {
			r.Neighbours = append(r.Neighbours, closures.NeighbourRules{ID: closures.TelescopeID(fmt.Sprint("t", i)), Offset: r3.Vector{X: 100 * float64(i+1), Y: -60, Z: 3}, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: 2 * time.Hour})
		}
		rng := rand.New(rand.NewPCG(1, 2))
		lists := []*closures.List{openList(b)}
		at := icrs(b, r, evening, 150, 65).Direction
		text := closures.ListText{ID: "big", UnlistedOpen: true}
		for i := range c.windows / 20 {
			v := r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize()
			if i%50 == 0 {
				v = at.Add(v.Mul(0.01 * rng.Float64())).Normalize()
			}
			text.Regions = append(text.Regions, closures.Region{ID: fmt.Sprint("r", i), Shape: closures.ICRSCone, Direction: v, Radius: 0.3 * s1.Degree})
			for range 20 {
				from := evening.Add(20 * time.Minute).Add(time.Duration(rng.Int64N(int64(10 * time.Hour))))
				text.Windows = append(text.Windows, closures.Window{Region: int32(i), From: from.UnixNano(), Until: from.Add(time.Minute).UnixNano()})
			}
		}
		if c.windows > 0 {
			lists = append(lists, index(b, text))
		}
		w := newWorld(b, r, evening, lists...)
		var facts []closures.Body
		frame := earth.FrameAt(r.Site.Position)
		for i := range c.aircraft {
			p := geometry.FromHorizon(s1.Angle(rng.Float64())*6.28, 0).Mul(70e3 + 130e3*rng.Float64()).Add(r3.Vector{Z: 8000})
			facts = append(facts, closures.AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: fmt.Sprintf("%06x", i), Located: true, Position: earth.FromECEF(frame.ECEF(p)), AltitudeFrom: closures.AboveEllipsoid, Speed: 100, Climb: 0, Error: 30, VerticalError: 30, VelocityError: 2, VerticalVelError: 2})
		}
		w.step(0, facts...)
		d := w.mustOpen()
		k, f := w.s.Known(w.at), w.s.Foreseen()
		b.Run(c.name+"/decide", func(b *testing.B) {
			var sh closures.Sheet
			var o closures.Decision
			for b.Loop() {
				w.s.Decide("north", w.at, &sh, &o)
			}
		})
		b.Run(c.name+"/check", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if v, vetoed := w.check.Check(&d, k, f, r, w.at); vetoed {
					b.Fatal(v.Detail)
				}
			}
			b.ReportMetric(checkBudget, "budget-ns")
		})
	}
}
