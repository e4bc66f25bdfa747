package closures

import (
	"math"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// evening is an instant of an invented night at the invented Skerry Peak.
var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

// siteRules are rules under which everything can be clear: one beam, one
// authority, one required interlock.
func siteRules() *Rules {
	r := &Rules{
		Site: SiteRules{
			Name: "Skerry Peak", TimeZone: "Atlantic/St_Helena",
			Position: earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}, Geoid: 18,
			UT1: sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true},
		},
		Permit:   PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond},
		Clock:    ClockRules{Synchronised: SyncRequired, StepLimit: 100 * time.Millisecond},
		ByItself: AllCodes,
		Beams: []BeamRules{{
			ID: "north", Launches: []Launch{{ID: "axis", Offset: r3.Vector{Z: 12}}}, AimOfTelescope: true,
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.3, FocusHeight: 92000, Asterism: 20 * geometry.Arcsecond,
			Limits:      Limits{ElevationMin: 30 * s1.Degree, ElevationMax: 89 * s1.Degree, SunBelow: -12 * s1.Degree},
			Aim:         AimRules{StaleAfter: 3 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: 0.1 * s1.Degree},
			ShutterTime: 500 * time.Millisecond, FeedbackStale: 5 * time.Second, ReopenAfter: 5 * time.Second,
		}},
		Authorities: []AuthorityRules{{ID: "orbital-desk", Required: true, Integrity: IntegrityNone, Lead: 5 * time.Second, Tail: 5 * time.Second, Loosening: LooseningAtOnce}},
		Sources:     []SourceRules{{ID: "catwalk", Kind: InterlockSource, StaleAfter: 5 * time.Second, Required: true}},
	}
	r.Digest[0] = 1
	return r
}

// overheadICRS is the ICRS direction that stands at a local direction at an
// instant.
func overheadICRS(t testing.TB, r *Rules, at time.Time, az, el float64) r3.Vector {
	t.Helper()
	n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
	if err != nil {
		t.Fatal(err)
	}
	return n.ICRS(geometry.FromHorizon(s1.Angle(az)*s1.Degree, s1.Angle(el)*s1.Degree), at)
}

// world drives a state as the engine does, and keeps everything clear that a
// test does not make otherwise.
type world struct {
	t    testing.TB
	s    *State
	r    *Rules
	at   time.Time
	seq  uint64
	dir  r3.Vector
	last []Decision

	quiet func(Body) bool // facts that are left out
}

// openList covers two days about evening with an open whole sky.
func openList(t testing.TB) *List {
	t.Helper()
	l, err := Index(&ListText{
		ID: "2031-045-A", Authority: "orbital-desk", Issued: evening.Add(-24 * time.Hour),
		Covers:  span.Span{From: evening.Add(-24 * time.Hour), Until: evening.Add(24 * time.Hour)},
		Regions: []Region{{ID: "dome", Shape: WholeSky, Throughout: ThroughoutOpen}}, Digest: Digest{1},
	})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func newWorld(t testing.TB, r *Rules, lists ...*List) *world {
	t.Helper()
	return newWorldAt(t, r, evening, lists...)
}

func newWorldAt(t testing.TB, r *Rules, start time.Time, lists ...*List) *world {
	t.Helper()
	s, err := New(r, Boot{ID: "boot", At: start}, Durable{})
	if err != nil {
		t.Fatal(err)
	}
	w := &world{t: t, s: s, r: r, at: start, dir: overheadICRS(t, r, start, 150, 65)}
	var facts []Body
	for _, d := range []time.Duration{0, 12 * time.Hour} {
		n, err := sky.Prepare(r.Site.Position, start.Add(d), r.Site.UT1)
		if err != nil {
			t.Fatal(err)
		}
		facts = append(facts, NightReady{n})
	}
	for _, l := range lists {
		facts = append(facts, ListOffered{List: l, By: "test"})
	}
	w.step(0, append(facts, Started{})...)
	return w
}

// steady is what a quiet site says all the time.
func (w *world) steady() []Body {
	out := []Body{
		ClockState{Synchronised: true, MaxError: 10 * time.Millisecond},
		RecordState{Durable: w.seq},
	}
	for i := range w.r.Beams {
		b := w.r.Beams[i].ID
		out = append(out, AimSeen{Beam: b, Said: w.at, From: "encoder", Aim: &Aim{Frame: ICRS, Direction: w.dir, Reference: w.at, Error: 5 * geometry.Arcsecond, Motion: Tracking}})
	}
	for i := range w.r.Sources {
		src := &w.r.Sources[i]
		switch src.Kind {
		case InterlockSource:
			out = append(out, InterlockSeen{Source: src.ID, Said: w.at, Safe: true})
		case DetectorSource:
			out = append(out, DetectorSeen{Source: src.ID, Said: w.at, State: DetectorClear})
		default:
			out = append(out, Heard{Source: src.ID, Said: w.at, Scope: HeardReception, MessagesPerMinute: 1000})
		}
	}
	for i := range w.r.Watches {
		out = append(out, WatchKept{Post: w.r.Watches[i].Post, Said: w.at, By: []string{"ana", "bo"}, Until: w.at.Add(time.Hour)})
	}
	return out
}

// step moves time on and gives the facts after the steady ones.
func (w *world) step(d time.Duration, facts ...Body) Decision {
	w.at = w.at.Add(d)
	var batch []Fact
	for _, b := range append(w.steady(), facts...) {
		if w.quiet != nil && w.quiet(b) {
			continue
		}
		w.seq++
		batch = append(batch, Fact{Seq: w.seq, At: w.at, Body: b})
	}
	w.last = w.s.Step(batch, w.at, nil)
	return w.last[0]
}

// run steps for a while at the decision interval and returns the last
// decision.
func (w *world) run(d time.Duration, facts ...Body) Decision {
	var out Decision
	for t := time.Duration(0); t < d; t += w.r.Permit.DecisionInterval {
		out = w.step(w.r.Permit.DecisionInterval, facts...)
		facts = nil
	}
	return out
}

func (w *world) mustOpen() {
	w.t.Helper()
	if d := w.run(w.r.Beams[0].ReopenAfter + time.Second); !d.Open {
		w.t.Fatalf("not open: %v", reasons(d))
	}
}

func reasons(d Decision) string {
	var out []string
	for _, f := range d.Reasons {
		out = append(out, f.Code.String()+"/"+f.Verdict.String()+" "+string(f.Source)+": "+f.Detail)
	}
	return strings.Join(out, "; ")
}

// BW-005
func TestOpensWhenAllIsClear(t *testing.T) {
	w := newWorld(t, siteRules(), openList(t))
	if d := w.last[0]; d.Open {
		t.Fatal("open at the first decision")
	}
	d := w.run(4 * time.Second)
	if d.Open || d.Codes != Codes(0).With(CodeReopening) {
		t.Fatalf("after 4 s: open %v, %v", d.Open, reasons(d))
	}
	d = w.run(1200 * time.Millisecond)
	if !d.Open {
		t.Fatalf("after 5.2 s: %v", reasons(d))
	}
	if d.OpenUntil.IsZero() && !d.ClosesAt.IsZero() {
		t.Error("closes without an end to the opening")
	}
}

func TestZeroDecisionIsShuttered(t *testing.T) {
	var d Decision
	if d.Open {
		t.Fatal("the zero decision is open")
	}
	var v [NumCodes]Verdict
	if Fold(&v) {
		t.Fatal("nothing said is open")
	}
	if math.IsNaN(UnknownMargin().Value) == false {
		t.Fatal("an unknown margin is a number")
	}
}
