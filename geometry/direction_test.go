package geometry

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Azimuth runs from north through east, in every quadrant.
func TestHorizonAxes(t *testing.T) {
	for _, c := range []struct {
		v      r3.Vector
		az, el s1.Angle
	}{
		{r3.Vector{Y: 1}, 0, 0},
		{r3.Vector{X: 1, Y: 1}, math.Pi / 4, 0},
		{r3.Vector{X: 1}, math.Pi / 2, 0},
		{r3.Vector{X: 1, Y: -1}, 3 * math.Pi / 4, 0},
		{r3.Vector{Y: -1}, math.Pi, 0},
		{r3.Vector{X: -1}, 3 * math.Pi / 2, 0},
		{r3.Vector{X: -1, Y: 1}, 7 * math.Pi / 4, 0},
		{r3.Vector{Z: 2}, 0, math.Pi / 2},
		{r3.Vector{Z: -2}, 0, -math.Pi / 2},
		{r3.Vector{X: 3, Z: 3}, math.Pi / 2, math.Pi / 4},
		{r3.Vector{X: -1e-300, Y: 1}, 0, 0},
	} {
		az, el := ToHorizon(c.v)
		if math.Abs(float64(az-c.az)) > 1e-15 || math.Abs(float64(el-c.el)) > 1e-15 || Elevation(c.v) != el {
			t.Errorf("%v: azimuth %v, elevation %v", c.v, float64(az), float64(el))
		}
	}
}

func TestDirectionsThereAndBack(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 8))
	for range 50_000 {
		v := randomDirection(r)
		az, el := ToHorizon(v)
		if d := Separation(v, FromHorizon(az, el)); d > 1e-15 || az < 0 || az >= 2*math.Pi {
			t.Fatalf("%v by the horizon: off by %v", v, float64(d))
		}
		ra, dec := ToEquator(v)
		if d := Separation(v, FromEquator(ra, dec)); d > 1e-15 || ra < 0 || ra >= 2*math.Pi {
			t.Fatalf("%v by the equator: off by %v", v, float64(d))
		}
	}
	for _, tiny := range []float64{-1e-17, -5e-324} {
		if ra, _ := ToEquator(r3.Vector{X: 1, Y: tiny}); ra != 0 {
			t.Errorf("right ascension %v", float64(ra))
		}
	}
}

// No digits are lost where the angle is small or nearly a half turn.
func TestSeparation(t *testing.T) {
	for _, a := range []float64{0, 1e-100, 1e-16, 1e-9, 1, math.Pi - 1e-9, math.Pi} {
		if got := float64(Separation(r3.Vector{X: 5}, r3.Vector{X: math.Cos(a), Y: math.Sin(a)})); math.Abs(got-a) > 1e-15*a {
			t.Errorf("%v: %v", a, got)
		}
	}
	if !math.IsNaN(float64(Separation(r3.Vector{X: math.NaN()}, r3.Vector{Z: 1}))) {
		t.Error("NaN should stay NaN")
	}
}

func TestFinite(t *testing.T) {
	if !Finite() || !Finite(0, -1, math.MaxFloat64) || Finite(0, math.NaN()) || Finite(math.Inf(-1)) {
		t.Error("Finite is wrong")
	}
	if !FiniteVector(r3.Vector{}) || FiniteVector(r3.Vector{Z: math.NaN()}) {
		t.Error("FiniteVector is wrong")
	}
}
