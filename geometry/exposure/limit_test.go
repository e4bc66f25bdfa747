package exposure

import (
	"math"
	"strings"
	"testing"
	"time"

	"beamward/geometry"
)

// near reports whether got is within a part of want.
func near(got, want, part float64) bool { return math.Abs(got-want) <= part*math.Abs(want) }

// TestThermalVectors checks H = 18 t^0.75 J/m² and E = H/t, computed to 9 digits.
func TestThermalVectors(t *testing.T) {
	for _, c := range []struct{ t, h, e float64 }{
		{1.8e-5, 0.0049742417, 276.346761},
		{1e-3, 0.101221439, 101.221439},
		{1e-2, 0.569209979, 56.9209979},
		{0.1, 3.20090294, 32.0090294},
		{0.25, 6.36396103, 25.4558441},
		{1, 18, 18},
		{10, 101.221439, 10.1221439},
	} {
		got, err := MPE(Emission{Wavelength: nm(589.158), Exposure: time.Duration(math.Round(c.t * 1e9))})
		if err != nil || !near(float64(got.Irradiance), c.e, 1e-8) || got.Rule != RuleContinuous {
			t.Errorf("%v s: %+v, %v, want %v W/m²", c.t, got, err, c.e)
		}
		if h := float64(got.Irradiance) * c.t; !near(h, c.h, 1e-8) {
			t.Errorf("%v s: %v J/m², want %v", c.t, h, c.h)
		}
		for _, e := range []Edition{Directive2006, Editions2014} {
			if h := e.single().thermal(c.t); !near(float64(h), c.h, 1e-8) {
				t.Errorf("%v s by %v: %v J/m², want %v", c.t, e, h, c.h)
			}
		}
	}
}

// TestAversion checks the values in which 0.25 s is usually quoted: 25.4 W/m²
// (IEC 60825-1 ed. 3, secondary), 2.6 mW/cm² (AC 70-1B, secondary), and 0.98 mW
// through a pupil of 7 mm, hence the 1 mW of class 2.
func TestAversion(t *testing.T) {
	got, err := MPE(Emission{Wavelength: nm(589)})
	if err != nil || got.Exposure != Aversion {
		t.Fatalf("%+v, %v", got, err)
	}
	e := float64(got.Irradiance)
	if !near(e, 25.4, 0.003) || !near(e/10, 2.6, 0.025) {
		t.Errorf("%v W/m²", e)
	}
	if p := e * math.Pi / 4 * 0.007 * 0.007; !near(p, 0.979655688e-3, 1e-8) {
		t.Errorf("%v W through 7 mm", p)
	}
}

// TestSinglePulse checks the limit of one short pulse: 5e-3 J/m² from 1 ns to 18
// µs in the editions of 2007 (from memory), 2e-3 to 5 µs in those of 2014 (0.2
// µJ/cm², secondary: a digest of AC 70-1B).
func TestSinglePulse(t *testing.T) {
	for _, c := range []struct {
		pulse   time.Duration
		edition Edition
		want    float64
	}{
		{time.Nanosecond, Directive2006, 5e-3},
		{10 * time.Nanosecond, Directive2006, 5e-3},
		{17 * time.Microsecond, Directive2006, 5e-3},
		{18 * time.Microsecond, Directive2006, 0.0049742417},
		{10 * time.Nanosecond, Editions2014, 2e-3},
		{4 * time.Microsecond, Editions2014, 2e-3},
		{10 * time.Microsecond, Editions2014, 18 * math.Pow(1e-5, 0.75)},
		{10 * time.Nanosecond, Strictest, 2e-3},
		{10 * time.Microsecond, Strictest, 18 * math.Pow(1e-5, 0.75)},
		{time.Millisecond, Strictest, 0.101221439},
	} {
		got, err := MPE(Emission{Wavelength: nm(532), Pulse: c.pulse, Edition: c.edition})
		if err != nil || !near(float64(got.PerPulse), c.want, 1e-8) || got.Rule != RuleSinglePulse || got.Pulses != 1 {
			t.Errorf("%v by %v: %+v, %v, want %v J/m²", c.pulse, c.edition, got, err, c.want)
		}
	}
}

// TestPulsedVectors checks the three rules of Directive 2006/25/EC, Annex II,
// table 2.6 (read there: CELEX 02006L0025-20190726), for 0.25 s, computed.
func TestPulsedVectors(t *testing.T) {
	for _, c := range []struct {
		f                           float64
		pulse                       time.Duration
		n                           int
		single, many, average, want float64
		rule                        Rule
	}{
		{20, 10 * time.Nanosecond, 5, 5e-3, 0.00334370152, 1.27279221, 0.00334370152, RuleManyPulses},
		{1e3, 100 * time.Microsecond, 250, 0.018, 0.00452676035, 0.0254558441, 0.00452676035, RuleManyPulses},
		{13e3, time.Microsecond, 3250, 5e-3, 6.62215e-4, 1.95814e-3, 6.62215e-4, RuleManyPulses},
	} {
		got, err := MPE(Emission{Wavelength: nm(589), Pulse: c.pulse, Repetition: c.f, Edition: Directive2006})
		if err != nil || got.Pulses != c.n || got.Rule != c.rule || !near(float64(got.PerPulse), c.want, 1e-6) {
			t.Errorf("%v Hz, %v: %+v, %v, want %v J/m²", c.f, c.pulse, got, err, c.want)
		}
		if !near(float64(got.Irradiance), c.want*c.f, 1e-6) {
			t.Errorf("%v Hz, %v: average %v W/m²", c.f, c.pulse, got.Irradiance)
		}
		s := Directive2006.single()
		single := float64(s.thermal(c.pulse.Seconds()))
		for what, o := range map[string][2]float64{
			"single":  {single, c.single},
			"many":    {single * math.Pow(float64(c.n), -0.25), c.many},
			"average": {float64(s.thermal(0.25)) / float64(c.n), c.average},
		} {
			if !near(o[0], o[1], 3e-6) {
				t.Errorf("%v Hz, %v: %s %v, want %v", c.f, c.pulse, what, o[0], o[1])
			}
		}
	}
}

// TestPulsesCountedTogether checks that pulses closer than the shortest time
// count as one, and that the average governs a beam that is almost continuous.
func TestPulsesCountedTogether(t *testing.T) {
	got, err := MPE(Emission{Wavelength: nm(589), Pulse: time.Nanosecond, Repetition: 1e6, Edition: Directive2006})
	if err != nil {
		t.Fatal(err)
	}
	// 18 pulses in 18 µs, 13,889 such groups in 0.25 s.
	want := 18 * math.Pow(18e-6, 0.75) / 18 * math.Pow(13889, -0.25)
	if got.Pulses != 13889 || got.Rule != RuleManyPulses || !near(float64(got.PerPulse), want, 1e-9) {
		t.Errorf("%+v, want %v", got, want)
	}
	cw, err := MPE(Emission{Wavelength: nm(589)})
	if err != nil || !(got.Irradiance < cw.Irradiance) {
		t.Errorf("%v W/m² on average, continuous %v, %v", got.Irradiance, cw.Irradiance, err)
	}
	// Pulses of 9 ms every 10 ms: 25 of them share the limit of 0.25 s.
	got, err = MPE(Emission{Wavelength: nm(589), Pulse: 9 * time.Millisecond, Repetition: 100, Edition: Directive2006})
	if want := 6.36396103 / 25; err != nil || got.Rule != RuleManyPulses && got.Rule != RuleAverage || !(float64(got.PerPulse) <= want*(1+1e-8)) {
		t.Errorf("%+v, %v, want at most %v", got, err, want)
	}
}

// TestStrictest checks that the zero edition is never above another, and that
// longer or more exposure is never allowed more.
func TestStrictest(t *testing.T) {
	for _, pulse := range []time.Duration{0, 1, 10, 1000, 4e3, 6e3, 17e3, 19e3, 1e6} {
		for _, f := range []float64{0, 1, 20, 800, 1e4, 5e4, 6e4, 3e5, 1e8} {
			if f > 0 && (pulse == 0 || f*pulse.Seconds() >= 1) {
				continue
			}
			e := Emission{Wavelength: nm(589), Pulse: pulse, Repetition: f}
			strict, err := MPE(e)
			if err != nil {
				t.Fatal(err)
			}
			for _, e.Edition = range []Edition{Directive2006, Editions2014} {
				o, err := MPE(e)
				if err != nil || strict.PerPulse > o.PerPulse || strict.Irradiance > o.Irradiance {
					t.Errorf("%+v: %+v is above %+v (%v)", e, strict, o, err)
				}
				e.Exposure = 10 * time.Second
				longer, err := MPE(e)
				if err != nil || longer.PerPulse > o.PerPulse || longer.Irradiance > o.Irradiance {
					t.Errorf("%+v: %+v for longer than %+v (%v)", e, longer, o, err)
				}
				e.Exposure = 0
			}
		}
	}
}

func TestMPERefuses(t *testing.T) {
	for what, e := range map[string]Emission{
		"outside the 400 to 700 nm": {Wavelength: nm(1064)},
		"nan nm":                    {Wavelength: geometry.Length(math.NaN())},
		"outside the 1 ns to 10 s":  {Wavelength: nm(589), Exposure: 11 * time.Second},
		"shorter than 1 ns":         {Wavelength: nm(589), Pulse: -1, Repetition: 5},
		"longer than the exposure":  {Wavelength: nm(589), Pulse: time.Second},
		"not below 0":               {Wavelength: nm(589), Pulse: 10, Repetition: math.NaN()},
		"needs its length":          {Wavelength: nm(589), Repetition: 5},
		"leave no gap":              {Wavelength: nm(589), Pulse: time.Millisecond, Repetition: 1000},
		"edition":                   {Wavelength: nm(589), Edition: 3},
	} {
		got, err := MPE(e)
		if err == nil || got != (Limit{}) || !strings.Contains(strings.ToLower(err.Error()), what) {
			t.Errorf("%s: %+v, %v", what, got, err)
		}
	}
	for e := range Edition(5) {
		if e.String() == "" {
			t.Errorf("edition %d has no name", e)
		}
	}
	for r := range Rule(5) {
		if r.String() == "" {
			t.Errorf("rule %d has no name", r)
		}
	}
}
