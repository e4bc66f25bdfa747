package exposure

import (
	"math"
	"testing"

	"beamward/geometry"

	"github.com/golang/geo/s1"
)

// TestHazardDistanceVectors checks (√(4P/(π MPE)) - a)/φ, computed to 6 decimals.
func TestHazardDistanceVectors(t *testing.T) {
	for _, c := range []struct{ p, phi, a, mpe, want float64 }{
		{0.005, 1e-3, 0, 25.4, 15.831541},
		{0.005, 1e-3, 0.002, 25.4, 13.831541},
		{1, 1e-3, 0, 25.4, 223.891807},
		{1, 1e-3, 0, 25.0, 225.675833},
		{40, 1.5e-3, 0, 26.0, 933.054737},
		{10, 1e-4, 0.3, 25.4, 4080.080588},
		{20, 1e-5, 0.3, 25.4, 70127.459901},
		{22, 1.5e-5, 0.3, 25.456, 49932.661914},
	} {
		got := FarField{Power(c.p), geometry.Length(c.a), s1.Angle(c.phi)}.DistanceTo(Irradiance(c.mpe))
		if math.Abs(float64(got)-c.want) > 1e-6*max(1, c.want/1e3) {
			t.Errorf("%+v: %v m", c, float64(got))
		}
	}
}

const foot = 0.3048

// faa holds rows of FAA AC 70-1B's equations 70-1.2 to 70-1.5 (secondary, a
// digest of its appendices), in its feet and in metres, computed. The MPE is its
// 2.6 mW/cm².
var faa = []struct {
	p, mrad, nanometre, v float64
	feet                  [4]float64 // NOHD, SZED, CZED, LFED
	metres                [4]float64
}{
	{40, 1.5, 555, 1, [4]float64{3060.372, 15604.897, 69753.888, 697538.878}, [4]float64{933.0547, 4757.6643, 21276.9216, 212769.2162}},
	{1, 1, 532, .8849624, [4]float64{725.831, 3481.646, 15562.956, 155629.561}, [4]float64{221.2934, 1061.4938, 4747.1447, 47471.4466}},
	{6, 1, 532, .8849624, [4]float64{1777.915, 8528.255, 38121.301, 381213.012}, [4]float64{542.0558, 2600.1182, 11628.0822, 116280.8216}},
	{0.005, 1, 532, .8849624, [4]float64{51.324, 246.190, 1100.467, 11004.672}, [4]float64{15.6478, 75.0589, 335.6738, 3356.7382}},
	{20, 0.01, 589, .7691547, [4]float64{324601.470, 1451590.127, 6488607.867, 64886078.667}, [4]float64{98965.3997, 442564.8382, 1979210.1253, 19792101.2534}},
}

func TestInterferenceDistanceVectors(t *testing.T) {
	for _, c := range faa {
		v, err := Photopic(nm(c.nanometre))
		if err != nil || v != c.v {
			t.Fatalf("V(%v nm) = %v, %v", c.nanometre, v, err)
		}
		f := FarField{Power: Power(c.p), Divergence: s1.Angle(c.mrad * 1e-3)}
		for i, l := range Levels(Limit{Irradiance: 26}, v) {
			got := float64(f.DistanceTo(l.Irradiance))
			if !near(got, c.metres[i], 1e-6) {
				t.Errorf("%v W, %v nm, %s: %v m, want %v", c.p, c.nanometre, l.Name, got, c.metres[i])
			}
			// 32.8 for 1/0.03048, and square roots of rounded numbers: 0.1 %.
			if !near(got/foot, c.feet[i], 1e-3) {
				t.Errorf("%v W, %v nm, %s: %v ft, want %v", c.p, c.nanometre, l.Name, got/foot, c.feet[i])
			}
		}
	}
}

// TestWorkedExample is the digest's own: 40 W at 520 nm (VCF 0.7092), 1.5 mrad.
// It quotes chained roundings; the exact values beside are computed.
func TestWorkedExample(t *testing.T) {
	f := FarField{Power: 40, Divergence: 1.5e-3}
	quoted := []float64{3062, 13148, 58772, 587716}
	exact := []float64{3060.3720, 13141.5097, 58742.5482, 587425.4820}
	for i, l := range Levels(Limit{Irradiance: 26}, 0.7092) {
		got := float64(f.DistanceTo(l.Irradiance)) / foot
		if !near(got, quoted[i], 1e-3) {
			t.Errorf("%s: %v ft, quoted %v", l.Name, got, quoted[i])
		}
		// Its 32.8 for 1/0.03048, 1.2732 for 4/π, 4.47 for √20 and 44.7 for √2000.
		theirs := got * 32.8 * 0.03048 * math.Sqrt(1.2732*math.Pi/4) * []float64{1, 1, 4.47 / math.Sqrt(20), 44.7 / math.Sqrt(2000)}[i]
		if !near(theirs, exact[i], 1e-7) {
			t.Errorf("%s: %v ft, want %v", l.Name, theirs, exact[i])
		}
	}
	// Equations 70-1.4 and 70-1.5: 4.47 and 44.7 times the sensitive distance.
	if s := f.DistanceTo(Sensitive); !near(float64(f.DistanceTo(Critical)/s), 4.472135955, 1e-9) || !near(float64(f.DistanceTo(LaserFree)/s), 44.72135955, 1e-9) {
		t.Error("the levels do not stand as 1 to √20 to √2000")
	}
	// Equation 70-1.1, a single pulse: the same with energy for power. 1 J at 0.2 µJ/cm², 1 mrad.
	if got, want := float64(FarField{Power: 1, Divergence: 1e-3}.DistanceTo(2e-3))/foot, 32.8/1*math.Sqrt(1.2732*1/0.2e-6); !near(got, want, 1e-3) {
		t.Errorf("70-1.1: %v ft, want %v", got, want)
	}
}

// TestVisualPower is the digest's example of three lines: 8 W at 630 nm, 4 W at
// 520 nm and 10 W with its factor 0.0380, which is V(450): 5.3392 W visually,
// 0.242690909 of the whole.
func TestVisualPower(t *testing.T) {
	sum := 0.0
	for _, c := range []struct{ p, nanometre float64 }{{8, 630}, {4, 520}, {10, 450}} {
		v, err := Photopic(nm(c.nanometre))
		if err != nil {
			t.Fatal(err)
		}
		sum += c.p * v
	}
	if !near(sum, 5.3392, 1e-3) || !near(sum/22, 0.242690909, 1e-3) {
		t.Errorf("%v W of 22", sum)
	}
	if exact := 8*0.2653 + 4*0.7092 + 10*0.0380; !near(exact, 5.3392, 1e-9) {
		t.Errorf("%v W by the digest's factors", exact)
	}
}

// TestGaussianIsTheConeAtOneOverE checks that 1/e widths give the irradiance on
// the axis of a Gaussian beam far away.
func TestGaussianIsTheConeAtOneOverE(t *testing.T) {
	p := geometry.Profile{Aperture: 0.3, Focus: geometry.Length(math.Inf(1)), Wavelength: 589.158e-9, Quality: 1.2}
	f := FarFieldOf(20, p)
	if !near(float64(f.Diameter), 0.3/math.Sqrt2, 1e-12) || !near(f.Divergence.Radians(), float64(p.Divergence())/math.Sqrt2, 1e-12) {
		t.Errorf("%+v", f)
	}
	for _, limit := range []Irradiance{1e-3, 1e-6} {
		cone, beam := f.DistanceTo(limit), (Along{20, p}).Above(limit).Until
		// The formula subtracts the aperture, the beam adds it in quadrature.
		if !(cone <= beam) || float64(beam-cone) > 1.01*float64(f.Diameter)/f.Divergence.Radians() {
			t.Errorf("%v W/m²: cone %v m, beam %v m", limit, cone, beam)
		}
	}
}

func TestDistanceToCornerCases(t *testing.T) {
	nan := math.NaN()
	if got := (FarField{0.001, 0.3, 1e-5}).DistanceTo(25); got != 0 {
		t.Errorf("a beam below the limit from the start: %v m", got)
	}
	if got := (FarField{1, 0, 0}).DistanceTo(25); !math.IsInf(float64(got), 1) {
		t.Errorf("a beam that does not widen: %v m", got)
	}
	for _, c := range []struct {
		f FarField
		e Irradiance
	}{{FarField{-1, 0, 1}, 1}, {FarField{Power(nan), 0, 1}, 1}, {FarField{1, -1, 1}, 1}, {FarField{1, 0, s1.Angle(nan)}, 1}, {FarField{1, 0, 1}, 0}, {FarField{1, 0, 1}, Irradiance(nan)}} {
		if got := c.f.DistanceTo(c.e); !math.IsNaN(float64(got)) {
			t.Errorf("%+v to %v: %v", c.f, c.e, got)
		}
	}
	// A wavelength that is hardly seen: no level above the MPE.
	for _, l := range Levels(Limit{Irradiance: 25}, 0.0004) {
		if l.Irradiance > 25 {
			t.Errorf("%+v", l)
		}
	}
}
