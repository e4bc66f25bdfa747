package engine

import (
	"errors"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

func hold(id closures.HoldID) closures.HoldPlaced {
	return closures.HoldPlaced{ID: id, Beam: closures.EveryBeam, Reason: "check of the optics", By: "ana", Placed: evening}
}

func unsafe(at time.Time) closures.InterlockSeen {
	return closures.InterlockSeen{Source: "catwalk", Said: at, Safe: false}
}

func mustShut(t *testing.T, b BeamView, code closures.Code) {
	t.Helper()
	if b.Decision.Open {
		t.Fatal("the beam is open")
	}
	if !b.Decision.Codes.Has(code) {
		t.Fatalf("closed by %v, want %v among them", reasons(b.Decision), code)
	}
}

func TestOpensWhenAllIsClear(t *testing.T) {
	w := newSite(t, siteRules())
	if v := w.e.View(); v.Beams[0].Decision.Open || v.Started {
		t.Fatal("open before the first turn")
	}
	w.opened()
	v := w.e.View()
	if v.BootID != "boot" || !v.Started || v.Seq != v.Beams[0].Decision.Seq || v.At != v.Beams[0].Decision.At || v.Known == nil {
		t.Errorf("view: %+v", v)
	}
	if v.Beam("north") != &v.Beams[0] || v.Beam("south") != nil {
		t.Error("the beam is not found by its name")
	}
}

// Closing does not wait for anything: the view of the turn that takes the fact
// is shuttered. BW-007
func TestClosesInTheSameTurn(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.rec.set(func(s *slate) { s.held = true }) // the store sleeps
	w.clock.advance(time.Millisecond)
	at, _ := w.clock.Read()
	w.offer(unsafe(at))
	v, err := w.s.Turn()
	if err != nil {
		t.Fatal(err)
	}
	mustShut(t, v.Beams[0], closures.CodeInterlock)
	w.step(100 * time.Millisecond)
	r, err := w.s.Submit("console", hold("h-1"))
	if err != nil {
		t.Fatal(err)
	}
	b := w.e.View().Beams[0]
	mustShut(t, b, closures.CodeHold)
	if r.Seq == 0 || r.Seq >= b.Decision.Seq {
		t.Errorf("the hold is entry %d and its decision %d", r.Seq, b.Decision.Seq)
	}
}

// An unsafe word that a safe one follows before the turn is not covered by it.
func TestAMomentsClosureIsSeen(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.clock.advance(time.Millisecond)
	at, _ := w.clock.Read()
	for i := range 3 {
		w.offer(unsafe(at.Add(time.Duration(2*i) * time.Microsecond)))
		w.offer(closures.InterlockSeen{Source: "catwalk", Said: at.Add(time.Duration(2*i+1) * time.Microsecond), Safe: true})
	}
	before := w.e.Stats().Batches
	v, err := w.s.Turn()
	if err != nil {
		t.Fatal(err)
	}
	mustShut(t, v.Beams[0], closures.CodeReopening)
	if v.Beams[0].Decision.Codes.Has(closures.CodeInterlock) {
		t.Error("the last word was safe")
	}
	if n := w.e.Stats().Batches - before; n != 6 {
		t.Errorf("%d steps for six words in turn", n)
	}
}

// BW-006
func TestOpensOnlyWhenTheOpeningIsDurable(t *testing.T) {
	w := newSite(t, siteRules())
	w.step(0, closures.ListOffered{List: list(t, "2031-045-A"), By: "test"})
	w.run(500 * time.Millisecond)
	w.rec.set(func(s *slate) { s.held = true })
	var b BeamView
	for range 8 { // the record would be behind after a second
		b = w.step(100 * time.Millisecond)
		if b.Decision.Open {
			t.Fatal("open before the opening is durable")
		}
		if b.Opening {
			break
		}
	}
	if !b.Opening {
		t.Fatalf("not opening: %v", reasons(b.Decision))
	}
	mustShut(t, b, closures.CodeRecord)
	if n := len(b.Decision.Reasons); n != 1 || b.Decision.Reasons[0].Detail != "the opening is not on record yet" {
		t.Fatalf("reasons: %v", reasons(b.Decision))
	}
	opening := w.e.gates[0].opening
	var urgent bool
	for _, e := range w.rec.entries {
		if e.Seq == opening {
			d, ok := e.What.(Decided)
			urgent = ok && d.Decision.Open && e.Urgent
		}
	}
	if !urgent {
		t.Fatal("the opening's entry is not an urgent open decision")
	}
	// One entry short of it is not enough.
	w.rec.set(func(s *slate) { s.c.Durable = opening - 1 })
	if b = w.step(10 * time.Millisecond); b.Decision.Open {
		t.Fatal("open with the opening one entry from durable")
	}
	w.rec.set(func(s *slate) { s.c.Durable = opening })
	if w.e.View().Beams[0].Decision.Open {
		t.Fatal("open without another decision")
	}
	if b = w.step(10 * time.Millisecond); !b.Decision.Open || b.Opening {
		t.Fatalf("durable and still shut: %v", reasons(b.Decision))
	}
	g := what[Granted](w.rec)
	if len(g) != 1 || g[0].Opening != opening || g[0].Seq != b.Decision.Seq {
		t.Fatalf("granted: %+v, opening %d, decision %d", g, opening, b.Decision.Seq)
	}
}

// What closes while the opening waits for the record is not granted when it
// comes.
func TestClosedMeanwhileIsNotGranted(t *testing.T) {
	w := newSite(t, siteRules())
	w.step(0, closures.ListOffered{List: list(t, "2031-045-A"), By: "test"})
	w.run(500 * time.Millisecond)
	w.rec.set(func(s *slate) { s.held = true })
	var b BeamView
	for range 8 {
		if b = w.step(100 * time.Millisecond); b.Opening {
			break
		}
	}
	opening := w.e.gates[0].opening
	w.rec.set(func(s *slate) { s.c.Durable = opening })
	w.clock.advance(time.Millisecond)
	at, _ := w.clock.Read()
	w.offer(unsafe(at))
	v, _ := w.s.Turn()
	mustShut(t, v.Beams[0], closures.CodeInterlock)
	// Clear again: the old opening's entry does not count for the new one.
	w.rec.set(func(s *slate) { s.held = false })
	w.step(10 * time.Millisecond)
	w.rec.set(func(s *slate) { s.held = true })
	for range 12 {
		if b = w.step(100 * time.Millisecond); b.Decision.Open {
			t.Fatal("granted by an opening that was taken back")
		}
		if b.Opening && w.e.gates[0].opening == opening {
			t.Fatal("the second opening has the first one's entry")
		}
	}
}

// BW-025
func TestStoreErrorCloses(t *testing.T) {
	for name, spoil := range map[string]func(*Condition){
		"failed":  func(c *Condition) { c.Failed = true },
		"damaged": func(c *Condition) { c.Damaged = true },
		"half":    func(c *Condition) { c.Half = true },
		"full":    func(c *Condition) { c.Full = true },
		"behind":  func(c *Condition) { c.Behind = time.Second + time.Millisecond },
		"gap":     func(c *Condition) { c.Gap = true },
	} {
		t.Run(name, func(t *testing.T) {
			w := newSite(t, siteRules()).opened()
			w.rec.set(func(s *slate) { spoil(&s.c) })
			w.clock.advance(time.Millisecond)
			v, err := w.s.Turn()
			if err != nil {
				t.Fatal(err)
			}
			mustShut(t, v.Beams[0], closures.CodeRecord)
			w.rec.set(func(s *slate) { s.c = Condition{Durable: s.c.Durable} })
			if _, err := w.s.Turn(); err != nil {
				t.Fatal(err)
			}
			if b := w.run(2 * time.Second); !b.Decision.Open {
				t.Fatalf("the record is sound again: %v", reasons(b.Decision))
			}
		})
	}
}

func TestFullRecordRefusesIntakeButWhatCloses(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.rec.set(func(s *slate) { s.c.Full = true })
	w.step(10 * time.Millisecond)
	at, _ := w.clock.Read()
	for _, b := range []closures.Body{closures.InterlockSeen{Source: "catwalk", Said: at, Safe: true}, closures.Heard{Source: "catwalk", Said: at}, closures.Rearmed{Beam: "north", By: "ana"}} {
		if _, err := w.e.Offer("feed", b); codeOf(err) != closures.Busy {
			t.Errorf("%T: %v, want busy", b, err)
		}
	}
	for _, b := range []closures.Body{hold("h-1"), closures.Veto{Beam: "north"}, closures.Fault{Beam: "north"}} {
		if _, err := w.e.Offer("feed", b); err != nil {
			t.Errorf("%T can only close and was refused: %v", b, err)
		}
	}
	v, _ := w.s.Turn()
	mustShut(t, v.Beams[0], closures.CodeHold)
	w.rec.set(func(s *slate) { s.c.Full = false })
	w.s.Turn()
	if _, err := w.e.Offer("feed", closures.Heard{Source: "catwalk", Said: at}); err != nil {
		t.Errorf("room again: %v", err)
	}
}

func codeOf(err error) closures.ErrorCode {
	var e *closures.Error
	if errors.As(err, &e) {
		return e.Code
	}
	return 255
}

// An entry that the record refuses shutters in the same turn, though the core
// had no word of it, and the record begins anew when the gap is durable.
func TestLostEntryShutters(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.rec.set(func(s *slate) { s.refuse = errFull })
	mustShut(t, w.step(100*time.Millisecond), closures.CodeRecord)
	mustShut(t, w.step(100*time.Millisecond), closures.CodeRecord)
	w.rec.set(func(s *slate) { s.refuse = nil })
	mustShut(t, w.step(100*time.Millisecond), closures.CodeRecord) // the gap is not durable
	before := len(what[Begun](w.rec))
	w.rec.set(func(s *slate) { s.c.Gap = false })
	mustShut(t, w.step(100*time.Millisecond), closures.CodeReopening)
	b := w.run(3 * time.Second)
	if !b.Decision.Open {
		t.Fatalf("the gap is over: %v", reasons(b.Decision))
	}
	if got := len(what[Begun](w.rec)); got != before+1 {
		t.Errorf("%d starts on record, want %d", got, before+1)
	}
}

func TestDurableWaiterSurvivesALostEntry(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.rec.set(func(s *slate) { s.refuse = errFull })
	done := durably(w, hold("h-1"))
	mustShut(t, w.step(100*time.Millisecond), closures.CodeHold)
	w.rec.set(func(s *slate) { s.refuse, s.held, s.c.Gap = nil, true, false })
	w.step(100 * time.Millisecond)
	select {
	case o := <-done:
		t.Fatalf("answered before anything was durable: %+v", o)
	default:
	}
	w.rec.settle()
	w.step(100 * time.Millisecond)
	if o := <-done; o.err != nil {
		t.Fatal(o.err)
	}
	kept := what[Kept](w.rec)
	if d := kept[len(kept)-1].Durable; len(d.Holds) != 1 {
		t.Fatalf("the hold is not kept: %+v", d)
	}
}

// durably gives a fact whose answer waits for the record.
func durably(w *site, b closures.Body) <-chan outcome {
	wt := &waiter{durable: true, done: make(chan outcome, 1)}
	wall, boot := w.clock.Read()
	if _, err := w.e.in.offer(pending{from: "console", body: b, wall: wall, boot: boot, wait: wt}); err != nil {
		w.t.Fatal(err)
	}
	return wt.done
}

func TestAnswersWhenDurable(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.rec.set(func(s *slate) { s.held = true })
	done := durably(w, hold("h-1"))
	again := durably(w, hold("h-1")) // refused: waits for nothing
	mustShut(t, w.step(10*time.Millisecond), closures.CodeHold)
	if o := <-again; codeOf(o.err) != closures.Conflict {
		t.Fatalf("the second hold of one id: %+v", o)
	}
	select {
	case o := <-done:
		t.Fatalf("answered before it was durable: %+v", o)
	default:
	}
	if last := w.rec.entries[len(w.rec.entries)-1]; !last.Urgent {
		t.Error("the hold's entries do not ask for the store at once")
	}
	w.rec.settle()
	if w.e.minds() {
		t.Error("an answer needs no turn")
	}
	if o := <-done; o.err != nil || o.Seq == 0 {
		t.Fatalf("answer: %+v", o)
	}
}

func TestPanicShuttersAndStartsAnew(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	if _, err := w.s.Submit("console", closures.HoldPlaced{ID: "old", Beam: "north", By: "ana", Placed: evening, From: evening.Add(time.Hour)}); err != nil {
		t.Fatal(err)
	}
	w.e.beforeStep = func() { w.e.beforeStep = nil; panic("poisoned") }
	updates, cancel := w.e.Watch(16)
	defer cancel()
	<-updates
	done := durably(w, hold("h-1"))
	w.clock.advance(100 * time.Millisecond)
	w.steady()
	v, err := w.s.Turn()
	if err != nil {
		t.Fatal(err)
	}
	u := <-updates
	mustShut(t, u.View.Beams[0], closures.CodeFault)
	for _, code := range []closures.Code{closures.CodeFault, closures.CodeStarting, closures.CodeHold} {
		mustShut(t, v.Beams[0], code) // what the person said in the lost batch is in force
	}
	w.e.minds()
	if o := <-done; o.err != nil {
		t.Fatalf("the hold of the lost batch: %v", o.err)
	}
	if len(v.Holds) != 2 {
		t.Fatalf("holds: %+v", v.Holds)
	}
	begun := what[Begun](w.rec)
	if len(begun) != 2 || begun[1].Cause != "a decision failed" {
		t.Fatalf("begun: %+v", begun)
	}
	if _, err := w.s.Submit("console", closures.HoldReleased{ID: "h-1", By: "ana"}); err != nil {
		t.Fatal(err)
	}
	if b := w.run(3 * time.Second); !b.Decision.Open {
		t.Fatalf("heard afresh: %v", reasons(b.Decision))
	}
	if s := w.e.Stats(); s.Panics != 1 {
		t.Errorf("%d panics counted", s.Panics)
	}
}

func TestSecondPanicInARowEnds(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.e.beforeStep = func() { panic("poisoned") }
	done := durably(w, hold("h-1"))
	updates, _ := w.e.Watch(16)
	v, err := w.s.Turn()
	if err == nil || !strings.Contains(err.Error(), "twice in a row") {
		t.Fatalf("after two panics: %v", err)
	}
	mustShut(t, v.Beams[0], closures.CodeFault)
	if !v.Stopped {
		t.Error("the view does not say that the engine stopped")
	}
	if o := <-done; o.err == nil {
		t.Error("somebody was told that a hold is in force")
	}
	for range updates { // ends
	}
	if _, err := w.e.Offer("feed", hold("h-2")); codeOf(err) != closures.Busy {
		t.Errorf("offering to an engine that ended: %v", err)
	}
}

// A panic outside the core is not survived either.
func TestPanicOfTheRecordShutters(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.e.opt.Record = brokenRecord{w.rec}
	w.clock.advance(100 * time.Millisecond)
	v, err := w.s.Turn()
	if err == nil {
		t.Fatal("no error")
	}
	mustShut(t, v.Beams[0], closures.CodeFault)
}

type brokenRecord struct{ *slate }

func (brokenRecord) Append([]Entry) error { panic("broken") }

// BW-024
func TestClockCloses(t *testing.T) {
	for name, c := range map[string]struct {
		spoil func(*ClockReport)
		code  closures.Code
	}{
		"stepped":        {func(r *ClockReport) { r.Step = time.Second }, closures.CodeClock},
		"slept":          {func(r *ClockReport) { r.Suspended = true }, closures.CodeClock},
		"unsynchronised": {func(r *ClockReport) { r.Synchronised = false }, closures.CodeClock},
		"no bound":       {func(r *ClockReport) { r.MaxErrorSaid = false }, closures.CodeClock},
		"wide bound":     {func(r *ClockReport) { r.MaxError = 201 * time.Millisecond }, closures.CodeClock},
		"cannot be read": {func(r *ClockReport) { r.Fault = "gone" }, closures.CodeFault},
	} {
		t.Run(name, func(t *testing.T) {
			w := newSite(t, siteRules()).opened()
			good := w.clock.report
			spoil := good
			c.spoil(&spoil)
			w.clock.report = spoil
			mustShut(t, w.step(time.Millisecond), c.code)
			mustShut(t, w.step(100*time.Millisecond), c.code) // without an acknowledgement it stays
			w.clock.report = good
			if b := w.run(2500 * time.Millisecond); !b.Decision.Open {
				t.Fatalf("the clock is right again: %v", reasons(b.Decision))
			}
		})
	}
}

func TestStepBackHasAllHeardAfresh(t *testing.T) {
	var w *site
	w = newSite(t, siteRules(), func(o *Options) {
		o.Reanchor = func() {
			w.clock.wall = w.clock.wall.Add(-time.Hour)
			w.clock.report.Step = 0
		}
	})
	w.opened()
	w.clock.report.Step = -time.Hour
	mustShut(t, w.step(100*time.Millisecond), closures.CodeClock)
	// From here on the interlock is silent. Its last word is an hour ahead, and
	// must not count as fresh for that hour.
	w.quiet = func(b closures.Body) bool { _, ok := b.(closures.InterlockSeen); return ok }
	for range 50 {
		if b := w.step(100 * time.Millisecond); b.Decision.Open {
			t.Fatal("opened on a word from before the step")
		}
	}
	mustShut(t, w.e.View().Beams[0], closures.CodeStarting)
	w.quiet = nil
	if b := w.run(2 * time.Second); !b.Decision.Open {
		t.Fatalf("heard afresh: %v", reasons(b.Decision))
	}
}

// Tracks are never forgotten when the state begins anew, whatever the cause.
func TestTracksOutliveANewState(t *testing.T) {
	for name, spoil := range map[string]func(*site){
		"a panic":        func(w *site) { w.e.beforeStep = func() { w.e.beforeStep = nil; panic("poisoned") } },
		"the clock back": func(w *site) { w.clock.wall = w.clock.wall.Add(-20 * time.Millisecond) },
		"lost entries":   func(w *site) { w.e.torn = true },
	} {
		w := newSite(t, withAircraft(siteRules())).opened()
		at, _ := w.clock.Read()
		p := w.rules.Site.Position.Offset(w.local.Mul(7000)) // in the beam
		b := w.step(10*time.Millisecond, closures.AircraftSeen{Source: "rx-1", Said: at, Aircraft: "400001", Located: true, Position: p, AltitudeFrom: closures.AboveEllipsoid, Speed: 200})
		mustShut(t, b, closures.CodeAircraft)
		spoil(w)
		b = w.step(10 * time.Millisecond)
		if n := len(what[Begun](w.rec)); n != 2 {
			t.Errorf("%s: %d starts", name, n)
		}
		mustShut(t, b, closures.CodeAircraft)
	}
}

// A panic in a turn that has nothing to record.
func TestPanicOfAnEmptyTurn(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	w.e.beforeStep = func() { w.e.beforeStep = nil; panic("poisoned") }
	v, err := w.s.Turn()
	if err != nil {
		t.Fatal(err)
	}
	mustShut(t, v.Beams[0], closures.CodeFault)
}

func TestNewPlaceStartsAnew(t *testing.T) {
	w := newSite(t, siteRules(), func(o *Options) { o.Prepare = nil }).opened()
	moved := siteRules()
	moved.Site.Position.Height += 10
	moved.Digest[0] = 2
	w.clock.advance(10 * time.Millisecond)
	if _, err := w.s.Submit("config", closures.RulesSet{Rules: moved, By: "ana"}); err != nil {
		t.Fatal(err)
	}
	mustShut(t, w.e.View().Beams[0], closures.CodeStarting)
	if n := w.e.View().Nights; len(n) == 0 || n[0].Site() != moved.Site.Position {
		t.Fatal("the nights are of the old place")
	}
	w.rules = moved
	if b := w.run(2 * time.Second); !b.Decision.Open || w.e.View().Rules != moved {
		t.Fatalf("at the new place: %v", reasons(b.Decision))
	}
}

func TestNewRulesKeepWhatIsGranted(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	next := siteRules()
	next.Beams[0].ReopenAfter = 2 * time.Second
	next.Digest[0] = 2
	w.clock.advance(10 * time.Millisecond)
	if _, err := w.s.Submit("config", closures.RulesSet{Rules: next, By: "ana"}); err != nil {
		t.Fatal(err)
	}
	if b := w.e.View().Beams[0]; !b.Decision.Open || b.Decision.Rules != next.Digest {
		t.Fatalf("after new rules: %v", reasons(b.Decision))
	}
	broken := siteRules()
	broken.Permit.Lease = 0
	if _, err := w.s.Submit("config", closures.RulesSet{Rules: broken, By: "ana"}); codeOf(err) != closures.Invalid {
		t.Fatalf("rules that cannot be met: %v", err)
	}
}

func TestRefusesWhatIsNotForOutside(t *testing.T) {
	w := newSite(t, siteRules())
	at, _ := w.clock.Read()
	for _, b := range []closures.Body{nil, closures.Tick{}, closures.Started{}, closures.ClockState{}, closures.RecordState{}, closures.NightReady{},
		closures.InterlockSeen{Source: "catwalk", Said: at.Add(MaxAhead + 1), Safe: true}} {
		if _, err := w.e.Offer("feed", b); codeOf(err) != closures.Invalid {
			t.Errorf("%T: %v", b, err)
		}
	}
	if _, err := w.e.Offer("feed", closures.InterlockSeen{Source: "catwalk", Said: at.Add(MaxAhead), Safe: true}); err != nil {
		t.Errorf("within the allowance: %v", err)
	}
}

func TestNewRefuses(t *testing.T) {
	good := Options{Clock: newHandClock(), Record: &slate{}, Rules: siteRules(), Boot: closures.Boot{ID: "b", At: evening}}
	for name, spoil := range map[string]func(*Options){
		"no clock":  func(o *Options) { o.Clock = nil },
		"no record": func(o *Options) { o.Record = nil },
		"no rules":  func(o *Options) { o.Rules = nil },
		"bad rules": func(o *Options) { r := siteRules(); r.Permit.Lease = -1; o.Rules = r },
		"no boot":   func(o *Options) { o.Boot = closures.Boot{} },
	} {
		o := good
		spoil(&o)
		if _, err := New(o); err == nil {
			t.Errorf("%s: taken", name)
		}
	}
	e, err := New(good)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := e.Stepper(); err != nil {
		t.Fatal(err)
	}
	if _, err := e.Stepper(); err == nil {
		t.Error("two owners")
	}
	if err := e.Run(t.Context()); err == nil {
		t.Error("Run beside a Stepper")
	}
	// Nothing vouches for this clock.
	s := &Stepper{e}
	v, err := s.Turn()
	if err != nil {
		t.Fatal(err)
	}
	mustShut(t, v.Beams[0], closures.CodeClock)
}

func TestWatchdogIsStrokedWhileAllIsWell(t *testing.T) {
	strokes := 0
	w := newSite(t, siteRules(), func(o *Options) { o.Watchdog = func() { strokes++ } }).opened()
	n := strokes
	if n == 0 {
		t.Fatal("never stroked")
	}
	w.step(100 * time.Millisecond)
	if strokes != n+1 {
		t.Fatalf("%d strokes in a turn", strokes-n)
	}
	w.e.beforeStep = func() { panic("poisoned") }
	if _, err := w.s.Turn(); err == nil || strokes != n+1 {
		t.Fatalf("stroked after a panic: %v", err)
	}
}
