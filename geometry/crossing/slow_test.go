package crossing

import (
	"fmt"
	"math"
	"testing"

	"github.com/golang/geo/r3"
)

// slow is Margin by plain steps along each part, each angle by its own arcs: no
// more than the package says, but for rounding, if three points are enough.
func slow(sc *scene, p *Pair) float64 {
	least := math.Inf(1)
	var v view
	v.look(p, sc.beamDir, sc.axisDir)
	for i := range sc.parts {
		e := p.parts[i].extent(&v)
		at := func(s float64) {
			u := sc.beam.Launch.Add(sc.beamDir.Mul(s)).Sub(sc.telescope.Position)
			r := float64(sc.beam.Radius+sc.telescope.Aperture/2) + s*float64(sc.beam.Spread+sc.beam.AimError)
			a := math.Atan2(u.Cross(sc.axisDir).Norm(), u.Dot(sc.axisDir)) - math.Asin(r/u.Norm())
			least = min(least, a-float64(sc.telescope.Field+sc.telescope.AimError+sc.parts[i].Halo))
		}
		const steps = 100
		for k := range steps + 1 {
			f := float64(k) / steps
			at(e.from + (e.until-e.from)*f)
			at(e.from + (e.until-e.from)*math.Pow(10, -6*f))
			if s := v.off*math.Tan(1.5*(2*f-1)) - v.wb; s > e.from && s < e.until {
				at(s)
			}
		}
	}
	return least
}

// TestThreePointsAreEnough compares the closed form with steps along the beam.
func TestThreePointsAreEnough(t *testing.T) {
	share(t, count(20_000), func(r random, i int) error {
		sc := families[(i/2)%len(families)].draw(r)
		if r.IntN(3) == 0 { // an unlikely wide ball, and one that grows fast
			sc.telescope.Aperture = 50
			sc.beam.AimError = 0.02
		}
		pair, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		got := pair.Margin(sc.beamDir, sc.axisDir)
		if got.InTheWay {
			return nil
		}
		if want := slow(&sc, &pair); !(got.Margin <= want+1e-9) {
			return fmt.Errorf("%s: %.12g at %v, but %.12g by steps: %+v %+v %v %v", families[(i/2)%len(families)].name, got.Margin, got.Slant, want, sc.beam, sc.telescope, sc.beamDir, sc.axisDir)
		}
		// And it is the margin of a point of the beam.
		u := sc.beam.Launch.Add(sc.beamDir.Mul(float64(got.Slant))).Sub(sc.telescope.Position)
		ball := math.Asin((float64(sc.beam.Radius+sc.telescope.Aperture/2) + float64(got.Slant)*float64(sc.beam.Spread+sc.beam.AimError)) / u.Norm())
		own := float64(u.Angle(sc.axisDir)) - ball - float64(sc.telescope.Field+sc.telescope.AimError+sc.parts[got.Part].Halo)
		if !(math.Abs(own-got.Margin) <= 1e-9) {
			return fmt.Errorf("%s: %.12g is not the margin at %v, %.12g", families[(i/2)%len(families)].name, got.Margin, got.Slant, own)
		}
		return nil
	})
}

// TestPlainTriangle checks a case that can be done by hand: a telescope 100 m
// east of a beam that goes straight up, looking at it level: 2° beside the
// launch, 45° up, is clear of what is 100 m up by no more than the radii.
func TestPlainTriangle(t *testing.T) {
	b := Beam{Radius: 0.1}
	s := Telescope{Position: r3.Vector{X: 100}, Aperture: 2, Field: 0.01, AimError: 0.002}
	pair, err := Prepare(b, s, Part{From: 0, Until: 20e3, Halo: 0.003})
	if err != nil {
		t.Fatal(err)
	}
	up := r3.Vector{Z: 1}
	for _, c := range []struct {
		what   string
		axis   r3.Vector
		margin float64
		slant  float64
	}{
		{"straight at 100 m", r3.Vector{X: -1, Z: 1}.Normalize(), -math.Asin(1.1/math.Sqrt(2e4)) - 0.015, 100},
		{"up beside it", up, math.Atan(100/20e3) - math.Asin(1.1/math.Hypot(100, 20e3)) - 0.015, 20e3},
		{"square to the plane", r3.Vector{Y: 1}, math.Pi/2 - math.Asin(1.1/100) - 0.015, 0},
		{"away", r3.Vector{X: 1}, math.Pi/2 + math.Atan(100/20e3) - math.Asin(1.1/math.Hypot(100, 20e3)) - 0.015, 20e3},
		{"below", r3.Vector{Z: -1}, math.Pi/2 - math.Asin(1.1/100) - 0.015, 0},
	} {
		got := pair.Margin(up, c.axis)
		// 3e-8 rad: the part ends 0.22 m above 20 km, the radius and the shell's bound.
		if !(math.Abs(got.Margin-c.margin) < 3e-7) || math.Abs(float64(got.Slant)-c.slant) > 0.3+1e-2*c.slant*math.Abs(c.axis.X+c.axis.Z-1) {
			t.Errorf("%s: margin %.9g at %v, want %.9g at %v", c.what, got.Margin, got.Slant, c.margin, c.slant)
		}
	}
}
