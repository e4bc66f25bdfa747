package crossing

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/span"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// BenchmarkMargin prints what one evaluation with a column and a star costs.
// The budget is 300 ns: 10,000 targets over 12 h against two neighbours at
// about 90 evaluations a target and neighbour must take a second on two cores.
func BenchmarkMargin(b *testing.B) {
	beam, telescope, parts := plain()
	pair, err := Prepare(beam, telescope, parts...)
	if err != nil {
		b.Fatal(err)
	}
	rnd := rand.New(rand.NewPCG(1, 2))
	const n = 1024
	var beams, axes [n]r3.Vector
	for i := range n {
		beams[i] = geometry.FromHorizon(s1.Angle(2*math.Pi*rnd.Float64()), s1.Angle(0.5+rnd.Float64()))
		axes[i] = geometry.FromHorizon(s1.Angle(2*math.Pi*rnd.Float64()), s1.Angle(0.5+rnd.Float64()))
	}
	b.ReportAllocs()
	i, clear := 0, 0
	for b.Loop() {
		if pair.Margin(beams[i], axes[i]).Margin > 0 {
			clear++
		}
		i = (i + 1) % n
	}
	b.ReportMetric(300, "budget-ns/op")
	if clear == 0 {
		b.Fatal("nothing clear")
	}
}

// BenchmarkSeparation is the least that any answer must pay, the angle between
// two directions, to compare with.
func BenchmarkSeparation(b *testing.B) {
	v, w := geometry.FromHorizon(1, 1), geometry.FromHorizon(2, 1.2)
	sum := 0.0
	for b.Loop() {
		sum += float64(geometry.Separation(v, w))
	}
	if sum == 0 {
		b.Fatal("no angle")
	}
}

func BenchmarkPrepare(b *testing.B) {
	beam, telescope, parts := plain()
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Prepare(beam, telescope, parts...); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkNight searches a 12 h night for the crossings of a target with the
// field of a telescope that follows another, to 0.1 s, and prints how many
// evaluations that takes: about 90 were reckoned with.
func BenchmarkNight(b *testing.B) {
	for _, o := range []struct {
		name string
		at   r3.Vector
	}{{"140m", r3.Vector{X: 140, Y: -60, Z: 3}}, {"5km", r3.Vector{X: 4e3, Y: 3e3, Z: -50}}, {"200km", r3.Vector{X: 120e3, Y: 160e3, Z: -3100}}} {
		b.Run(o.name, func(b *testing.B) {
			beam, telescope, parts := plain()
			telescope.Position = o.at
			pair, err := Prepare(beam, telescope, parts...)
			if err != nil {
				b.Fatal(err)
			}
			r := random{newRand(4)}
			from := time.Date(2031, 2, 13, 20, 0, 0, 0, time.UTC)
			night := span.Span{From: from, Until: from.Add(12 * time.Hour)}
			pole := geometry.FromHorizon(math.Pi, 0.55)
			evaluations, crossings := 0, 0
			for b.Loop() {
				target := geometry.FromHorizon(s1.Angle(r.between(0, 2*math.Pi)), s1.Angle(r.between(0.6, 1.4)))
				other := r.around(target, math.Acos(r.between(0, 1)))
				found := span.BelowRated(func(at time.Time) (float64, float64) {
					evaluations++
					turn := -7.292115e-5 * at.Sub(from).Seconds()
					m := pair.Margin(about(pole, target, turn), about(pole, other, turn))
					return m.Margin, m.Rate
				}, night, 100*time.Millisecond)
				crossings += len(found)
			}
			b.ReportMetric(float64(evaluations)/float64(b.N), "evaluations/op")
			b.ReportMetric(float64(crossings)/float64(b.N), "crossings/op")
			b.ReportMetric(50e3, "budget-ns/op")
		})
	}
}

// about turns v about a unit axis.
func about(axis, v r3.Vector, angle float64) r3.Vector {
	sin, cos := math.Sincos(angle)
	return v.Mul(cos).Add(axis.Cross(v).Mul(sin)).Add(axis.Mul(axis.Dot(v) * (1 - cos)))
}
