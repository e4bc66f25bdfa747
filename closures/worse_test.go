package closures

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"
)

// story runs ten seconds of random facts under rules and returns, step by
// step, whether the beam was open. The same seed gives the same facts whatever
// the rules.
func story(t *testing.T, seed uint64, rules func(*Rules), worsen func(Body) Body) (open []bool, opened int) {
	rng := rand.New(rand.NewPCG(seed, 5))
	r := busyRules()
	r.Beams[0].ReopenAfter = time.Second
	if rules != nil {
		rules(r)
	}
	w := newWorld(t, r, openList(t))
	w.quiet = func(b Body) bool { return false }
	away := overheadICRS(t, busyRules(), evening, 330, 50)
	frame := earth.FrameAt(r.Site.Position)
	beam := w.s.night(evening).Horizon(w.dir, evening)
	text := &ListText{ID: "w", Authority: "orbital-desk", Issued: evening, Covers: span.Span{From: evening.Add(-time.Hour), Until: evening.Add(time.Hour)}, UnlistedOpen: true, Digest: Digest{3}}
	text.Regions = []Region{{ID: "r", Shape: ICRSCone, Direction: w.dir.Add(away.Mul(0.01 * rng.Float64())).Normalize(), Radius: s1.Angle(0.1+0.5*rng.Float64()) * s1.Degree}}
	from := evening.Add(time.Duration(4+rng.IntN(20)) * time.Second)
	text.Windows = []Window{{Region: 0, From: from.UnixNano(), Until: from.Add(time.Second).UnixNano()}}
	l, err := Index(text)
	if err != nil {
		t.Fatal(err)
	}
	facts := []Body{ListOffered{List: l, By: "t"}}
	start := beam.Mul(9000).Add(geometry.FromHorizon(s1.Angle(6*rng.Float64()), 0).Mul(3000 + 6000*rng.Float64()))
	course := s1.Angle(6 * rng.Float64())
	for i := range 150 {
		facts = append(facts, w.ridge(away))
		if i%10 == 0 {
			s, c := math.Sincos(course.Radians())
			p := start
			p.X += 150 * s * float64(i) / 10
			p.Y += 150 * c * float64(i) / 10
			facts = append(facts, AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "abc", Located: true, Position: earth.FromECEF(frame.ECEF(p)), AltitudeFrom: AboveEllipsoid, Speed: 150, Track: course, Climb: 0, Error: 50, VerticalError: 50, VelocityError: 3, VerticalVelError: 3})
		}
		switch rng.IntN(60) {
		case 0:
			facts = append(facts, InterlockSeen{Source: "catwalk", Said: w.at.Add(100 * time.Millisecond), Safe: false})
		case 1:
			facts = append(facts, Sighted{Source: "spotter-east", Said: w.at, For: 3 * time.Second, HasDirection: true, Direction: geometry.FromHorizon(s1.Angle(6*rng.Float64()), 1), Spread: 10 * s1.Degree})
		case 2:
			facts = append(facts, HoldPlaced{ID: HoldID(fmt.Sprint("h", i)), Beam: EveryBeam, By: "ana", Placed: w.at, Until: w.at.Add(2 * time.Second)})
		}
		if worsen != nil {
			for k, f := range facts {
				facts[k] = worsen(f)
			}
		}
		d := w.step(100*time.Millisecond, facts...)
		facts = nil
		open = append(open, d.Open)
		if d.Open {
			opened++
		}
	}
	return open, opened
}

// Less knowledge or a larger allowance never opens a beam: the same facts made
// worse are open at no step at which the better ones are shuttered. BW-003
func TestWorseNeverOpens(t *testing.T) {
	worse := []struct {
		name   string
		rules  func(*Rules)
		worsen func(Body) Body
	}{
		{"larger aim error", func(r *Rules) { r.Beams[0].Aim.Error += 0.1 * s1.Degree }, nil},
		{"larger asterism", func(r *Rules) { r.Beams[0].Asterism += 0.1 * s1.Degree }, nil},
		{"longer lead and tail", func(r *Rules) { r.Authorities[0].Lead += 2 * time.Second; r.Authorities[0].Tail += 2 * time.Second }, nil},
		{"slower shutter", func(r *Rules) { r.Beams[0].ShutterTime += time.Second }, nil},
		{"longer lease", func(r *Rules) { r.Permit.Lease += time.Second }, nil},
		{"larger keep-out", func(r *Rules) { r.Aircraft.KeepOutHalfAngle += 2 * s1.Degree }, nil},
		{"quicker aircraft", func(r *Rules) { r.Aircraft.HorizontalAccel *= 2; r.Aircraft.VerticalAccel *= 2 }, nil},
		{"later reports", func(r *Rules) { r.Sources[1].Latency += time.Second }, nil},
		{"larger clock error", nil, func(b Body) Body {
			if c, is := b.(ClockState); is {
				c.MaxError += 150 * time.Millisecond
				return c
			}
			return b
		}},
		{"larger aircraft errors", nil, func(b Body) Body {
			if a, is := b.(AircraftSeen); is {
				a.Error += 300
				a.VelocityError += 10
				return a
			}
			return b
		}},
		{"no velocities", nil, func(b Body) Body {
			if a, is := b.(AircraftSeen); is {
				a.Speed = geometry.Speed(math.NaN())
				return a
			}
			return b
		}},
		{"no heights", nil, func(b Body) Body {
			if a, is := b.(AircraftSeen); is {
				a.AltitudeFrom = NoAltitude
				return a
			}
			return b
		}},
		{"wider sightings", nil, func(b Body) Body {
			if s, is := b.(Sighted); is {
				s.HasDirection = false
				return s
			}
			return b
		}},
		{"a larger neighbour's field", func(r *Rules) { r.Neighbours[0].Field += 5 * s1.Degree }, nil},
		{"higher limit", func(r *Rules) { r.Beams[0].Limits.ElevationMin += 5 * s1.Degree }, nil},
		{"shorter staleness", func(r *Rules) { r.Sources[0].StaleAfter = 500 * time.Millisecond }, nil},
	}
	var total, shut int
	for seed := range uint64(40) {
		base, opened := story(t, seed, nil, nil)
		total += opened
		for _, c := range worse {
			bad, _ := story(t, seed, c.rules, c.worsen)
			for i := range base {
				if bad[i] && !base[i] {
					t.Fatalf("seed %d, %s: open at step %d, where it was shuttered", seed, c.name, i)
				}
				if base[i] && !bad[i] {
					shut++
				}
			}
		}
	}
	t.Logf("%d open steps; made worse, %d of them shuttered", total, shut)
	if total < 500 || shut < 300 {
		t.Error("the stories leave nothing to compare")
	}
}

// Any field that is not a number shutters or is refused; it never opens. BW-004
func TestNotANumberNeverOpens(t *testing.T) {
	nan := math.NaN()
	for name, body := range map[string]Body{
		"aim":      AimSeen{Beam: "north", Said: evening.Add(time.Hour), From: "encoder", Aim: &Aim{Frame: ICRS, Direction: geometry.FromHorizon(s1.Angle(nan), 1), Motion: Tracking}},
		"aim rate": AimSeen{Beam: "north", Said: evening.Add(time.Hour), From: "encoder", Aim: &Aim{Frame: ICRS, Direction: geometry.FromHorizon(1, 1), RateRA: nan, Motion: Tracking}},
		"error":    AimSeen{Beam: "north", Said: evening.Add(time.Hour), From: "encoder", Aim: &Aim{Frame: ICRS, Direction: geometry.FromHorizon(1, 1), Error: s1.Angle(nan), Motion: Tracking}},
		"sighting": Sighted{Source: "spotter-east", Said: evening.Add(7 * time.Second), HasDirection: true, Direction: geometry.FromHorizon(s1.Angle(nan), 1), For: time.Minute},
		"spread":   Sighted{Source: "spotter-east", Said: evening.Add(7 * time.Second), HasDirection: true, Direction: geometry.FromHorizon(1, 0), Spread: s1.Angle(nan), For: time.Minute},
		"aircraft": AircraftSeen{Source: "rx-1", Said: evening.Add(7 * time.Second), Aircraft: "a", Located: true, Position: earth.Position{Lat: s1.Angle(nan)}, AltitudeFrom: AboveEllipsoid, Error: 10, VerticalError: 10},
		"height":   AircraftSeen{Source: "rx-1", Said: evening.Add(7 * time.Second), Aircraft: "a", Located: true, Position: earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: geometry.Length(nan)}, AltitudeFrom: AboveEllipsoid, Error: 10, VerticalError: 10},
		"weather":  WeatherSeen{Source: "mast", Said: evening.Add(7 * time.Second), PressureHPa: nan, Temperature: nan},
	} {
		r := busyRules()
		w := newWorld(t, r, openList(t))
		away := overheadICRS(t, r, evening, 330, 50)
		w.step(0, w.ridge(away))
		w.mustOpen()
		d := w.step(100*time.Millisecond, body)
		if d.Open && name != "weather" {
			t.Errorf("%s: still open", name)
		}
		if name == "weather" && w.s.Foreseen().Air != r.Site.Air.Over(r.Site.Position.Height) {
			t.Errorf("weather that is no number is believed")
		}
	}
}
