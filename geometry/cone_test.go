package geometry

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

func randomDirection(r *rand.Rand) r3.Vector {
	for {
		v := r3.Vector{X: r.Float64()*2 - 1, Y: r.Float64()*2 - 1, Z: r.Float64()*2 - 1}
		if n := v.Norm2(); n > 1e-6 && n < 1 {
			return v.Normalize()
		}
	}
}

func TestConeMargin(t *testing.T) {
	zenith := r3.Vector{Z: 1}
	for _, c := range []struct {
		cone Cone
		dir  r3.Vector
		want float64
	}{
		{Cone{zenith, 0.1}, FromHorizon(1, math.Pi/2-0.3), 0.2},
		{Cone{zenith, 0.1}, zenith, -0.1},
		{Cone{zenith, math.Pi}, r3.Vector{Z: -1}, 0},
		{Cone{zenith, 0}, zenith, 0},
		{Cone{FromHorizon(0, 0), 1e-9}, FromHorizon(3e-9, 0), 2e-9},
		{Cone{FromHorizon(0, 0), 1}, FromHorizon(math.Pi-1e-9, 0), math.Pi - 1 - 1e-9},
		{Cone{r3.Vector{Z: 1e-3}, 0.1}, r3.Vector{X: 1e3}, math.Pi/2 - 0.1},
	} {
		if got := c.cone.Margin(c.dir); math.Abs(got-c.want) > 1e-15 {
			t.Errorf("%v to %v: %v, want %v", c.dir, c.cone, got, c.want)
		}
	}
}

func TestConeOfNoUse(t *testing.T) {
	nan, zenith := math.NaN(), r3.Vector{Z: 1}
	for _, m := range []float64{
		Cone{r3.Vector{X: nan}, 1}.Margin(zenith),
		Cone{zenith, s1.Angle(nan)}.Margin(zenith),
		Cone{zenith, 1}.Margin(r3.Vector{Y: nan}),
		Cone{}.Margin(zenith),
	} {
		if m > 0 {
			t.Errorf("margin %v reads as clear", m)
		}
	}
	for _, c := range []Cone{{}, {zenith, -1e-9}, {zenith, 3.2}, {zenith, s1.Angle(nan)}, {r3.Vector{X: math.Inf(1)}, 1}} {
		if c.Valid() {
			t.Errorf("%v is valid", c)
		}
	}
	if !(Cone{zenith, 0}).Valid() || !(Cone{zenith, math.Pi}).Valid() {
		t.Error("a point and the whole sky are cones")
	}
}
