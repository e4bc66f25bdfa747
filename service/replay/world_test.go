package replay_test

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/sky"
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
	given  map[closures.Digest]*closures.List
	holds  []closures.HoldID
	dir0   r3.Vector // ICRS, where beams point when all is well
	tracks map[string]*flight
}

// flight is one aircraft, metres east, north and up of the site.
type flight struct {
	at, v r3.Vector
	from  closures.Source
}

func newWorld(t testing.TB, seed uint64, text []byte) *world {
	t.Helper()
	w := &world{t: t, dir: t.TempDir(), rng: rand.New(rand.NewPCG(seed, 1)), clock: clock.NewVirtual(evening), cfg: parsed(t, text), tracks: map[string]*flight{}, given: map[closures.Digest]*closures.List{}}
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

func (w *world) flush() { _ = w.j.Flush(context.Background()) }

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
