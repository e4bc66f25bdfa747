package sky

import (
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

func benchNight(b *testing.B) *Night {
	return prepared(b, earth.Position{Lat: deg(-31.5), Lon: deg(-4), Height: 2450}, utc("2031-02-14T03:00:00Z"), UT1{})
}

func stars(n int) []r3.Vector {
	out := make([]r3.Vector, n)
	for i := range out {
		out[i] = geometry.FromEquator(deg(float64(i*137%360)), deg(float64(i*53%180)-90))
	}
	return out
}

const budget = 10e6 // directions a second a core

// BenchmarkHorizon turns many directions at one instant: budget 10,000,000 a
// second.
func BenchmarkHorizon(b *testing.B) {
	n, v := benchNight(b), stars(1024)
	o := n.At(utc("2031-02-14T03:00:00Z"))
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		sink = o.Horizon(v[i&1023])
		i++
	}
	report(b)
}

// BenchmarkHorizonEachInstant turns a direction at an instant of its own: the
// same budget.
func BenchmarkHorizonEachInstant(b *testing.B) {
	n, v := benchNight(b), stars(1024)
	at := utc("2031-02-14T03:00:00Z")
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		sink = n.Horizon(v[i&1023], at.Add(time.Duration(i&0xffff)*time.Millisecond))
		i++
	}
	report(b)
}

func report(b *testing.B) {
	b.ReportMetric(float64(b.N)/b.Elapsed().Seconds()/1e6, "M/s")
	b.ReportMetric(budget/1e6, "budget_M/s")
}

func BenchmarkSun(b *testing.B) {
	n := benchNight(b)
	at := utc("2031-02-14T03:00:00Z")
	b.ReportAllocs()
	for b.Loop() {
		sink = n.Sun(at)
	}
}

// BenchmarkPrepare has no budget, since it happens once in 12 h for a site. It
// is what each direction would cost without a prepared night.
func BenchmarkPrepare(b *testing.B) {
	site, at := earth.Position{Lat: deg(-31.5), Lon: deg(-4)}, utc("2031-02-14T03:00:00Z")
	for b.Loop() {
		if _, err := Prepare(site, at, UT1{}); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkRefract has no budget of its own; the directions lie above 20
// degrees, where beams go.
func BenchmarkRefract(b *testing.B) {
	r := Atmosphere{PressureHPa: 760, TemperatureC: 4, Known: true}.Over(2450)
	v := make([]r3.Vector, 1024)
	for i := range v {
		v[i] = geometry.FromHorizon(deg(float64(i)), deg(20+float64(i%70)))
	}
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		sink, _ = r.Refract(v[i&1023])
		i++
	}
}
