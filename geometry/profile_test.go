package geometry

import (
	"math"
	"testing"

	"github.com/golang/geo/s1"
)

const sodium Length = 589.158e-9 // D2 in vacuum

// collimated returns a perfect beam of a waist w0 at its aperture.
func collimated(w0, wavelength Length, quality float64) Profile {
	return Profile{Aperture: 2 * w0, Focus: Length(math.Inf(1)), Wavelength: wavelength, Quality: quality}
}

func within(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.12g, want %.12g ± %g", what, got, want, tolerance)
	}
}

// Computed from w(z) = w0 √(1+(z/zR)²), zR = π w0²/(M² λ), θ = M² λ/(π w0) at
// λ = 589.158 nm (Siegman, Lasers, ch. 17; ISO 11146-1). Tolerance: half a unit
// of the last digit given.
func TestCollimatedBeam(t *testing.T) {
	for _, c := range []struct {
		w0                     Length
		quality                float64
		at                     Length
		rayleigh, half, radius float64
		arcsec, fwhm           float64 // 2w/z; zero where the source gives none
	}{
		{0.10, 1, 90000, 53323.431976, 1.875348159e-6, 0.196181393, 0.899229, 0.230986},
		{0.12, 1, 90000, 76785.742045, 1.562790133e-6, 0.184885736, 0.847454, 0.217686},
		{0.15, 1, 90000, 119977.721945, 1.250232106e-6, 0.187512534, 0.859494, 0.220779},
		{0.20, 1, 90000, 213293.727903, 9.376740796e-7, 0.217075528, 0.995001, 0.255587},
		{0.12, 1, 180000, 76785.742045, 1.562790133e-6, 0.305828287, 0.700907, 0.360085},
		{0.12, 1.2, 90000, 63988.118371, 1.875348159e-6, 0.207092102, 0, 0},
		{0.12, 1.5, 90000, 51190.494697, 2.344185199e-6, 0.242716201, 0, 0},
		{0.001, 1, 10, 4.964590161, 1e-3 / 4.964590161, 0.002248836, 0, 0}, // 632.8 nm; the printed θ, 2.014264955e-4, is 2.4e-9 off its own w0/zR
	} {
		wavelength := sodium
		if c.at == 10 {
			wavelength = 632.8e-9
		}
		p := collimated(c.w0, wavelength, c.quality)
		digit := 0.51e-6
		if c.at == 10 {
			digit = 0.51e-9
		}
		within(t, "Rayleigh length", float64(p.RayleighLength()), c.rayleigh, digit)
		within(t, "half divergence", p.Divergence().Radians()/2, c.half, c.half*5.1e-10)
		radius := p.Radius(c.at)
		within(t, "radius", float64(radius), c.radius, 0.51e-9)
		if c.arcsec != 0 {
			within(t, "2w/z, arcsec", 2*float64(radius/c.at)/float64(Arcsecond), c.arcsec, 0.51e-6)
			within(t, "FWHM", float64(FWHM(radius)), c.fwhm, 0.51e-6)
		}
		within(t, "waist", float64(p.Waist()), 0, 0)
	}
}

// Computed from 1 - exp(-2r²/w²) and 2P/(πw²).
func TestFractionAndIrradiance(t *testing.T) {
	for r, want := range map[Length]float64{0.5: 0.393469340, 1: 0.864664717, 1.5: 0.988891003, 2: 0.999664537} {
		within(t, "fraction", Enclosed(r, 1), want, 0.51e-9)
		within(t, "fraction", Enclosed(r*0.3, 0.3), want, 0.51e-9)
	}
	within(t, "peak irradiance", PeakIrradiance(20, 0.1), 1273.239545, 0.51e-6)
	within(t, "no radius", Enclosed(0, 1), 0, 0)
	within(t, "a small radius", Enclosed(1e-9, 1), 2e-18, 1e-33)
}

// A focused beam is at its geometric focus θF wide, whatever W is; its waist is
// nearer, at F/(1+(F/zR)²), and W/√(1+(zR/F)²) wide (Siegman, ch. 17).
func TestFocusedBeam(t *testing.T) {
	p := Profile{Aperture: 0.30, Focus: 92000, Wavelength: sodium, Quality: 1.2}
	zr := float64(p.RayleighLength())
	theta := 1.2 * float64(sodium) / (math.Pi * 0.15)
	within(t, "at the aperture", float64(p.Radius(0)), 0.15, 0)
	within(t, "at the focus", float64(p.Radius(92000)), theta*92000, 1e-15)
	within(t, "waist", float64(p.Waist()), 92000/(1+math.Pow(92000/zr, 2)), 1e-9)
	within(t, "at the waist", float64(p.Radius(p.Waist())), 0.15/math.Sqrt(1+math.Pow(zr/92000, 2)), 1e-15)
	for s := Length(0); s < 300e3; s += 500 {
		if p.Radius(s) < p.Radius(p.Waist()) {
			t.Fatalf("narrower at %v than at the waist", s)
		}
	}
}

// Seeing adds in quadrature: with it, the squares of the radii differ by the
// square of the seeing's own 1/e² radius, FWHM/√(2 ln 2) times the distance.
func TestSeeing(t *testing.T) {
	sharp := Profile{Aperture: 0.30, Focus: 92000, Wavelength: sodium, Quality: 1.1}
	blurred := sharp
	blurred.Seeing = 1.2 * Arcsecond
	for _, s := range []Length{0, 1, 1e3, 40e3, 92e3, 200e3} {
		a, b := float64(sharp.Radius(s)), float64(blurred.Radius(s))
		within(t, "added", b*b-a*a, math.Pow(1.2*4.84813681109536e-6/math.Sqrt(2*math.Ln2)*float64(s), 2), 1e-14*(1+b*b))
	}
	if blurred.Waist() >= sharp.Waist() {
		t.Error("seeing should bring the waist nearer")
	}
}

func TestNarrower(t *testing.T) {
	p := Profile{Aperture: 0.30, Focus: 92000, Wavelength: sodium, Quality: 1.2, Seeing: 0.3 * Arcsecond}
	least := p.Radius(p.Waist())
	for _, radius := range []Length{least * 1.0001, least * 1.2, 0.149, 0.15, 0.2, 5} {
		near, far, ok := p.Narrower(radius)
		if !ok {
			t.Fatalf("%v m: nowhere", radius)
		}
		within(t, "far", float64(p.Radius(far)), float64(radius), 1e-9)
		if radius < 0.15 {
			within(t, "near", float64(p.Radius(near)), float64(radius), 1e-9)
		} else {
			within(t, "near", float64(near), 0, 1e-9)
		}
	}
	if near, far, ok := p.Narrower(least * 0.999); ok || near != 0 || far != 0 {
		t.Errorf("narrower than the waist: %v %v %v", near, far, ok)
	}
	for _, q := range []Profile{p, {}} {
		if near, far, ok := q.Narrower(Length(math.NaN())); ok || near == near || far == far {
			t.Errorf("of no use: %v %v %v", near, far, ok)
		}
	}
	if _, far, ok := p.Narrower(Length(math.Inf(1))); !ok || !math.IsInf(float64(far), 1) {
		t.Errorf("any radius: until %v, %v", far, ok)
	}
	flat := collimated(0.15, sodium, 1)
	if near, far, ok := flat.Narrower(0.15); !ok || near != 0 || far != 0 {
		t.Errorf("collimated: %v %v %v", near, far, ok)
	}
}

func TestProfileOfNoUse(t *testing.T) {
	good := Profile{0.3, 92000, sodium, 1, 0}
	nan := math.NaN()
	for i, p := range []Profile{
		{},
		{0, 92000, sodium, 1, 0}, {-1, 92000, sodium, 1, 0}, {Length(nan), 92000, sodium, 1, 0}, {Length(math.Inf(1)), 1, sodium, 1, 0},
		{0.3, 0, sodium, 1, 0}, {0.3, -1, sodium, 1, 0}, {0.3, Length(nan), sodium, 1, 0},
		{0.3, 92000, 0, 1, 0}, {0.3, 92000, Length(nan), 1, 0},
		{0.3, 92000, sodium, 0.99, 0}, {0.3, 92000, sodium, nan, 0},
		{0.3, 92000, sodium, 1, -1}, {0.3, 92000, sodium, 1, s1.Angle(nan)},
	} {
		if p.Valid() {
			t.Errorf("%d: %+v is valid", i, p)
		}
		for _, v := range []float64{float64(p.Radius(1)), float64(p.RayleighLength()), float64(p.Divergence()), float64(p.Waist())} {
			if !math.IsNaN(v) {
				t.Errorf("%d: %+v answers %v", i, p, v)
			}
		}
	}
	if !good.Valid() || !math.IsNaN(float64(good.Radius(-1))) || !math.IsNaN(float64(good.Radius(Length(nan)))) {
		t.Error("a distance of no use should give NaN")
	}
}
