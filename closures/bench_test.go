package closures

import (
	"fmt"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"
)

// decideBudget is what one decision may cost, in ns.
const decideBudget = 100_000

// crowded is a site with a list of many windows, neighbours, and aircraft of
// which some are near.
func crowded(b testing.TB, windows, neighbours, far, near int) *world {
	r := busyRules()
	r.Neighbours = nil
	for i := range neighbours {
		r.Neighbours = append(r.Neighbours, NeighbourRules{ID: TelescopeID(fmt.Sprint("t", i)), Offset: r3.Vector{X: 100 * float64(i+1), Y: -60, Z: 3}, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: 2 * time.Hour})
	}
	rng := rand.New(rand.NewPCG(1, 2))
	text := &ListText{ID: "big", Authority: "orbital-desk", Issued: evening.Add(-time.Hour), Covers: span.Span{From: evening.Add(-time.Hour), Until: evening.Add(11 * time.Hour)}, UnlistedOpen: true, Digest: Digest{9}}
	at := overheadICRS(b, r, evening, 150, 65)
	for i := range windows / 20 {
		v := r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize()
		if i%50 == 0 {
			v = at.Add(v.Mul(0.01 * rng.Float64())).Normalize()
		}
		text.Regions = append(text.Regions, Region{ID: fmt.Sprint("r", i), Shape: ICRSCone, Direction: v, Radius: 0.3 * s1.Degree})
		for range 20 {
			from := evening.Add(20 * time.Minute).Add(time.Duration(rng.Int64N(int64(10 * time.Hour))))
			text.Windows = append(text.Windows, Window{Region: int32(i), From: from.UnixNano(), Until: from.Add(time.Minute).UnixNano()})
		}
	}
	l, err := Index(text)
	if err != nil {
		b.Fatal(err)
	}
	w := newWorld(b, r, openList(b), l)
	frame := earth.FrameAt(r.Site.Position)
	beam := w.s.night(evening).Horizon(at, evening)
	var facts []Body
	for i := range neighbours {
		facts = append(facts, AimSeen{Telescope: TelescopeID(fmt.Sprint("t", i)), Said: w.at, Aim: &Aim{Frame: ICRS, Direction: overheadICRS(b, r, evening, 330, 40+float64(i)), Reference: w.at, Motion: Tracking}, Exposing: Yes})
	}
	for i := range far + near {
		p := beam.Mul(9000).Add(r3.Vector{X: 6000 + 3000*rng.Float64(), Y: -4000})
		if i >= near {
			a := s1.Angle(rng.Float64()) * 6.28
			p = geometry.FromHorizon(a, 0).Mul(70e3 + 130e3*rng.Float64()).Add(r3.Vector{Z: 8000})
		}
		facts = append(facts, AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: fmt.Sprintf("%06x", i), Located: true, Position: earth.FromECEF(frame.ECEF(p)), AltitudeFrom: AboveEllipsoid, Speed: 100, Climb: 0, Error: 30, VerticalError: 30, VelocityError: 2, VerticalVelError: 2})
	}
	w.step(0, facts...)
	return w
}

func BenchmarkDecide(b *testing.B) {
	for _, c := range []struct {
		name                           string
		windows, neighbours, far, near int
	}{
		{"quiet", 0, 0, 0, 0},
		{"500-aircraft-10-neighbours-50000-windows", 50_000, 10, 450, 50},
		{"5000-tracks-50-near", 50_000, 2, 4950, 50},
	} {
		b.Run(c.name, func(b *testing.B) {
			w := crowded(b, c.windows, c.neighbours, c.far, c.near)
			var sh Sheet
			var d Decision
			at := w.at.Add(10 * time.Millisecond)
			w.s.Decide("north", at, &sh, &d)
			b.ReportAllocs()
			for b.Loop() {
				w.s.Decide("north", at, &sh, &d)
			}
			b.ReportMetric(decideBudget, "budget-ns")
			b.ReportMetric(float64(len(d.Reasons)), "reasons")
		})
	}
}
