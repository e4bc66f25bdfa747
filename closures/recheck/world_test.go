package recheck_test

import (
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/recheck"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// evening is an instant of an invented night at the invented Skerry Peak.
var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

// busyRules have one of everything.
func busyRules() *closures.Rules {
	r := &closures.Rules{
		Site: closures.SiteRules{
			Name: "Skerry Peak", TimeZone: "Atlantic/St_Helena",
			Position: earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}, Geoid: 18,
			UT1: sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true},
		},
		Permit:   closures.PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond},
		Clock:    closures.ClockRules{Synchronised: closures.SyncRequired, StepLimit: 100 * time.Millisecond},
		ByItself: closures.AllCodes,
		Beams: []closures.BeamRules{{
			ID: "north", Launches: []closures.Launch{{ID: "axis", Offset: r3.Vector{Z: 12}}}, AimOfTelescope: true,
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.3, FocusHeight: 92000, Asterism: 20 * geometry.Arcsecond,
			Limits:      closures.Limits{ElevationMin: 30 * s1.Degree, ElevationMax: 89 * s1.Degree, SunBelow: -12 * s1.Degree},
			Aim:         closures.AimRules{StaleAfter: 3 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: 0.1 * s1.Degree},
			ShutterTime: 500 * time.Millisecond, FeedbackStale: 5 * time.Second, ReopenAfter: time.Second,
		}},
		Authorities: []closures.AuthorityRules{{ID: "orbital-desk", Required: true, Integrity: closures.IntegrityNone, Lead: 5 * time.Second, Tail: 5 * time.Second, Loosening: closures.LooseningAtOnce}},
		Aircraft: closures.AircraftRules{
			Configured: true, KeepOutHalfAngle: 2 * s1.Degree, KeepOutRadius: 300, KeepOutCeiling: 20000,
			HorizontalAccel: 22, VerticalAccel: 4, SpeedMax: 350, ClimbMax: 30, Unlocated: closures.UnlocatedShutter,
			LostAfter: time.Minute, WatchRange: 200e3, DetectionRange: 60e3,
		},
		Sources: []closures.SourceRules{
			{ID: "catwalk", Kind: closures.InterlockSource, StaleAfter: 5 * time.Second, Required: true},
			{ID: "rx-1", Kind: closures.AircraftSource, StaleAfter: 10 * time.Second, Required: true, Latency: time.Second, WarmUp: time.Second, PositionError: 200, VerticalError: 100, VelocityError: 10, VerticalVelocityErr: 5},
			{ID: "thermal-1", Kind: closures.DetectorSource, StaleAfter: 5 * time.Second, Required: true},
			{ID: "spotter-east", Kind: closures.SightingSource, StaleAfter: 15 * time.Minute},
		},
		Watches:    []closures.WatchRules{{Post: "east-lot", Minimum: 1, Shift: 4 * time.Hour, Required: true}},
		Neighbours: []closures.NeighbourRules{{ID: "ridge-2", Offset: r3.Vector{X: 140, Y: -60, Z: 3}, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: 2 * time.Hour}},
	}
	r.Digest[0] = 1
	return r
}

// world drives a state as the engine does, keeps everything clear that a test
// does not make otherwise, and asks the second opinion after every step.
type world struct {
	t     testing.TB
	s     *closures.State
	r     *closures.Rules
	at    time.Time
	seq   uint64
	aim   *closures.Aim
	ridge *closures.Aim
	night *sky.Night
	check recheck.Checker

	quiet       func(closures.Body) bool
	opened      int // open decisions seen
	falselyShut int
}

// icrs is an aim that tracks what stands at an azimuth and elevation (degrees).
func icrs(t testing.TB, r *closures.Rules, at time.Time, az, el float64) *closures.Aim {
	t.Helper()
	n := prepare(t, r, at)
	d := n.ICRS(geometry.FromHorizon(s1.Angle(az)*s1.Degree, s1.Angle(el)*s1.Degree), at)
	return &closures.Aim{Frame: closures.ICRS, Direction: d, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
}

func prepare(t testing.TB, r *closures.Rules, at time.Time) *sky.Night {
	t.Helper()
	n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
	if err != nil {
		t.Fatal(err)
	}
	return n
}

func index(t testing.TB, text closures.ListText) *closures.List {
	t.Helper()
	if text.Issued.IsZero() {
		text.Issued = evening.Add(-24 * time.Hour)
	}
	if text.Covers.Empty() {
		text.Covers = span.Span{From: evening.Add(-24 * time.Hour), Until: evening.Add(24 * time.Hour)}
	}
	if text.Authority == "" {
		text.Authority = "orbital-desk"
	}
	l, err := closures.Index(&text)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// openList covers two days about evening with an open whole sky.
func openList(t testing.TB) *closures.List {
	return index(t, closures.ListText{ID: "dome", Regions: []closures.Region{{ID: "dome", Shape: closures.WholeSky, Throughout: closures.ThroughoutOpen}}, Digest: closures.Digest{1}})
}

func newWorld(t testing.TB, r *closures.Rules, start time.Time, lists ...*closures.List) *world {
	t.Helper()
	s, err := closures.New(r, closures.Boot{ID: "boot", At: start}, closures.Durable{})
	if err != nil {
		t.Fatal(err)
	}
	w := &world{t: t, s: s, r: r, at: start, aim: icrs(t, r, start, 150, 65), ridge: icrs(t, r, start, 330, 50), night: prepare(t, r, start)}
	var facts []closures.Body
	for _, d := range []time.Duration{-12 * time.Hour, 0, 12 * time.Hour} {
		facts = append(facts, closures.NightReady{Night: prepare(t, r, start.Add(d))})
	}
	for _, l := range lists {
		facts = append(facts, closures.ListOffered{List: l, By: "test"})
	}
	w.step(0, append(facts, closures.Started{})...)
	return w
}

// steady is what a quiet site says all the time.
func (w *world) steady() []closures.Body {
	out := []closures.Body{closures.ClockState{Synchronised: true, MaxError: 10 * time.Millisecond}, closures.RecordState{Durable: w.seq}}
	for i := range w.r.Beams {
		out = append(out, closures.AimSeen{Beam: w.r.Beams[i].ID, Said: w.at, From: "encoder", Aim: w.aim})
	}
	for i := range w.r.Neighbours {
		out = append(out, closures.AimSeen{Telescope: w.r.Neighbours[i].ID, Said: w.at, Aim: w.ridge, Exposing: closures.Yes})
	}
	for i := range w.r.Sources {
		switch src := &w.r.Sources[i]; src.Kind {
		case closures.InterlockSource:
			out = append(out, closures.InterlockSeen{Source: src.ID, Said: w.at, Safe: true})
		case closures.DetectorSource:
			out = append(out, closures.DetectorSeen{Source: src.ID, Said: w.at, State: closures.DetectorClear})
		default:
			out = append(out, closures.Heard{Source: src.ID, Said: w.at, Scope: closures.HeardReception, MessagesPerMinute: 1000})
		}
	}
	for i := range w.r.Watches {
		out = append(out, closures.WatchKept{Post: w.r.Watches[i].Post, Said: w.at, By: []string{"ana", "bo"}, Until: w.at.Add(time.Hour)})
	}
	return out
}

// step moves time on, gives the facts after the steady ones, and lets the
// second opinion look at each decision.
func (w *world) step(d time.Duration, facts ...closures.Body) closures.Decision {
	w.at = w.at.Add(d)
	var batch []closures.Fact
	for _, b := range append(w.steady(), facts...) {
		if w.quiet != nil && w.quiet(b) {
			continue
		}
		w.seq++
		batch = append(batch, closures.Fact{Seq: w.seq, At: w.at, Body: b})
	}
	out := w.s.Step(batch, w.at, nil)
	k := w.s.Known(w.at)
	for i := range out {
		if !out[i].Open {
			continue
		}
		w.opened++
		if v, vetoed := w.check.Check(&out[i], k, w.s.Foreseen(), w.r, w.at); vetoed {
			w.falselyShut++
			w.t.Errorf("%v: %s: vetoed an open decision until %v: %s", w.at, v.Beam, out[i].OpenUntil, v.Detail)
		}
	}
	return out[0]
}

// mustOpen steps until the beam is open.
func (w *world) mustOpen() closures.Decision {
	w.t.Helper()
	var d closures.Decision
	for range 40 {
		if d = w.step(100 * time.Millisecond); d.Open {
			return d
		}
	}
	w.t.Fatalf("not open: %v %+v", d.Codes.Names(), d.Reasons)
	return d
}

// turned is a direction the given degrees away, toward the north pole.
func turned(d r3.Vector, degrees float64) r3.Vector {
	ra, dec := geometry.ToEquator(d)
	return geometry.FromEquator(ra, dec+s1.Angle(degrees)*s1.Degree)
}

func box(azFrom, azTo, elFrom, elTo float64) geometry.Box {
	return geometry.Box{AzFrom: s1.Angle(azFrom) * s1.Degree, AzTo: s1.Angle(azTo) * s1.Degree, ElFrom: s1.Angle(elFrom) * s1.Degree, ElTo: s1.Angle(elTo) * s1.Degree}
}
