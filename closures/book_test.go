package closures

import (
	"fmt"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/span"
)

// randomSmallList is a list over a coarse grid of instants and directions, so
// that pairs often resemble each other.
func randomSmallList(t *testing.T, rng *rand.Rand, id string, dirs []r3.Vector) *ListText {
	hour := func(n int) time.Time { return evening.Add(time.Duration(n) * time.Minute) }
	from := rng.IntN(3)
	text := &ListText{
		ID: ListID(id), Authority: "orbital-desk", Issued: evening.Add(-time.Hour),
		Covers: span.Span{From: hour(from), Until: hour(from + 4 + rng.IntN(4))}, UnlistedOpen: rng.IntN(2) == 0, Digest: Digest{byte(id[0])},
	}
	if rng.IntN(6) == 0 {
		text.Beams = []BeamID{"north"}
	}
	covFrom := int(text.Covers.From.Sub(evening) / time.Minute)
	covLen := int(text.Covers.Length() / time.Minute)
	for i := range 1 + rng.IntN(3) {
		r := Region{ID: fmt.Sprint("r", i), Shape: ICRSCone, Direction: dirs[rng.IntN(len(dirs))], Radius: s1.Angle(1+rng.IntN(3)) * s1.Degree}
		switch rng.IntN(8) {
		case 0:
			r = Region{ID: r.ID, Shape: WholeSky}
		case 1:
			r = Region{ID: r.ID, Shape: HorizonBox, Box: geometry.Box{AzFrom: 0, AzTo: 3, ElFrom: 0.2, ElTo: 1.2}}
		case 2:
			r = Region{ID: r.ID, Shape: TrackCone, Radius: s1.Degree, Points: []AimPoint{{hour(0), dirs[0]}, {hour(8), dirs[1]}}}
		}
		if rng.IntN(4) == 0 {
			r.Throughout = ThroughoutClosed
			if rng.IntN(2) == 0 {
				r.Throughout = ThroughoutOpen
			}
		} else {
			for range 1 + rng.IntN(2) {
				w := Window{Region: int32(i), Open: rng.IntN(2) == 0}
				a := covFrom + rng.IntN(covLen)
				w.From, w.Until = hour(a).UnixNano(), hour(a+1+rng.IntN(3)).UnixNano()
				text.Windows = append(text.Windows, w)
			}
		}
		text.Regions = append(text.Regions, r)
	}
	return text
}

// varied is a list like old but for one or two changes, most of them small.
func varied(rng *rand.Rand, old *ListText, id string) *ListText {
	n := *old
	n.ID, n.Digest, n.Issued = ListID(id), Digest{byte(id[0])}, old.Issued.Add(time.Minute)
	n.Regions = append([]Region(nil), old.Regions...)
	n.Windows = append([]Window(nil), old.Windows...)
	for range 1 + rng.IntN(2) {
		switch rng.IntN(9) {
		case 0:
			n.UnlistedOpen = !n.UnlistedOpen
		case 1:
			n.Covers.Until = n.Covers.Until.Add(time.Duration(rng.IntN(5)-2) * time.Minute)
		case 2, 3:
			if len(n.Windows) > 0 {
				w := &n.Windows[rng.IntN(len(n.Windows))]
				w.From -= int64(rng.IntN(3)-1) * int64(time.Minute)
			}
		case 4:
			if len(n.Windows) > 0 {
				w := &n.Windows[rng.IntN(len(n.Windows))]
				w.Until += int64(rng.IntN(3)-1) * int64(time.Minute)
			}
		case 5:
			r := &n.Regions[rng.IntN(len(n.Regions))]
			if r.Shape == ICRSCone || r.Shape == TrackCone {
				r.Radius += s1.Angle(rng.IntN(3)-1) * 0.5 * s1.Degree
			}
		case 6:
			r := &n.Regions[rng.IntN(len(n.Regions))]
			if r.Throughout != NotThroughout {
				r.Throughout = ThroughoutClosed + ThroughoutOpen - r.Throughout
			}
		case 7:
			if len(n.Windows) > 0 {
				n.Windows[rng.IntN(len(n.Windows))].Open = rng.IntN(2) == 0
			}
		}
	}
	return &n
}

// A list is called tightening only if it opens nothing: at no sampled instant
// and aim is a beam open with it that was shuttered without. The oracle asks
// the two checks of lists themselves, at each instant alone. BW-014
func TestTighteningNeverOpens(t *testing.T) {
	const pairs = 12_000
	rng := rand.New(rand.NewPCG(3, 4))
	r := siteRules()
	r.Beams[0].Asterism, r.Beams[0].Aim.Error = 0, 0
	w := newWorld(t, r)
	dirs := []r3.Vector{w.dir, overheadICRS(t, r, evening, 150, 62), overheadICRS(t, r, evening, 154, 65)}
	var aims []*Aim
	for _, d := range dirs {
		for range 3 {
			v := d.Add(r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Mul(0.02)).Normalize()
			aims = append(aims, &Aim{Frame: ICRS, Direction: v, Motion: Tracking})
		}
		aims = append(aims, &Aim{Frame: ICRS, Direction: d, Motion: Tracking})
	}
	aims = append(aims, &Aim{Frame: Horizon, Direction: geometry.FromHorizon(1, 1), Motion: Fixed})
	var sh Sheet
	closed := func(b Book, a *Aim, at time.Time) bool {
		f := Foreseen{Rules: r, Lists: b.Listed(), Air: r.Site.Air.Over(r.Site.Position.Height)}
		over := span.Span{From: at, Until: at.Add(1)}
		q := Question{Beam: &r.Beams[0], Aim: a, Over: over, Nights: w.s.Nights(), Edge: EdgeDecide, Now: at}
		sh.Reset()
		listedClosure{}.Look(&f, &q, &sh)
		notCovered{}.Look(&f, &q, &sh)
		return sh.Answers[CodeListedClosure].Verdict != Clear || sh.Answers[CodeNotCovered].Verdict != Clear
	}
	var tightening, opened int
	for range pairs {
		var book Book
		for i := range 1 + rng.IntN(2) {
			l, err := Index(randomSmallList(t, rng, string(rune('a'+i)), dirs))
			if err == nil {
				book = book.with(Entry{List: l, Status: ListInForce})
			}
		}
		if len(book) == 0 {
			continue
		}
		text := randomSmallList(t, rng, "x", dirs)
		if rng.IntN(4) > 0 {
			text = varied(rng, book[0].List.Text(), "x")
		}
		text.Issued = evening
		if rng.IntN(2) == 0 {
			text.Replaces = []ListID{book[0].List.ID()}
		}
		l, err := Index(text)
		if err != nil {
			continue
		}
		_, tight, err := book.Offer(r, l)
		if err != nil {
			t.Fatal(err)
		}
		after := book
		for _, id := range text.Replaces {
			e := *after.Find("orbital-desk", id)
			e.Status = ListReplaced
			after = after.with(e)
		}
		after = after.with(Entry{List: l, Status: ListInForce})
		opens := false
		for range 40 {
			a := aims[rng.IntN(len(aims))]
			at := evening.Add(time.Duration(rng.Int64N(int64(12 * time.Minute)))).Add(-time.Minute)
			if rng.IntN(2) == 0 {
				at = evening.Add(time.Duration(rng.IntN(12))*time.Minute + time.Duration(rng.IntN(24)-12)*time.Second)
			}
			if closed(book, a, at) && !closed(after, a, at) {
				opens = true
				if tight {
					t.Fatalf("called tightening, but opens at %v\nwas %+v\nis %+v", at, book[0].List.Text(), text)
				}
			}
		}
		if tight {
			tightening++
		}
		if opens {
			opened++
		}
	}
	t.Logf("%d pairs: %d called tightening, %d seen to open", pairs, tightening, opened)
	if tightening < pairs/20 || opened < pairs/20 {
		t.Error("the pairs leave one side untested")
	}
}

func TestListsComeAndGo(t *testing.T) {
	r := siteRules()
	r.Authorities[0].Loosening = LooseningSecondPerson
	w := newWorld(t, r)
	text := *openList(t).Text()
	l, _ := Index(&text)
	try := func(b Body) *Error {
		w.step(100*time.Millisecond, b)
		for _, f := range w.s.Refused() {
			return f.Err
		}
		return nil
	}
	if err := try(ListOffered{List: l, By: "ana"}); err != nil {
		t.Fatal(err)
	}
	if e := w.s.Book().Find("orbital-desk", l.ID()); e.Status != ListWaiting {
		t.Fatalf("a first list opens: %v", e.Status)
	}
	if d := w.last[0]; !d.Codes.Has(CodeNotCovered) {
		t.Error("a waiting list covers time")
	}
	if err := try(ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: l.Digest(), By: "ana"}); err == nil || err.Code != Conflict {
		t.Errorf("confirmed by who brought it: %v", err)
	}
	if err := try(ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: Digest{77}, By: "bo"}); err == nil || err.Code != Changed {
		t.Errorf("confirmed by another digest: %v", err)
	}
	if err := try(ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: l.Digest(), By: "bo"}); err != nil {
		t.Fatal(err)
	}
	w.mustOpen()
	if err := try(ListOffered{List: l, By: "ana"}); err != nil {
		t.Errorf("the identical list again: %v", err)
	}
	other := text
	other.Digest = Digest{9}
	l2, _ := Index(&other)
	if err := try(ListOffered{List: l2, By: "ana"}); err == nil || err.Code != Conflict {
		t.Errorf("another list with the same id: %v", err)
	}
	stranger := text
	stranger.Authority = "nobody"
	l3, _ := Index(&stranger)
	if err := try(ListOffered{List: l3, By: "ana"}); err == nil || err.Code != NotFound {
		t.Errorf("an unknown authority: %v", err)
	}
	if err := try(ListWithdrawn{Authority: "orbital-desk", ID: l.ID(), By: "ana"}); err != nil {
		t.Fatal(err)
	}
	if !w.last[0].Open {
		t.Error("asking to withdraw closes")
	}
	if err := try(ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: l.Digest(), By: "ana"}); err == nil {
		t.Error("withdrawal confirmed by who asked")
	}
	if err := try(ListConfirmed{Authority: "orbital-desk", ID: l.ID(), Digest: l.Digest(), By: "bo"}); err != nil {
		t.Error(err)
	}
	if d := w.last[0]; d.Open || !d.Codes.Has(CodeNotCovered) {
		t.Errorf("withdrawn: open %v %v", d.Open, d.Codes.Names())
	}
}
