package exposure

import (
	"math"
	"testing"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/s1"
)

// TestGaussianVectors checks the beam that the package reckons with against
// w(z) = w0 √(1+(z/zR)²), zR = π w0²/(M² λ), θ = M² λ/(π w0) (formulas from
// memory: Siegman, Lasers, ch. 17; ISO 11146-1), computed for 589.158 nm, and
// the irradiance on the axis 2P/(πw²).
func TestGaussianVectors(t *testing.T) {
	for _, c := range []struct{ lambda, w0, m2, z, zr, theta, w, arcsec, fwhm float64 }{
		{589.158, 0.10, 1, 90000, 53323.431976, 1.875348159e-6, 0.196181393, 0.899229, 0.230986},
		{589.158, 0.12, 1, 90000, 76785.742045, 1.562790133e-6, 0.184885736, 0.847454, 0.217686},
		{589.158, 0.15, 1, 90000, 119977.721945, 1.250232106e-6, 0.187512534, 0.859494, 0.220779},
		{589.158, 0.20, 1, 90000, 213293.727903, 9.376740796e-7, 0.217075528, 0.995001, 0.255587},
		{589.158, 0.12, 1, 180000, 76785.742045, 1.562790133e-6, 0.305828287, 0.700907, 0.360085},
		{589.158, 0.12, 1.2, 90000, 63988.118371, 1.875348159e-6, 0.207092102, 0, 0},
		{589.158, 0.12, 1.5, 90000, 51190.494697, 2.344185199e-6, 0.242716201, 0, 0},
		{632.8, 0.001, 1, 10, 4.964590161, 2.014264955e-4, 0.002248836, 0, 0},
	} {
		p := geometry.Profile{Aperture: geometry.Length(2 * c.w0), Focus: geometry.Length(math.Inf(1)), Wavelength: nm(c.lambda), Quality: c.m2}
		w := float64(p.Radius(geometry.Length(c.z)))
		if !near(w, c.w, 5e-7) || !near(float64(p.RayleighLength()), c.zr, 1e-9) || !near(float64(p.Divergence())/2, c.theta, 3e-9) {
			t.Errorf("%+v: w %v, zR %v, θ %v", c, w, p.RayleighLength(), p.Divergence()/2)
		}
		if c.fwhm != 0 && (!near(float64(geometry.FWHM(geometry.Length(w))), c.fwhm, 3e-6) || !near(2*w/c.z/float64(geometry.Arcsecond), c.arcsec, 1e-6)) {
			t.Errorf("%+v: FWHM %v, %v arcsec", c, geometry.FWHM(geometry.Length(w)), 2*w/c.z/float64(geometry.Arcsecond))
		}
		if got := (Along{20, p}).Irradiance(geometry.Length(c.z)); !near(float64(got), 2*20/(math.Pi*c.w*c.w), 1e-6) {
			t.Errorf("%+v: %v W/m²", c, got)
		}
	}
	// The fractions of the power within r of the axis, and 20 W of w = 0.1 m.
	for _, c := range [][2]float64{{0.5, 0.393469340}, {1, 0.864664717}, {1.5, 0.988891003}, {2, 0.999664537}} {
		if got := geometry.Enclosed(geometry.Length(c[0]), 1); math.Abs(got-c[1]) > 6e-10 {
			t.Errorf("within %v w: %v, want %v", c[0], got, c[1])
		}
	}
	p := geometry.Profile{Aperture: 0.2, Focus: geometry.Length(math.Inf(1)), Wavelength: nm(589.158), Quality: 1}
	if got := (Along{20, p}).Irradiance(0); !near(float64(got), 1273.239545, 1e-9) {
		t.Errorf("20 W of 0.1 m: %v W/m²", got)
	}
}

// TestShellVectors checks the slant range to a height, and the height at it,
// against the sphere's formula, computed to the millimetre. 92.09 km is the
// centroid of the sodium layer (Moussaoui et al. 2010, A&A 511, A31).
func TestShellVectors(t *testing.T) {
	zenith := []float64{0, 30, 45, 60, 70, 80}
	for _, c := range []struct {
		h, shell float64
		want     [6]float64
	}{
		{0, 92090, [6]float64{92090.000, 106085.037, 129320.038, 180402.791, 256144.155, 444757.666}},
		{2635, 92090, [6]float64{89455.000, 103056.546, 125644.850, 175341.778, 249146.621, 433765.290}},
		{2635, 80000, [6]float64{77365.000, 89155.557, 108762.296, 152042.135, 216792.906, 382228.872}},
		{2635, 105000, [6]float64{102365.000, 117891.147, 143639.494, 200092.399, 283291.091, 487059.545}},
		{4160, 92090, [6]float64{87930.000, 101303.628, 123517.177, 172410.116, 245088.660, 427368.430}},
	} {
		for i, z := range zenith {
			el := s1.Angle(90-z) * s1.Degree
			got := earth.ShellRange(geometry.Length(c.h), geometry.Length(c.shell), el)
			if math.Abs(float64(got)-c.want[i]) > 6e-4 {
				t.Errorf("%v to %v m at %v°: %v m, want %v", c.h, c.shell, z, float64(got), c.want[i])
			}
			if back := heightAt(geometry.Length(c.h), el, geometry.Length(c.want[i])); math.Abs(float64(back)-c.shell) > 1e-3 {
				t.Errorf("%v m at %v°, %v m on: a height of %v, want %v", c.h, z, c.want[i], float64(back), c.shell)
			}
		}
	}
}

// TestSodiumLine checks the wavelength that guide stars use against its level,
// 3p 2P3/2 at 16973.36619 cm⁻¹ (secondary), and that this lies where the table is fine.
func TestSodiumLine(t *testing.T) {
	vacuum := 1 / 16973.36619 * 1e7
	if !near(vacuum, 589.1583253, 1e-9) || !near(299792458/(589.1583264e-9), 508.848716e12, 1e-8) {
		t.Errorf("%v nm", vacuum)
	}
	v, err := Photopic(nm(vacuum))
	if err != nil || !(v > 0.7570 && v < 0.7692) {
		t.Errorf("V = %v, %v", v, err)
	}
}

// focused is a beam that is wide at the launch and narrow high up.
func focused() geometry.Profile {
	return geometry.Profile{Aperture: 0.8, Focus: 90e3, Wavelength: nm(589.158), Quality: 1}
}

// TestAbove finds limits that are passed never, once and twice, and compares
// with steps along the beam.
func TestAbove(t *testing.T) {
	for _, c := range []struct {
		what  string
		beam  Along
		limit Irradiance
		want  int
	}{
		{"focused, below everywhere", Along{20, focused()}, 20000, 0},
		{"focused, above at the focus", Along{20, focused()}, 200, 2},
		{"focused, above from the launch", Along{20, focused()}, 20, 1},
		{"collimated, above from the launch", Along{20, geometry.Profile{Aperture: 0.3, Focus: geometry.Length(math.Inf(1)), Wavelength: nm(589.158), Quality: 1}}, 25, 1},
		{"collimated, below", Along{20, geometry.Profile{Aperture: 3, Focus: geometry.Length(math.Inf(1)), Wavelength: nm(589.158), Quality: 1}}, 25, 0},
	} {
		got := c.beam.Above(c.limit)
		if got.Passings != c.want {
			t.Errorf("%s: %+v, want %d passings", c.what, got, c.want)
		}
		for s := geometry.Length(0); s < 1e6; s += 100 {
			above, said := c.beam.Irradiance(s) >= c.limit, got.Passings > 0 && s >= got.From && s <= got.Until
			if above != said && math.Abs(float64(c.beam.Irradiance(s)/c.limit)-1) > 1e-9 {
				t.Errorf("%s: at %v m %v W/m², but %+v", c.what, s, c.beam.Irradiance(s), got)
				break
			}
		}
	}
	for _, a := range []Along{{}, {Power(math.NaN()), focused()}, {Power(math.Inf(1)), focused()}, {-1, focused()}} {
		if got := a.Above(1); !math.IsNaN(float64(got.Until)) || !math.IsNaN(float64(got.From)) {
			t.Errorf("%+v: %+v", a, got)
		}
	}
	if got := (Along{1, focused()}).Above(Irradiance(math.NaN())); !math.IsNaN(float64(got.Until)) {
		t.Errorf("no limit: %+v", got)
	}
}

func TestCurve(t *testing.T) {
	points := Along{20, focused()}.Curve(2450, 0.8, 120e3, 13)
	if len(points) != 13 || points[0].Height != 2450 || points[0].Slant != 0 || points[12].Slant != 120e3 {
		t.Fatalf("%+v", points)
	}
	for i, p := range points {
		if i > 0 && !(p.Height > points[i-1].Height) || !(p.Irradiance > 0) {
			t.Errorf("point %d: %+v", i, p)
		}
	}
	if !(points[9].Irradiance > 10*points[0].Irradiance) {
		t.Errorf("the beam is not brighter at its focus: %+v", points[9])
	}
}
