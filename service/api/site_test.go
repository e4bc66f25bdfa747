package api

import (
	"bytes"
	"context"
	"encoding/json"
	"io"
	"math"
	"net"
	"net/http"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"go.uber.org/goleak"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/service/access"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// evening is an instant of an invented night at the invented Skerry Peak.
var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

func siteRules() *closures.Rules {
	r := &closures.Rules{
		Site: closures.SiteRules{
			Name: "Skerry Peak", TimeZone: "Atlantic/St_Helena",
			Position: earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}, Geoid: 18,
			UT1: sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true},
		},
		Permit:   closures.PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond},
		Clock:    closures.ClockRules{Synchronised: closures.SyncRequired, StepLimit: 100 * time.Millisecond},
		ByItself: closures.AllCodes.Without(closures.CodeInterlock),
		Authorities: []closures.AuthorityRules{
			{ID: "orbital-desk", Required: true, Integrity: closures.IntegrityNone, Lead: 5 * time.Second, Tail: 5 * time.Second, Loosening: closures.LooseningSecondPerson},
			{ID: "quick-desk", Integrity: closures.IntegrityNone, Lead: 5 * time.Second, Loosening: closures.LooseningAtOnce},
			{ID: "one-desk", Integrity: closures.IntegrityNone, Loosening: closures.LooseningConfirm},
		},
		Sources: []closures.SourceRules{
			{ID: "catwalk", Kind: closures.InterlockSource, StaleAfter: 5 * time.Second, Required: true},
			{ID: "rx-1", Kind: closures.AircraftSource, StaleAfter: 10 * time.Second, Latency: time.Second, WarmUp: time.Second, PositionError: 200, VerticalError: 100, VelocityError: 10, VerticalVelocityErr: 5},
			{ID: "spotter-east", Kind: closures.SightingSource, StaleAfter: 15 * time.Minute},
		},
		Neighbours: []closures.NeighbourRules{{ID: "ridge-2", Offset: r3.Vector{X: 140, Y: -60, Z: 3}, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Minute, ForgetAfter: 10 * time.Minute, IgnoreSilent: true}},
		Aircraft: closures.AircraftRules{
			Configured: true, KeepOutHalfAngle: 2 * s1.Degree, KeepOutRadius: 300, KeepOutCeiling: 20e3, HorizontalAccel: 22, VerticalAccel: 4,
			SpeedMax: 350, ClimbMax: 30, LostAfter: time.Minute, WatchRange: 100e3, DetectionRange: 60e3,
		},
	}
	for _, id := range []closures.BeamID{"north", "south"} {
		r.Beams = append(r.Beams, closures.BeamRules{
			ID: id, Launches: []closures.Launch{{ID: "axis", Offset: r3.Vector{Z: 12}}}, AimOfTelescope: true,
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.3, FocusHeight: 92000, Asterism: 20 * geometry.Arcsecond,
			Limits:      closures.Limits{ElevationMin: 30 * s1.Degree, ElevationMax: 89 * s1.Degree, SunBelow: -12 * s1.Degree},
			Aim:         closures.AimRules{StaleAfter: 3 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: 0.1 * s1.Degree},
			ShutterTime: 500 * time.Millisecond, FeedbackStale: 5 * time.Second, ReopenAfter: time.Second,
		})
	}
	r.Digest[0] = 1
	return r
}

// nights are prepared once for all tests.
var nights = sync.OnceValue(func() []*sky.Night {
	r := siteRules()
	var out []*sky.Night
	for _, at := range []time.Time{evening.Add(-12 * time.Hour), evening, evening.Add(12 * time.Hour)} {
		n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
		if err != nil {
			panic(err)
		}
		out = append(out, n)
	}
	return out
})

// stage is an engine that applies each fact at once to a true core, on a clock
// that its test moves.
type stage struct {
	mu       sync.Mutex
	state    *closures.State
	seq      uint64
	wall     time.Time
	boot     time.Duration
	view     *View
	watchers map[chan Update]bool
	durable  uint64
	record   Condition
	stopped  bool
	offers   error         // what Offer answers
	submits  error         // what SubmitDurable answers
	hang     chan struct{} // SubmitDurable waits for it
	offered  []closures.Body
	keep     bool // offered facts
}

func newStage(t testing.TB) *stage {
	t.Helper()
	s := &stage{wall: evening, boot: time.Hour, watchers: map[chan Update]bool{}}
	var err error
	if s.state, err = closures.New(siteRules(), closures.Boot{ID: "boot-1", At: evening}, closures.Durable{}); err != nil {
		t.Fatal(err)
	}
	s.apply(closures.Started{})
	for _, n := range nights() {
		s.apply(closures.NightReady{Night: n})
	}
	return s
}

func (s *stage) Read() (time.Time, time.Duration) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.wall, s.boot
}

// advance moves the clock alone.
func (s *stage) advance(d time.Duration) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.wall, s.boot = s.wall.Add(d), s.boot+d
}

func (s *stage) View() *View {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.view
}

func (s *stage) Offer(from closures.Source, body closures.Body) (bool, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.offers != nil {
		return false, s.offers
	}
	if s.keep {
		s.offered = append(s.offered, body)
	}
	return len(s.offered)%2 == 0 && s.keep, nil
}

func (s *stage) SubmitDurable(ctx context.Context, from closures.Source, body closures.Body) error {
	s.mu.Lock()
	hang, fails := s.hang, s.submits
	s.mu.Unlock()
	if hang != nil {
		select {
		case <-hang:
		case <-ctx.Done():
			return ctx.Err()
		}
	}
	if fails != nil {
		return fails
	}
	return s.apply(body)
}

// apply gives one fact to the core and publishes what follows.
func (s *stage) apply(body closures.Body) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.seq++
	facts := []closures.Fact{
		{Seq: s.seq, At: s.wall, Body: body},
		{Seq: s.seq + 1, At: s.wall, Body: closures.ClockState{Synchronised: true, MaxError: time.Millisecond}},
		{Seq: s.seq + 2, At: s.wall, Body: closures.RecordState{Durable: s.seq}},
	}
	s.seq += 2
	decisions := s.state.Step(facts, s.wall, nil)
	var refused error
	for _, r := range s.state.Refused() {
		if r.Seq == facts[0].Seq {
			refused = r.Err
		}
	}
	s.publish(decisions)
	return refused
}

func (s *stage) publish(decisions []closures.Decision) {
	old := s.view
	_, version := s.state.Durable()
	v := &View{
		At: s.wall, Boot: s.boot, BootID: "boot-1", Seq: s.seq, Rules: s.state.Rules(), Foreseen: s.state.Foreseen(), Book: s.state.Book(), Holds: s.state.Holds(),
		Nights: s.state.Nights(), Known: s.state.Known(s.wall), Started: true, Stopped: s.stopped, Record: s.record,
	}
	u := Update{View: v, Kept: version != s.durable}
	s.durable = version
	for i := range decisions {
		d := decisions[i]
		b := BeamView{Decision: &d, Since: s.wall}
		if old != nil {
			if was := old.Beam(d.Beam); was != nil {
				if was.Decision.Open == d.Open {
					b.Since = was.Since
				}
				if was.Decision.Open != d.Open || was.Decision.Codes != d.Codes {
					u.Beams = append(u.Beams, d.Beam)
				}
			}
		}
		v.Beams = append(v.Beams, b)
	}
	s.view = v
	for c := range s.watchers {
		select {
		case c <- u:
		default:
			delete(s.watchers, c)
			close(c)
		}
	}
}

// set changes the stage and publishes anew.
func (s *stage) set(f func(*stage)) {
	s.mu.Lock()
	f(s)
	s.mu.Unlock()
	_ = s.apply(closures.Tick{})
}

func (s *stage) Watch(buffer int) (func(context.Context) (Update, bool), func()) {
	s.mu.Lock()
	defer s.mu.Unlock()
	c := make(chan Update, buffer)
	c <- Update{View: s.view, Kept: true}
	s.watchers[c] = true
	return func(ctx context.Context) (Update, bool) {
			select {
			case u, more := <-c:
				return u, more
			case <-ctx.Done():
				return Update{}, false
			}
		}, func() {
			s.mu.Lock()
			defer s.mu.Unlock()
			delete(s.watchers, c)
		}
}

// opened makes everything clear until the beam opens.
func (s *stage) opened(t testing.TB) {
	t.Helper()
	if err := s.apply(closures.ListOffered{List: openList(t, "orbital-desk", "2031-045-A"), By: "ann"}); err != nil {
		t.Fatal(err)
	}
	e := s.View().Book.Find("orbital-desk", "2031-045-A")
	if err := s.apply(closures.ListConfirmed{Authority: "orbital-desk", ID: "2031-045-A", Digest: e.List.Digest(), By: "ben"}); err != nil {
		t.Fatal(err)
	}
	s.steady(t, 30)
	_ = s.apply(closures.Rearmed{Beam: closures.EveryBeam, By: "ann"})
	s.steady(t, 20)
	if d := s.View().Beam("north").Decision; !d.Open {
		t.Fatalf("the beam does not open: %v", d.Codes.Names())
	}
}

// steady says for n tenths of a second what is said all the time.
func (s *stage) steady(t testing.TB, n int) {
	t.Helper()
	night := nights()[1]
	dir := night.ICRS(geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), evening)
	for range n {
		s.advance(100 * time.Millisecond)
		at, _ := s.Read()
		for _, b := range []closures.BeamID{"north", "south"} {
			_ = s.apply(closures.AimSeen{Beam: b, Said: at, From: "encoder", Target: "f-101", Aim: &closures.Aim{Frame: closures.ICRS, Direction: dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}})
		}
		_ = s.apply(closures.InterlockSeen{Source: "catwalk", Said: at, Safe: true})
	}
}

// site is an API on a stage, with people of every role.
type site struct {
	t      testing.TB
	stage  *stage
	api    *API
	url    string
	tokens map[string]string
	client *http.Client
	file   access.TokenFile
}

// people of a site with tokens, and their roles.
var people = map[string]access.Role{"ann": access.Operate, "ben": access.Operate, "eve": access.Read, "adm": access.Admin, "rx": access.Feed}

func newSite(t testing.TB, change ...func(*Options)) *site {
	t.Helper()
	s := &site{t: t, stage: newStage(t), tokens: map[string]string{}}
	file := filepath.Join(t.TempDir(), "tokens")
	for name, role := range people {
		var sources []closures.Source
		if role == access.Feed {
			sources = []closures.Source{"rx-1", "catwalk", "north"}
		}
		secret, err := access.TokenFile(file).Add(name, role, sources, evening)
		if err != nil {
			t.Fatal(err)
		}
		s.tokens[name] = secret.Reveal()
	}
	s.file = access.TokenFile(file)
	s.start(access.Options{TokensFile: file}, change...)
	return s
}

// newLocal is a site without tokens.
func newLocal(t testing.TB, change ...func(*Options)) *site {
	t.Helper()
	s := &site{t: t, stage: newStage(t), tokens: map[string]string{}}
	s.start(access.Options{}, change...)
	return s
}

func (s *site) start(guard access.Options, change ...func(*Options)) {
	s.t.Helper()
	g, err := access.New(guard)
	if err != nil {
		s.t.Fatal(err)
	}
	o := Options{Engine: s.stage, Clock: s.stage, Guard: g, Permits: fakePermits{}, Version: "test", Report: func(err error) { s.t.Error("reported:", err) }}
	for _, f := range change {
		f(&o)
	}
	if s.api, err = New(o); err != nil {
		s.t.Fatal(err)
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		s.t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	server := NewServer(s.api, o.Limits)
	var wait sync.WaitGroup
	wait.Go(func() { _ = s.api.Run(ctx) })
	wait.Go(func() { _ = server.Serve(l) })
	s.url = "http://" + l.Addr().String()
	transport := &http.Transport{}
	s.client = &http.Client{Transport: transport}
	s.t.Cleanup(func() {
		cancel()
		transport.CloseIdleConnections()
		_ = server.Close()
		wait.Wait()
	})
}

type fakePermits struct{}

func (fakePermits) Permit(beam closures.BeamID, nonce string) ([]byte, error) {
	return []byte(`{"beam":"` + string(beam) + `","nonce":"` + nonce + `"}`), nil
}

func (fakePermits) Key() []byte { return []byte(`{"kty":"OKP"}`) }

// answer is a response, read whole.
type answer struct {
	status int
	header http.Header
	body   []byte
}

func (a answer) into(t testing.TB, v any) {
	t.Helper()
	if err := json.Unmarshal(a.body, v); err != nil {
		t.Fatalf("%d %s: %v", a.status, a.body, err)
	}
}

// do sends one request as somebody; headers are "Name: value".
func (s *site) do(who, method, path, body string, headers ...string) answer {
	s.t.Helper()
	var in io.Reader
	if body != "" {
		in = strings.NewReader(body)
	}
	r, err := http.NewRequest(method, s.url+path, in)
	if err != nil {
		s.t.Fatal(err)
	}
	if body != "" {
		r.Header.Set("Content-Type", "application/json")
	}
	if who != "" {
		r.Header.Set("Authorization", "Bearer "+s.tokens[who])
	}
	for _, h := range headers {
		name, value, _ := strings.Cut(h, ": ")
		r.Header.Del(name)
		if value != "-" {
			r.Header.Set(name, value)
		}
	}
	return s.send(r)
}

func (s *site) request(method, path string) *http.Request {
	s.t.Helper()
	r, err := http.NewRequest(method, s.url+path, nil)
	if err != nil {
		s.t.Fatal(err)
	}
	return r
}

func (s *site) send(r *http.Request) answer {
	s.t.Helper()
	out, err := s.client.Do(r)
	if err != nil {
		s.t.Fatal(err)
	}
	defer out.Body.Close()
	data, err := io.ReadAll(out.Body)
	if err != nil {
		s.t.Fatal(err)
	}
	return answer{out.StatusCode, out.Header, data}
}

// want is do that expects a status.
func (s *site) want(status int, who, method, path, body string, headers ...string) answer {
	s.t.Helper()
	a := s.do(who, method, path, body, headers...)
	if a.status != status {
		s.t.Fatalf("%s %s as %q: %d, want %d: %s", method, path, who, a.status, status, bytes.TrimSpace(a.body))
	}
	return a
}

func nanValue() float64 { return math.NaN() }
