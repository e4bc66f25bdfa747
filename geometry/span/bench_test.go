package span_test

import (
	"math"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/span"
)

// A plan's share of the search: 12 hours of a target, an elevation limit and
// two neighbours that track, edges to 0.1 s. The budget of a plan of 10,000
// targets is one second, 100 µs a target.
func BenchmarkPlanTarget(b *testing.B) {
	night := span.Span{From: dusk, Until: dusk.Add(12 * time.Hour)}
	const lat = -0.55
	var targets []star
	for i := range 64 {
		targets = append(targets, newStar(lat, -1.3+float64(i)*0.03, 5-float64(i)*0.1, omega))
	}
	fields := [2]star{newStar(lat, -0.4, 5.9, omega), newStar(lat, 0.1, 5.5, omega)}
	var scratch [3]span.Set
	evaluations, n := 0, 0
	for b.Loop() {
		target := targets[n%len(targets)]
		rate := omega * math.Abs(target.cosDec)
		n++
		scratch[2] = span.AppendBelow(scratch[2][:0], func(at time.Time) float64 {
			evaluations++
			return float64(geometry.Elevation(target.at(at))) - 0.5
		}, rate, night, 100*time.Millisecond)
		for i, field := range fields {
			scratch[i] = span.AppendBelow(scratch[i][:0], func(at time.Time) float64 {
				evaluations++
				// Fixed on the sky apart but for parallax: a beam seen from aside
				// drifts through a field at some part of the rate of the sky.
				aside := target.at(at).Add(target.at(night.From).Mul(0.05))
				return geometry.Cone{Axis: field.at(at), Radius: 0.02}.Margin(aside)
			}, 2*omega, night, 100*time.Millisecond)
		}
	}
	b.ReportMetric(float64(evaluations)/float64(n), "evaluations/target")
	b.ReportMetric(10_000*b.Elapsed().Seconds()/float64(n), "s/10000-targets")
	b.ReportMetric(1, "budget-s")
}
