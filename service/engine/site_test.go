package engine

import (
	"context"
	"errors"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// evening is an instant of an invented night at the invented Skerry Peak.
var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

// siteRules are rules under which everything can be clear: one beam, one
// authority, one required interlock.
func siteRules() *closures.Rules {
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
		Sources:     []closures.SourceRules{{ID: "catwalk", Kind: closures.InterlockSource, StaleAfter: 5 * time.Second, Required: true}},
	}
	r.Digest[0] = 1
	return r
}

// withAircraft adds two optional aircraft sources.
func withAircraft(r *closures.Rules) *closures.Rules {
	r.Aircraft = closures.AircraftRules{
		Configured: true, KeepOutHalfAngle: 2 * s1.Degree, KeepOutRadius: 300, KeepOutCeiling: 20e3, HorizontalAccel: 22, VerticalAccel: 4,
		SpeedMax: 350, ClimbMax: 30, LostAfter: time.Minute, WatchRange: 100e3, DetectionRange: 60e3,
	}
	for _, id := range []closures.Source{"rx-1", "rx-2"} {
		r.Sources = append(r.Sources, closures.SourceRules{
			ID: id, Kind: closures.AircraftSource, StaleAfter: 10 * time.Second, Latency: time.Second, WarmUp: time.Second, MinMessagesPerMin: 5,
			PositionError: 200, VerticalError: 100, VelocityError: 10, VerticalVelocityErr: 5,
		})
	}
	return r
}

// nights are prepared once: they depend on the site alone.
var nights = func() func(*closures.Rules, time.Time) (*sky.Night, error) {
	var mu sync.Mutex
	made := map[int64]*sky.Night{}
	return func(r *closures.Rules, at time.Time) (*sky.Night, error) {
		mu.Lock()
		defer mu.Unlock()
		key := sky.Bin(at).From.Unix()
		if n := made[key]; n != nil {
			return n, nil
		}
		n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
		made[key] = n
		return n, err
	}
}()

// list covers two days about evening with an open sky but for its windows.
func list(t testing.TB, id closures.ListID, windows ...closures.Window) *closures.List {
	t.Helper()
	regions := []closures.Region{{ID: "dome", Shape: closures.WholeSky, Throughout: closures.ThroughoutOpen}}
	if len(windows) > 0 {
		regions[0].Throughout = closures.NotThroughout
	}
	l, err := closures.Index(&closures.ListText{
		ID: id, Authority: "orbital-desk", Issued: evening.Add(-24 * time.Hour),
		Covers:  span.Span{From: evening.Add(-24 * time.Hour), Until: evening.Add(24 * time.Hour)},
		Regions: regions, Windows: windows, Digest: closures.Digest{byte(len(id)), byte(len(windows)), id[len(id)-1]},
	})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// handClock stands still until it is moved. Nothing fires by itself.
type handClock struct {
	mu     sync.Mutex
	wall   time.Time
	boot   time.Duration
	report ClockReport
}

func newHandClock() *handClock {
	return &handClock{wall: evening, boot: time.Hour, report: ClockReport{Synchronised: true, MaxErrorSaid: true, MaxError: 10 * time.Millisecond}}
}

func (c *handClock) Read() (time.Time, time.Duration) {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.wall, c.boot
}

func (c *handClock) AfterFunc(time.Duration, func()) func() bool { return func() bool { return true } }

func (c *handClock) advance(d time.Duration) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.wall, c.boot = c.wall.Add(d), c.boot+d
}

func (c *handClock) health() ClockReport {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.report
}

// slate is a record in memory. Unless it is held, an entry is durable as soon
// as it is queued.
type slate struct {
	mu      sync.Mutex
	entries []Entry
	held    bool // nothing becomes durable
	refuse  error
	c       Condition
	news    map[chan<- struct{}]bool
	forget  bool // keep nothing
	appends int
}

var errFull = errors.New("the queue is full")

func (s *slate) Append(entries []Entry) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.appends++
	if s.refuse != nil {
		s.c.Gap = true
		return s.refuse
	}
	if !s.forget {
		s.entries = append(s.entries, entries...)
	}
	if !s.held {
		s.c.Durable = entries[len(entries)-1].Seq
		s.changed()
	}
	return nil
}

func (s *slate) Condition() Condition {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.c
}

func (s *slate) Notify(c chan<- struct{}) func() {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.news == nil {
		s.news = map[chan<- struct{}]bool{}
	}
	s.news[c] = true
	return func() {
		s.mu.Lock()
		defer s.mu.Unlock()
		delete(s.news, c)
	}
}

func (s *slate) Flush(context.Context) error { s.settle(); return nil }

// settle makes everything queued durable.
func (s *slate) settle() {
	s.mu.Lock()
	defer s.mu.Unlock()
	if n := len(s.entries); n > 0 {
		s.c.Durable = s.entries[n-1].Seq
	}
	s.changed()
}

func (s *slate) set(f func(*slate)) {
	s.mu.Lock()
	defer s.mu.Unlock()
	f(s)
	s.changed()
}

func (s *slate) changed() {
	for c := range s.news {
		poke2(c)
	}
}

func poke2(c chan<- struct{}) {
	select {
	case c <- struct{}{}:
	default:
	}
}

// what returns the recorded entries of one content.
func what[T What](s *slate) []T {
	s.mu.Lock()
	defer s.mu.Unlock()
	var out []T
	for _, e := range s.entries {
		if w, ok := e.What.(T); ok {
			out = append(out, w)
		}
	}
	return out
}

// site drives an engine by hand and keeps everything clear that a test does
// not make otherwise.
type site struct {
	t     testing.TB
	e     *Engine
	s     *Stepper
	clock *handClock
	rec   *slate
	rules *closures.Rules
	local r3.Vector                // where the beam points: X east, Y north, Z up
	dir   r3.Vector                // the same in ICRS
	quiet func(closures.Body) bool // facts that are left out
}

func newSite(t testing.TB, r *closures.Rules, change ...func(*Options)) *site {
	t.Helper()
	w := &site{t: t, clock: newHandClock(), rec: &slate{}, rules: r}
	n, err := nights(r, evening)
	if err != nil {
		t.Fatal(err)
	}
	w.local = geometry.FromHorizon(150*s1.Degree, 65*s1.Degree)
	w.dir = n.ICRS(w.local, evening)
	opt := Options{
		Clock: w.clock, Health: w.clock.health, Record: w.rec, Rules: r, Boot: closures.Boot{ID: "boot", At: evening},
		Prepare: nights, Report: func(err error) { t.Log(strings.SplitN(err.Error(), "\n", 2)[0]) },
	}
	for _, f := range change {
		f(&opt)
	}
	if w.e, err = New(opt); err != nil {
		t.Fatal(err)
	}
	if w.s, err = w.e.Stepper(); err != nil {
		t.Fatal(err)
	}
	return w
}

// steady is what a quiet site says all the time.
func (w *site) steady() {
	w.t.Helper()
	at, _ := w.clock.Read()
	for i := range w.rules.Beams {
		w.offer(closures.AimSeen{Beam: w.rules.Beams[i].ID, Said: at, From: "encoder",
			Aim: &closures.Aim{Frame: closures.ICRS, Direction: w.dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}})
	}
	for i := range w.rules.Sources {
		src := &w.rules.Sources[i]
		switch src.Kind {
		case closures.InterlockSource:
			w.offer(closures.InterlockSeen{Source: src.ID, Said: at, Safe: true})
		default:
			w.offer(closures.Heard{Source: src.ID, Said: at, Scope: closures.HeardReception, MessagesPerMinute: 1000})
		}
	}
}

func (w *site) offer(b closures.Body) {
	w.t.Helper()
	if w.quiet != nil && w.quiet(b) {
		return
	}
	if _, err := w.e.Offer("feed", b); err != nil {
		w.t.Fatalf("offering %T: %v", b, err)
	}
}

// step moves time on, says what is steady and b, and makes a turn.
func (w *site) step(d time.Duration, b ...closures.Body) BeamView {
	w.t.Helper()
	w.clock.advance(d)
	w.steady()
	for _, body := range b {
		w.offer(body)
	}
	v, err := w.s.Turn()
	if err != nil {
		w.t.Fatal(err)
	}
	return v.Beams[0]
}

// run steps for a while at the decision interval.
func (w *site) run(d time.Duration) (last BeamView) {
	w.t.Helper()
	for t := time.Duration(0); t < d; t += w.rules.Permit.DecisionInterval {
		last = w.step(w.rules.Permit.DecisionInterval)
	}
	return last
}

// opened brings an open list and runs until the beam is open.
func (w *site) opened() *site {
	w.t.Helper()
	w.step(0, closures.ListOffered{List: list(w.t, "2031-045-A"), By: "test"})
	if b := w.run(w.rules.Beams[0].ReopenAfter + time.Second); !b.Decision.Open {
		w.t.Fatalf("not open: %v", reasons(b.Decision))
	}
	return w
}

func reasons(d *closures.Decision) (out []string) {
	for _, f := range d.Reasons {
		out = append(out, f.Code.String()+"/"+f.Verdict.String()+" "+string(f.Source)+": "+f.Detail)
	}
	return out
}
