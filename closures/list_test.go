package closures

import (
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/span"
)

// listed asks a list alone whether it closes the world's aim at an instant.
func (w *world) listed(l *List, waiting bool, a *Aim, at time.Time) bool {
	f := Foreseen{Rules: w.r, Lists: []Listed{{List: l, Waiting: waiting}}, Air: w.r.Site.Air.Over(w.r.Site.Position.Height)}
	q := Question{Beam: &w.r.Beams[0], Aim: a, Over: span.Span{From: at, Until: at.Add(1)}, Nights: w.s.Nights(), Edge: EdgeDecide, Now: at}
	var sh Sheet
	listedClosure{}.Look(&f, &q, &sh)
	return sh.Answers[CodeListedClosure].Verdict != Clear
}

// The matching dual: open only where an open region must hold the aim, closed
// wherever a closed one might. The error here is 35 arcsec and the asterism 20,
// so light may lie up to 55 arcsec from the aim. BW-016
func TestMatchingDual(t *testing.T) {
	w := newWorld(t, siteRules())
	aim := &Aim{Frame: ICRS, Direction: w.dir, Error: 5 * geometry.Arcsecond, Motion: Tracking}
	beside := func(arcsec float64) Region {
		d := w.dir.Add(w.dir.Ortho().Mul(s1.Angle(arcsec * float64(geometry.Arcsecond)).Radians())).Normalize()
		return Region{ID: "r", Shape: ICRSCone, Direction: d, Radius: 300 * geometry.Arcsecond}
	}
	list := func(r Region, unlistedOpen, open bool) *List {
		at := w.at
		l, err := Index(&ListText{
			ID: "l", Authority: "orbital-desk", Issued: at, Covers: span.Span{From: at.Add(-time.Hour), Until: at.Add(time.Hour)}, UnlistedOpen: unlistedOpen, Digest: Digest{1},
			Regions: []Region{r}, Windows: []Window{{Region: 0, Open: open, From: at.Add(-time.Minute).UnixNano(), Until: at.Add(time.Minute).UnixNano()}},
		})
		if err != nil {
			t.Fatal(err)
		}
		return l
	}
	for _, c := range []struct {
		arcsec           float64
		closedBy, opened bool // a closed window shutters; an open one opens
	}{
		{0, true, true}, {244, true, true}, {246, true, false}, {300, true, false}, {354, true, false}, {356, false, false}, {1000, false, false},
	} {
		if got := w.listed(list(beside(c.arcsec), true, false), false, aim, w.at); got != c.closedBy {
			t.Errorf("closed window, %v arcsec beside: closed %v", c.arcsec, got)
		}
		if got := !w.listed(list(beside(c.arcsec), false, true), false, aim, w.at); got != c.opened {
			t.Errorf("open window, %v arcsec beside: open %v", c.arcsec, got)
		}
	}
}

// A window closes from lead before it to tail after it; an open one opens from
// tail after its start to lead before its end; both to the nanosecond.
func TestLeadAndTail(t *testing.T) {
	r := siteRules()
	r.Authorities[0].Lead, r.Authorities[0].Tail = 5*time.Second, 3*time.Second
	w := newWorld(t, r)
	aim := &Aim{Frame: ICRS, Direction: w.dir, Motion: Tracking}
	from, until := w.at.Add(time.Minute), w.at.Add(2*time.Minute)
	text := func(open bool) *ListText {
		return &ListText{
			ID: "l", Authority: "orbital-desk", Issued: w.at, Covers: span.Span{From: w.at.Add(-time.Hour), Until: w.at.Add(time.Hour)}, UnlistedOpen: !open, Digest: Digest{1},
			Regions: []Region{{ID: "r", Shape: ICRSCone, Direction: w.dir, Radius: s1.Degree}},
			Windows: []Window{{Region: 0, Open: open, From: from.UnixNano(), Until: until.UnixNano()}},
		}
	}
	closedList, _ := Index(text(false))
	openedList, _ := Index(text(true))
	for _, c := range []struct {
		at     time.Time
		closed bool
	}{
		{from.Add(-5*time.Second - 1), false}, {from.Add(-5 * time.Second), true}, {until.Add(3*time.Second - 1), true}, {until.Add(3 * time.Second), false},
	} {
		if got := w.listed(closedList, false, aim, c.at); got != c.closed {
			t.Errorf("closed window at %v: %v", c.at.Sub(from), got)
		}
	}
	for _, c := range []struct {
		at     time.Time
		closed bool
	}{
		{from.Add(3*time.Second - 1), true}, {from.Add(3 * time.Second), false}, {until.Add(-5*time.Second - 1), false}, {until.Add(-5 * time.Second), true},
	} {
		if got := w.listed(openedList, false, aim, c.at); got != c.closed {
			t.Errorf("open window at %v: %v", c.at.Sub(from), got)
		}
	}
}

// A waiting list closes at once and opens nothing (BW-015); time that nothing
// covers is closed (BW-017), with no gap where two lists meet.
func TestWaitingAndCoverage(t *testing.T) {
	r := siteRules()
	r.Authorities[0].Loosening = LooseningSecondPerson
	w := newWorld(t, r)
	half := func(id ListID, from, until time.Duration) *List {
		l, err := Index(&ListText{ID: id, Authority: "orbital-desk", Issued: w.at, Covers: span.Span{From: w.at.Add(from), Until: w.at.Add(until)}, UnlistedOpen: true, Digest: Digest{byte(id[0])}})
		if err != nil {
			t.Fatal(err)
		}
		return l
	}
	a, b := half("a", -time.Hour, 30*time.Second), half("b", 30*time.Second, 90*time.Second)
	for _, l := range []*List{a, b} {
		w.step(0, ListOffered{List: l, By: "ana"})
		w.step(0, ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: l.Digest(), By: "bo"})
		if bad := w.s.Refused(); len(bad) > 0 {
			t.Fatal(bad[0].Err)
		}
	}
	w.mustOpen()
	start := w.at
	for w.at.Before(evening.Add(80 * time.Second)) {
		if d := w.step(100 * time.Millisecond); !d.Open {
			t.Fatalf("%v: %s", w.at.Sub(start), reasons(d))
		}
	}
	// The coverage ends at 90 s: shuttered from lead, margin time and the
	// clock's error before.
	for w.last[0].Open {
		w.step(10 * time.Millisecond)
	}
	early := evening.Add(90 * time.Second).Sub(w.at)
	if want := 5*time.Second + 700*time.Millisecond + 10*time.Millisecond; early < want || early > want+10*time.Millisecond {
		t.Errorf("shuttered %v before the end of the coverage, want %v", early, want)
	}
	if !w.last[0].Codes.Has(CodeNotCovered) {
		t.Error(reasons(w.last[0]))
	}

	w = newWorld(t, r)
	w.step(0, ListOffered{List: a, By: "ana"})
	w.step(0, ListConfirmed{Authority: "orbital-desk", ID: "a", Digest: a.Digest(), By: "bo"})
	w.mustOpen()
	wide, err := Index(&ListText{
		ID: "wide", Authority: "orbital-desk", Issued: w.at.Add(time.Second), Replaces: []ListID{"a"}, Covers: span.Span{From: w.at.Add(-time.Hour), Until: w.at.Add(10 * time.Hour)}, UnlistedOpen: true, Digest: Digest{7},
		Regions: []Region{{ID: "r", Shape: ICRSCone, Direction: w.dir, Radius: s1.Degree}},
		Windows: []Window{{Region: 0, From: w.at.Add(-time.Minute).UnixNano(), Until: w.at.Add(time.Minute).UnixNano()}},
	})
	if err != nil {
		t.Fatal(err)
	}
	d := w.step(100*time.Millisecond, ListOffered{List: wide, By: "ana"})
	if d.Open || !d.Codes.Has(CodeListedClosure) {
		t.Errorf("a waiting list's closed window: open %v", d.Open)
	}
	if e := w.s.Book().Find("orbital-desk", "a"); e.Status != ListInForce {
		t.Errorf("what it would replace is %v", e.Status)
	}
	w.step(100*time.Millisecond, ListConfirmed{Authority: "orbital-desk", ID: "wide", Digest: wide.Digest(), By: "bo"})
	if e := w.s.Book().Find("orbital-desk", "a"); e.Status != ListReplaced {
		t.Errorf("what it replaced is %v", e.Status)
	}
}

// A closed window that starts with its track is widened by the lead as any
// other: the track stays at its ends for as long as a lead or tail may reach.
func TestLeadBeforeATrack(t *testing.T) {
	w := newWorld(t, siteRules())
	aim := &Aim{Frame: ICRS, Direction: w.dir, Motion: Tracking}
	from, until := w.at.Add(time.Minute), w.at.Add(3*time.Minute)
	l, err := Index(&ListText{
		ID: "l", Authority: "orbital-desk", Issued: w.at, Covers: span.Span{From: w.at.Add(-time.Hour), Until: w.at.Add(time.Hour)}, UnlistedOpen: true, Digest: Digest{1},
		Regions: []Region{{ID: "r", Shape: TrackCone, Radius: s1.Degree, Points: []AimPoint{{from, w.dir}, {until, w.dir}}}},
		Windows: []Window{{Region: 0, From: from.UnixNano(), Until: until.UnixNano()}},
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		at     time.Time
		closed bool
	}{
		{from.Add(-5*time.Second - 1), false}, {from.Add(-5 * time.Second), true}, {until.Add(5*time.Second - 1), true}, {until.Add(5 * time.Second), false},
	} {
		if got := w.listed(l, false, aim, c.at); got != c.closed {
			t.Errorf("at %v: closed %v", c.at.Sub(from), got)
		}
	}
}

// A clock that runs ahead for a while and comes back loses no hold and no
// sighting: what is over closes nothing, but it is not forgotten. BW-012
func TestAWrongClockLosesNoHold(t *testing.T) {
	w := newWorld(t, siteRules(), openList(t))
	w.mustOpen()
	until := w.at.Add(5 * time.Minute)
	w.step(100*time.Millisecond, HoldPlaced{ID: "h", Beam: EveryBeam, By: "ana", Placed: w.at, Until: until},
		Sighted{Source: "spotter", Said: w.at, For: 5 * time.Minute})
	right := w.at
	for _, sound := range []bool{false, true} {
		w.at = right.Add(10 * time.Minute)
		w.step(100*time.Millisecond, ClockState{Synchronised: sound, MaxError: 0})
		if len(w.s.Holds()) != 0 {
			t.Error("a hold that is over is shown")
		}
		w.at = right
		d := w.step(100*time.Millisecond, ClockState{Synchronised: true})
		if !d.Codes.Has(CodeHold) || !d.Codes.Has(CodeSighting) {
			t.Errorf("kernel's word %v: after the clock came back: %s", sound, reasons(d))
		}
	}
	w.at = until.Add(keepPast)
	w.step(time.Second)
	w.step(time.Second)
	if d, _ := w.s.Durable(); len(d.Holds) != 0 || len(d.Sightings) != 0 {
		t.Errorf("kept for ever: %d holds, %d sightings", len(d.Holds), len(d.Sightings))
	}
}

// At the turn of a 12 h bin of the sky an aim fixed to the ground stays open by
// a list that opens only its region: tails reach back into the bin before.
func TestNoGapWhereTheSkysBinsMeet(t *testing.T) {
	r := siteRules()
	r.Beams[0].Limits.SunBelow = 90 * s1.Degree
	turn := time.Date(2031, 2, 14, 12, 0, 0, 0, time.UTC)
	start := turn.Add(-20 * time.Second)
	l, err := Index(&ListText{
		ID: "l", Authority: "orbital-desk", Issued: start, Covers: span.Span{From: start.Add(-time.Hour), Until: start.Add(time.Hour)}, Digest: Digest{1},
		Regions: []Region{{ID: "r", Shape: ICRSCone, Direction: overheadICRS(t, r, turn, 150, 65), Radius: 5 * s1.Degree, Throughout: ThroughoutOpen}},
	})
	if err != nil {
		t.Fatal(err)
	}
	w := newWorldAt(t, r, start, l)
	ground := &Aim{Frame: Horizon, Direction: geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), Motion: Fixed}
	w.quiet = func(b Body) bool { a, is := b.(AimSeen); return is && a.From == "encoder" }
	opened := false
	for w.at.Before(turn.Add(20 * time.Second)) {
		d := w.step(100*time.Millisecond, AimSeen{Beam: "north", Said: w.at, From: "mount", Aim: ground})
		if opened && !d.Open {
			t.Fatalf("%v from the turn: %s", w.at.Sub(turn), reasons(d))
		}
		opened = opened || d.Open
	}
	if !opened {
		t.Errorf("never open: %s", reasons(w.last[0]))
	}
}
