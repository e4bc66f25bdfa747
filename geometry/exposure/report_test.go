package exposure

import (
	"math"
	"strings"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/s1"
	"pgregory.net/rapid"
)

func guideStar() Setup {
	return Setup{
		Power:       22,
		Profile:     geometry.Profile{Aperture: 0.30, Wavelength: nm(589.158), Quality: 1.1},
		FocusHeight: 92e3,
		Site:        2450,
		Elevations:  []s1.Angle{30 * s1.Degree, 45 * s1.Degree, 90 * s1.Degree},
	}
}

func TestAssess(t *testing.T) {
	r, err := Assess(guideStar())
	if err != nil {
		t.Fatal(err)
	}
	if len(r.Levels) != 4 || len(r.Elevations) != 3 || len(r.Cautions) == 0 || !near(float64(r.Limit.Irradiance), 25.4558441, 1e-8) {
		t.Fatalf("%+v", r)
	}
	if all := strings.Join(r.Cautions, " "); !strings.Contains(all, "laser safety officer") || !strings.Contains(all, "aviation authority") {
		t.Errorf("cautions: %s", all)
	}
	for _, a := range r.Elevations {
		if want := earth.ShellRange(2450, 92e3, a.Elevation); a.Focus != want {
			t.Errorf("focus at %v, want %v", a.Focus, want)
		}
		last := geometry.Length(0)
		for i, reach := range a.Reaches {
			if reach.Distance < last || reach.Distance < reach.Until || reach.Distance < reach.FarField {
				t.Errorf("%v, %s: %+v", a.Elevation, r.Levels[i].Name, reach)
			}
			last = reach.Distance
			// Nowhere beyond is the beam at the level.
			beam := Along{22, geometry.Profile{Aperture: 0.30, Focus: a.Focus, Wavelength: nm(589.158), Quality: 1.1}}
			for f := geometry.Length(1.000001); f < 1e4; f *= 1.5 {
				if e := beam.Irradiance(reach.Distance*f + 1); !(e < r.Levels[i].Irradiance) {
					t.Errorf("%v, %s: %v W/m² beyond %v", a.Elevation, r.Levels[i].Name, e, reach.Distance)
				}
			}
			sin, cos := math.Sincos(a.Elevation.Radians())
			if !near(float64(reach.Horizontal), float64(reach.Distance)*cos, 1e-12) {
				t.Errorf("horizontal %v of %v", reach.Horizontal, reach.Distance)
			}
			if up := float64(reach.Distance) * sin; float64(reach.Height)-2450 < up-1e-6*up {
				t.Errorf("a height of %v, the flat formula gives %v", reach.Height, up)
			}
		}
	}
	// A beam of these sizes is above the MPE all the way to its star and beyond.
	if first := r.Elevations[2].Reaches[0]; first.Passings != 1 || first.Until < 92e3 {
		t.Errorf("%+v", first)
	}
}

// TestAssessNearTheGround checks equation 70-1.7 where the Earth is flat: a
// weak beam.
func TestAssessNearTheGround(t *testing.T) {
	s := guideStar()
	s.Power, s.FocusHeight, s.Site = 0.005, 0, 0
	s.Profile = geometry.Profile{Aperture: 1e-3, Focus: geometry.Length(math.Inf(1)), Wavelength: nm(532), Quality: 1}
	s.Elevations = []s1.Angle{20 * s1.Degree}
	r, err := Assess(s)
	if err != nil {
		t.Fatal(err)
	}
	reach := r.Elevations[0].Reaches[0]
	if want := float64(reach.Distance) * math.Sin(20*math.Pi/180); !near(float64(reach.Height), want, 1e-4) {
		t.Errorf("a height of %v, want %v", reach.Height, want)
	}
}

// TestAssessTwice has a wide beam that exceeds a level only about its focus, and
// one that never does.
func TestAssessTwice(t *testing.T) {
	s := guideStar()
	s.Profile.Aperture = 3
	r, err := Assess(s)
	if err != nil {
		t.Fatal(err)
	}
	reach := r.Elevations[2].Reaches[0]
	if reach.Passings != 2 || !(reach.From > 0 && reach.FromHeight > 2450 && reach.Until > reach.From) {
		t.Errorf("%+v", reach)
	}
	s.Power = 1e-6
	r, err = Assess(s)
	if err != nil {
		t.Fatal(err)
	}
	if reach := r.Elevations[2].Reaches[0]; reach.Passings != 0 || reach.Distance != 0 {
		t.Errorf("%+v", reach)
	}
}

// TestMoreIsNeverNearer: more power, longer exposure, a better beam or less
// seeing never brings the distance to keep nearer.
func TestMoreIsNeverNearer(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := Setup{
			Power: Power(rapid.Float64Range(0.001, 100).Draw(t, "power")),
			Profile: geometry.Profile{
				Aperture:   geometry.Length(rapid.Float64Range(0.001, 1).Draw(t, "aperture")),
				Wavelength: nm(rapid.Float64Range(400, 700).Draw(t, "wavelength")),
				Quality:    rapid.Float64Range(1, 3).Draw(t, "quality"),
				Focus:      geometry.Length(rapid.Float64Range(1e3, 1e6).Draw(t, "focus")),
				Seeing:     s1.Angle(rapid.Float64Range(0, 1e-5).Draw(t, "seeing")),
			},
			Site:       geometry.Length(rapid.Float64Range(0, 5000).Draw(t, "site")),
			Elevations: []s1.Angle{s1.Angle(rapid.Float64Range(0.1, 1.57).Draw(t, "elevation"))},
		}
		before, err := Assess(s)
		if err != nil {
			t.Fatal(err)
		}
		what := rapid.SampledFrom([]string{"power", "exposure", "seeing"}).Draw(t, "more")
		switch what {
		case "power":
			s.Power *= 2
		case "exposure":
			s.Exposure = 10 * time.Second
		case "seeing":
			s.Profile.Seeing = 0
		}
		after, err := Assess(s)
		if err != nil {
			t.Fatal(err)
		}
		for i := range before.Levels {
			b, a := before.Elevations[0].Reaches[i], after.Elevations[0].Reaches[i]
			if !(a.Distance >= b.Distance*(1-1e-12)) {
				t.Fatalf("%s: %s from %v to %v", what, before.Levels[i].Name, b.Distance, a.Distance)
			}
		}
	})
}

func TestAssessRefuses(t *testing.T) {
	for what, spoil := range map[string]func(*Setup){
		"power":                     func(s *Setup) { s.Power = 0 },
		"power must":                func(s *Setup) { s.Power = Power(math.Inf(1)) },
		"not on earth":              func(s *Setup) { s.Site = geometry.Length(math.NaN()) },
		"not above the launch":      func(s *Setup) { s.FocusHeight = 2000 },
		"do not describe a beam":    func(s *Setup) { s.Profile.Quality = 0.9 },
		"aperture":                  func(s *Setup) { s.Profile.Aperture = 0 },
		"focus":                     func(s *Setup) { s.FocusHeight = 0 },
		"pulses a second":           func(s *Setup) { s.Pulse = time.Microsecond },
		"needs an elevation":        func(s *Setup) { s.Elevations = nil },
		"above 0° and up to 90°":    func(s *Setup) { s.Elevations[1] = 0 },
		"nan° is not":               func(s *Setup) { s.Elevations[1] = s1.Angle(math.NaN()) },
		"outside the 400 to 700 nm": func(s *Setup) { s.Profile.Wavelength = nm(1064) },
		"no gap":                    func(s *Setup) { s.Pulse, s.Repetition = time.Millisecond, 1000 },
	} {
		s := guideStar()
		spoil(&s)
		r, err := Assess(s)
		if err == nil || !strings.Contains(strings.ToLower(err.Error()), what) || r.Levels != nil {
			t.Errorf("%s: %v", what, err)
		}
	}
}

// TestPulsedBeam: a beam in pulses has the lower limit, and the report says so.
func TestPulsedBeam(t *testing.T) {
	s := guideStar()
	cw, err := Assess(s)
	if err != nil {
		t.Fatal(err)
	}
	s.Pulse, s.Repetition = 100*time.Microsecond, 800
	pulsed, err := Assess(s)
	if err != nil {
		t.Fatal(err)
	}
	if !(pulsed.Limit.Irradiance < cw.Limit.Irradiance) || pulsed.Limit.Rule != RuleManyPulses || !strings.Contains(pulsed.Levels[0].Clause, "rule 3") {
		t.Errorf("%+v", pulsed.Limit)
	}
	if !(pulsed.Elevations[0].Reaches[0].Distance > cw.Elevations[0].Reaches[0].Distance) {
		t.Error("the hazard distance of pulses is not the longer one")
	}
}
