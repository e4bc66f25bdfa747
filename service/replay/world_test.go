package replay_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/replay"
)

// evening is an instant of an invented night at the invented Skerry Peak.
var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

const thisBuild = "beamward test"

// siteText is the full site with times so short that beams open often.
func siteText(t testing.TB, more ...string) []byte {
	t.Helper()
	b, err := os.ReadFile("../../testdata/site/full.yaml")
	if err != nil {
		t.Fatal(err)
	}
	pairs := append([]string{
		"warm_up: 30s", "warm_up: 1s", "warm_up: 1m", "warm_up: 2s", "reopen_after: 5s", "reopen_after: 500ms", "reopen_after: 10s", "reopen_after: 800ms",
		"rearm: {by_itself: [listed-closure,", "rearm: {by_itself: [starting, interlock, clock, record, watch-missing, shutter-fault, listed-closure,",
		"id: rx-3, kind: aircraft, stale_after: 10s", "id: rx-3, kind: aircraft, stale_after: 10s, warm_up: 1s", "integrity: count", "integrity: none",
	}, more...)
	for i := 0; i < len(pairs); i += 2 {
		if !strings.Contains(string(b), pairs[i]) {
			t.Fatalf("the site's text does not hold %q", pairs[i])
		}
	}
	return []byte(strings.NewReplacer(pairs...).Replace(string(b)))
}

func parsed(t testing.TB, text []byte) *config.Config {
	t.Helper()
	c, err := config.Parse(text, "/")
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// world is the real engine on a real record under a virtual clock.
type world struct {
	t      testing.TB
	dir    string
	rng    *rand.Rand
	clock  *clock.Virtual
	cfg    *config.Config
	j      *journal.Journal
	e      *engine.Engine
	s      *engine.Stepper
	small  bool // the record's queue holds little
	broken bool // the store fails
	starts int
	n      int // of names
	lists  []*closures.List
	holds  []closures.HoldID
	dir0   r3.Vector // ICRS, where beams point when all is well
	tracks map[string]*flight
	bare   bool // the record keeps nothing durable: Flush is left out
}

// flight is one aircraft, metres east, north and up of the site.
type flight struct {
	at, v r3.Vector
	from  closures.Source
}

func newWorld(t testing.TB, seed uint64, text []byte) *world {
	t.Helper()
	w := &world{t: t, dir: t.TempDir(), rng: rand.New(rand.NewPCG(seed, 1)), clock: clock.NewVirtual(evening), cfg: parsed(t, text), tracks: map[string]*flight{}}
	if err := os.Chmod(w.dir, 0o700); err != nil {
		t.Fatal(err)
	}
	n, err := sky.Prepare(w.cfg.Rules.Site.Position, evening, w.cfg.Rules.Site.UT1)
	if err != nil {
		t.Fatal(err)
	}
	w.dir0 = n.ICRS(geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), evening)
	w.start()
	t.Cleanup(func() {
		if w.j != nil {
			_ = w.j.Close()
		}
	})
	return w
}

func (w *world) must(err error) {
	w.t.Helper()
	if err != nil {
		w.t.Fatal(err)
	}
}

var errStore = errors.New("the store fails")

// start opens the record and makes the engine from it, as the service does.
func (w *world) start() {
	w.t.Helper()
	opt := journal.Options{Dir: w.dir, Clock: w.clock, Fault: func(op string) error {
		if w.broken && op != "open" && op != "read" {
			return errStore
		}
		return nil
	}}
	if w.small {
		opt.Capacity = 48 << 10
	}
	var err error
	w.j, err = journal.Open(opt)
	w.must(err)
	w.must(w.j.PutList(w.cfg.Rules.Digest.String(), w.cfg.Canonical()))
	durable, after := w.recall()
	w.starts++
	w.e, err = engine.New(engine.Options{
		Clock: w.clock, Health: w.health, Reanchor: func() { w.clock.Reanchor() }, Record: &record{w.j}, Rules: w.cfg.Rules,
		Boot: closures.Boot{ID: fmt.Sprintf("boot-%d", w.starts), At: w.clock.Wall()}, Durable: durable, After: after, Build: thisBuild,
	})
	w.must(err)
	w.s, err = w.e.Stepper()
	w.must(err)
}

func (w *world) health() engine.ClockReport {
	k := w.clock.State()
	return engine.ClockReport{Step: k.Step, Suspended: k.Suspended != 0, Synchronised: k.Known && k.Synchronised, MaxErrorSaid: k.Known, MaxError: k.MaxError, Fault: k.Fault}
}

// recall reads what must outlive a restart.
func (w *world) recall() (closures.Durable, uint64) {
	w.t.Helper()
	ctx := context.Background()
	last, any, err := w.j.Last(ctx)
	w.must(err)
	if !any {
		return closures.Durable{}, 0
	}
	texts := textsOf(w.j.Reader)
	resolve := wire.Resolver{Rules: texts.Rules, List: texts.List}
	var d closures.Durable
	kept, any, err := w.j.LastOf(ctx, journal.KindDurable)
	w.must(err)
	if any {
		d, err = wire.DecodeDurable(kept.Body, resolve)
		w.must(err)
	}
	var tail []engine.Entry
	w.must(w.j.Read(ctx, journal.Query{From: kept.Seq + 1}, func(e journal.Entry) error {
		one := engine.Entry{Seq: e.Seq, At: e.At}
		switch e.Kind {
		case replay.KindBegun, replay.KindGranted, replay.KindTallied, replay.KindEnded, journal.KindGap, journal.KindDurable, wire.KindRules, wire.KindNight:
			return nil
		case wire.KindDecision:
			d, err := wire.DecodeDecision(e.Body)
			w.must(err)
			one.What = engine.Decided{Decision: d}
		default:
			f, err := wire.DecodeBody(e.Kind, e.Body, resolve)
			w.must(err)
			f.Seq, f.At = e.Seq, e.At
			one.What = engine.Admitted{Fact: f}
		}
		tail = append(tail, one)
		return nil
	}))
	d, err = engine.Restore(w.cfg.Rules, d, tail)
	w.must(err)
	return d, last.Seq
}

// textsOf finds rules and lists where the service puts them.
func textsOf(r *journal.Reader) replay.Texts {
	text := func(d closures.Digest) ([]byte, error) { return r.List(context.Background(), d.String()) }
	return replay.Texts{
		Rules: func(d closures.Digest) (*closures.Rules, error) {
			b, err := text(d)
			if err != nil {
				return nil, err
			}
			c, err := config.Parse(b, "/")
			if err != nil {
				return nil, err
			}
			return c.Rules, nil
		},
		List: func(d closures.Digest) (*closures.List, error) {
			b, err := text(d)
			if err != nil {
				return nil, err
			}
			l, _, err := listfile.Load(bytes.NewReader(b), listfile.JSON, listfile.Limits{})
			return l, err
		},
	}
}

// record puts the engine's entries into the journal, in the service's forms.
type record struct{ *journal.Journal }

func (r *record) Append(entries []engine.Entry) error {
	out := make([]journal.Entry, len(entries))
	for i := range entries {
		var err error
		if out[i], err = encoded(&entries[i]); err != nil {
			return err
		}
	}
	return r.Journal.Append(out)
}

func encoded(e *engine.Entry) (journal.Entry, error) {
	out := journal.Entry{Seq: e.Seq, At: e.At, Urgent: e.Urgent}
	var err error
	switch w := e.What.(type) {
	case engine.Admitted:
		out.Kind, out.Body, err = wire.EncodeBody(nil, w.Fact)
	case engine.Decided:
		out.Kind = wire.KindDecision
		out.Body, err = wire.EncodeDecision(nil, &w.Decision)
	case engine.Kept:
		out.Kind = journal.KindDurable
		out.Body, err = wire.EncodeDurable(nil, &w.Durable)
	case engine.Begun:
		out.Kind = replay.KindBegun
		out.Body, err = json.Marshal(map[string]any{"boot_id": w.Boot.ID, "at": wire.FormatTime(w.Boot.At), "build": w.Build, "rules": w.Rules.Digest.String(), "cause": w.Cause})
	case engine.Granted:
		out.Kind = replay.KindGranted
		out.Body, err = json.Marshal(map[string]any{"beam": w.Beam, "opening": w.Opening, "seq": w.Seq})
	case engine.Tallied:
		out.Kind = replay.KindTallied
		out.Body, err = json.Marshal(map[string]any{"from": w.From, "to": w.To, "count": w.Count, "sum": w.Sum.String()})
	case engine.Ended:
		out.Kind, out.Body = replay.KindEnded, []byte("{}")
	}
	return out, err
}

func (r *record) Condition() engine.Condition {
	s := r.State()
	return engine.Condition{Durable: s.Durable, Behind: s.Behind, Half: s.Half, Full: s.Full, Gap: s.Gap, Failed: s.Err != nil, Damaged: s.Damage != nil}
}

func (r *record) Flush(ctx context.Context) error { return r.Journal.Flush(ctx) }

// stop ends in good order.
func (w *world) stop() {
	w.t.Helper()
	w.must(w.s.Close())
	w.must(w.j.Close())
	w.j = nil
}

// kill ends at once; what was not on disk is lost.
func (w *world) kill() {
	w.broken = true
	_ = w.j.Close()
	w.broken = false
}

func (w *world) flush() {
	if !w.bare {
		_ = w.j.Flush(context.Background())
	}
}

func (w *world) name(kind string) string {
	w.n++
	return fmt.Sprintf("%s-%d", kind, w.n)
}

func (w *world) offer(b closures.Body) {
	_, err := w.e.Offer("feed", b)
	var e *closures.Error
	if err != nil && !errors.As(err, &e) {
		w.t.Fatalf("offering %T: %v", b, err)
	}
}

// turn moves time on and makes a turn.
func (w *world) turn(d time.Duration) *engine.View {
	w.t.Helper()
	w.clock.Advance(d)
	v, err := w.s.Turn()
	w.must(err)
	return v
}

// steady is what a quiet site says all the time, but for what leave holds back.
func (w *world) steady(leave func(closures.Body) bool) {
	at := w.clock.Wall()
	say := func(b closures.Body) {
		if leave == nil || !leave(b) {
			w.offer(b)
		}
	}
	r := w.cfg.Rules
	for i := range r.Beams {
		say(closures.AimSeen{Beam: r.Beams[i].ID, Said: at, From: "encoder", Target: "f-101", Aim: w.aim(w.dir0, at)})
		say(closures.ShutterSeen{Beam: r.Beams[i].ID, Said: at, Position: w.shutter(r.Beams[i].ID)})
	}
	for i := range r.Sources {
		switch s := &r.Sources[i]; s.Kind {
		case closures.InterlockSource:
			say(closures.InterlockSeen{Source: s.ID, Said: at, Safe: true})
		case closures.DetectorSource:
			say(closures.DetectorSeen{Source: s.ID, Said: at, State: closures.DetectorClear})
		case closures.AircraftSource:
			say(closures.Heard{Source: s.ID, Said: at, Scope: closures.HeardReception, MessagesPerMinute: 120})
		}
	}
	for i := range r.Neighbours {
		say(closures.AimSeen{Telescope: r.Neighbours[i].ID, Said: at, From: "pointing", Exposing: closures.Yes,
			Aim: &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(320*s1.Degree, 50*s1.Degree), Reference: at, Error: geometry.Arcsecond, Motion: closures.Fixed}})
	}
	for i := range r.Watches {
		say(closures.WatchKept{Post: r.Watches[i].Post, Said: at, By: []string{"ana", "ben"}, Until: at.Add(time.Hour)})
	}
}

func (w *world) shutter(id closures.BeamID) closures.ShutterPosition {
	if b := w.e.View().Beam(id); b != nil && b.Decision.Open {
		return closures.ShutterOpen
	}
	return closures.ShutterClosed
}

func (w *world) aim(dir r3.Vector, at time.Time) *closures.Aim {
	return &closures.Aim{Frame: closures.ICRS, Direction: dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
}

// give brings a list and its text, as the service does.
func (w *world) give(l *closures.List, by string) {
	w.t.Helper()
	var text bytes.Buffer
	w.must(listfile.Canonical(&text, l.Text()))
	w.must(w.j.PutList(l.Digest().String(), text.Bytes()))
	_, err := w.s.Submit(closures.Source(by), closures.ListOffered{List: l, By: by})
	w.tolerate(err)
}

// tolerate lets the core's refusals pass.
func (w *world) tolerate(err error) {
	w.t.Helper()
	var e *closures.Error
	if err != nil && !errors.As(err, &e) {
		w.t.Fatal(err)
	}
}

// list makes a list that covers two days about the evening.
func (w *world) list(authority closures.AuthorityID, open bool, replaces []closures.ListID, windows ...[2]time.Time) *closures.List {
	w.t.Helper()
	at := w.clock.Wall().Truncate(time.Millisecond)
	text := &closures.ListText{
		ID: closures.ListID(w.name("list")), Authority: authority, Issued: at, Replaces: replaces, UnlistedOpen: open,
		Covers: span.Span{From: at.Add(-12 * time.Hour), Until: at.Add(36 * time.Hour)},
	}
	text.Regions = append(text.Regions, closures.Region{ID: "field", Shape: closures.ICRSCone, Direction: near(w.dir0, 0.1), Radius: 1 * s1.Degree})
	if len(windows) == 0 {
		text.Regions[0].Throughout = closures.ThroughoutOpen
	}
	for _, span := range windows {
		text.Windows = append(text.Windows, closures.Window{From: span[0].UnixNano(), Until: span[1].UnixNano(), Ref: "A-17"})
	}
	var b bytes.Buffer
	w.must(listfile.WriteJSON(&b, text))
	l, _, err := listfile.Load(&b, listfile.JSON, listfile.Limits{})
	w.must(err)
	return l
}

// near turns a direction by some degrees.
func near(v r3.Vector, deg float64) r3.Vector {
	east := r3.Vector{Z: 1}.Cross(v).Normalize()
	a := deg * math.Pi / 180
	return v.Mul(math.Cos(a)).Add(east.Mul(math.Sin(a))).Normalize()
}

// fly moves the aircraft and reports them.
func (w *world) fly(d time.Duration) {
	frame := earth.FrameAt(w.cfg.Rules.Site.Position)
	at := w.clock.Wall()
	for id, f := range w.tracks {
		f.at = f.at.Add(f.v.Mul(d.Seconds()))
		if f.at.Norm() > 150e3 {
			delete(w.tracks, id)
			continue
		}
		if w.rng.IntN(10) > 0 {
			continue
		}
		p := earth.FromECEF(frame.ECEF(f.at))
		track := math.Atan2(f.v.X, f.v.Y)
		seen := closures.AircraftSeen{
			Source: f.from, Said: at.Add(-time.Duration(w.rng.IntN(400)) * time.Millisecond), Aircraft: id, Located: true, Position: p,
			AltitudeFrom: closures.AltitudeFrom(1 + w.rng.IntN(3)), Speed: geometry.Speed(math.Hypot(f.v.X, f.v.Y)), Track: s1.Angle(track), Climb: geometry.Speed(f.v.Z),
			Error: geometry.Length(math.NaN()), VerticalError: geometry.Length(math.NaN()), VelocityError: geometry.Speed(math.NaN()), VerticalVelError: geometry.Speed(math.NaN()),
			OnGround: w.rng.IntN(60) == 0, Drill: w.rng.IntN(60) == 0,
		}
		if w.rng.IntN(8) == 0 {
			seen.Speed, seen.Track = geometry.Speed(math.NaN()), s1.Angle(math.NaN())
		}
		if w.rng.IntN(20) == 0 { // it contradicts itself
			seen.Position.Lat += s1.Angle(0.02 * w.rng.Float64())
		}
		w.offer(seen)
	}
}
