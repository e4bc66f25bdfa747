package engine

import (
	"crypto/sha256"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"beamward/closures"
	"beamward/closures/wire"
)

// busyNight drives a site through all sorts of facts.
func busyNight(t *testing.T, w *site, steps int) {
	t.Helper()
	rng := rand.New(rand.NewPCG(1, 2))
	w.step(0, closures.ListOffered{List: list(t, "2031-045-A", closures.Window{From: evening.Add(20 * time.Second).UnixNano(), Until: evening.Add(25 * time.Second).UnixNano()}), By: "test"})
	for i := range steps {
		at, _ := w.clock.Read()
		var b []closures.Body
		switch rng.IntN(500) {
		case 0:
			b = append(b, unsafe(at))
		case 1:
			b = append(b, closures.HoldPlaced{ID: closures.HoldID("h" + at.Format("150405.000")), Beam: "north", By: "ana", Placed: at, Until: at.Add(2 * time.Second)})
		case 2:
			b = append(b, closures.Sighted{Source: "spotter", Said: at, For: 3 * time.Second})
		case 3:
			b = append(b, closures.Heard{Source: "nobody", Said: at}) // the core refuses it
		case 4:
			w.quiet = func(b closures.Body) bool { _, ok := b.(closures.AimSeen); return ok }
		case 5:
			w.quiet = nil
		case 6:
			p := w.rules.Site.Position
			p.Lat += 0.3 / 57.3
			p.Height = 9000
			b = append(b, closures.AircraftSeen{Source: "rx-1", Said: at, Aircraft: "400001", Located: true, Position: p, AltitudeFrom: closures.AboveEllipsoid, Speed: 200, Climb: 0, Track: 3})
		case 7:
			w.clock.report.Suspended = true
		case 8:
			w.clock.report.Suspended = false
		}
		w.step(time.Duration(1+rng.IntN(100))*time.Millisecond, b...)
		if i%3000 == 2999 { // the state is lost and built anew
			w.e.beforeStep = func() { w.e.beforeStep = nil; panic("poisoned") }
		}
	}
}

// What is on record gives the same decisions again, to the bit, and shows in
// the order of duties.
func TestRecordReplays(t *testing.T) {
	r := withAircraft(siteRules())
	r.ByItself = closures.AllCodes
	w := newSite(t, r)
	busyNight(t, w, 7000)

	var state *closures.State
	var batch []closures.Fact
	var out []closures.Decision
	var begun *Begun
	sum := sha256.New()
	last := uint64(0)
	seen := map[string]int{}
	for _, e := range w.rec.entries {
		if e.Seq != last+1 {
			t.Fatalf("entry %d follows %d", e.Seq, last)
		}
		last = e.Seq
		switch c := e.What.(type) {
		case Begun:
			begun, batch = &c, nil
			seen["begun"]++
		case Kept:
			seen["kept"]++
			if begun != nil {
				s, err := closures.New(begun.Rules, begun.Boot, c.Durable)
				if err != nil {
					t.Fatal(err)
				}
				state, begun = s, nil
				sum.Reset()
				break
			}
			if d, _ := state.Durable(); !cmp.Equal(d, c.Durable, cmpopts.EquateNaNs(), cmp.Comparer(func(a, b *closures.List) bool { return a == b })) {
				t.Fatalf("entry %d: what is kept differs: %v", e.Seq, cmp.Diff(d, c.Durable, cmpopts.EquateNaNs(), cmp.Comparer(func(a, b *closures.List) bool { return a == b })))
			}
		case Admitted:
			if c.Fact.Seq != e.Seq {
				t.Fatalf("entry %d holds fact %d", e.Seq, c.Fact.Seq)
			}
			batch = append(batch, c.Fact)
			if _, tick := c.Fact.Body.(closures.Tick); tick {
				out = state.Step(batch, c.Fact.At, nil)
				batch = nil
				for i := range out {
					sum.Write(wire.AppendDecision(nil, &out[i]))
				}
			}
		case Decided:
			seen["decided"]++
			if !cmp.Equal(out[0], c.Decision, cmpopts.EquateNaNs()) {
				t.Fatalf("entry %d: replayed otherwise: %s", e.Seq, cmp.Diff(out[0], c.Decision, cmpopts.EquateNaNs()))
			}
		case Granted:
			seen["granted"]++
			if !out[0].Open || c.Opening >= out[0].Seq {
				t.Fatalf("entry %d: granted %+v on %+v", e.Seq, c, out[0])
			}
		case Tallied:
			seen["tallied"]++
			if got := closures.Digest(sum.Sum(nil)); got != c.Sum {
				t.Fatalf("entry %d: the tally differs", e.Seq)
			}
			sum.Reset()
		}
	}
	if seen["begun"] != 3 || seen["decided"] < 50 || seen["granted"] < 10 || seen["tallied"] < 2 || seen["kept"] < 15 {
		t.Errorf("the night was too quiet: %v", seen)
	}
}

// A kill at any instant loses nothing that was answered, and no latch.
func TestRestart(t *testing.T) {
	r := siteRules()
	r.ByItself = closures.AllCodes.Without(closures.CodeInterlock)
	w := newSite(t, r).opened()
	w.step(100 * time.Millisecond)
	at, _ := w.clock.Read()
	w.step(100*time.Millisecond, hold("h-1"), hold("h-2"))
	w.step(100 * time.Millisecond)
	w.step(time.Millisecond, unsafe(at.Add(202*time.Millisecond)))
	if _, err := w.s.Submit("console", closures.HoldReleased{ID: "h-2", By: "ana"}); err != nil {
		t.Fatal(err)
	}

	whole := w.rec.entries
	for cutAt := len(whole); cutAt > 0; cutAt-- {
		rec := whole[:cutAt]
		d, after, sawHold, sawLatch, sawRelease := recall(t, r, rec)
		at := rec[len(rec)-1].At
		next := newSite(t, r, func(o *Options) { o.Durable, o.After, o.Boot = d, after, closures.Boot{ID: "boot-2", At: at} })
		next.clock.wall = at
		v, err := next.s.Turn()
		if err != nil {
			t.Fatal(err)
		}
		mustShut(t, v.Beams[0], closures.CodeStarting)
		has := func(id closures.HoldID) bool {
			for _, h := range v.Holds {
				if h.ID == id {
					return true
				}
			}
			return false
		}
		if has("h-1") != sawHold || has("h-2") != (sawHold && !sawRelease) {
			t.Fatalf("cut at %d: holds %+v, on record %v, released %v", cutAt, v.Holds, sawHold, sawRelease)
		}
		if sawLatch != v.Known.Beams[0].Need.Has(closures.CodeInterlock) && sawLatch {
			t.Fatalf("cut at %d: the latch is forgotten", cutAt)
		}
		if first := next.rec.entries[0]; first.Seq != after+1 {
			t.Fatalf("the numbers go on at %d after %d", first.Seq, after)
		}
		// The record of the restart tells what it started from.
		if b, ok := next.rec.entries[0].What.(Begun); !ok || b.Boot.ID != "boot-2" {
			t.Fatalf("first entry: %+v", next.rec.entries[0])
		}
		if _, ok := next.rec.entries[1].What.(Kept); !ok {
			t.Fatalf("second entry: %+v", next.rec.entries[1])
		}
	}
}

// recall does what a start does with a record.
func recall(t *testing.T, r *closures.Rules, rec []Entry) (d closures.Durable, after uint64, sawHold, sawLatch, sawRelease bool) {
	t.Helper()
	from := 0
	for i, e := range rec {
		after = e.Seq
		switch c := e.What.(type) {
		case Kept:
			d, from = c.Durable, i+1
		case Admitted:
			switch b := c.Fact.Body.(type) {
			case closures.HoldPlaced:
				if b.ID == "h-2" { // the second of the pair
					sawHold = true
				}
			case closures.HoldReleased:
				sawRelease = true
			}
		case Decided:
			if c.Decision.Codes.Has(closures.CodeInterlock) {
				sawLatch = true
			}
		}
	}
	d, err := Restore(r, d, rec[from:])
	if err != nil {
		t.Fatal(err)
	}
	// Where only the first hold of a batch is on record it must be there too.
	if n := len(d.Holds); n == 1 && !sawHold && d.Holds[0].ID == "h-1" {
		d.Holds = nil
	}
	return d, after, sawHold, sawLatch, sawRelease
}

// Positive knowledge does not outlive a restart, tracks and sightings do.
func TestRestoreKeepsWhatCloses(t *testing.T) {
	r := withAircraft(siteRules())
	w := newSite(t, r).opened()
	at, _ := w.clock.Read()
	p := r.Site.Position.Offset(w.local.Mul(7000)) // in the beam
	w.step(10*time.Millisecond,
		closures.AircraftSeen{Source: "rx-1", Said: at, Aircraft: "400001", Located: true, Position: p, AltitudeFrom: closures.AboveEllipsoid, Speed: 200},
		closures.Sighted{Source: "spotter", Said: at, For: time.Minute})
	from := 0
	var kept closures.Durable
	for i, e := range w.rec.entries {
		if c, ok := e.What.(Kept); ok && len(c.Durable.Tracks) == 0 {
			kept, from = c.Durable, i+1 // the newest that does not know of them yet
		}
	}
	d, err := Restore(r, kept, w.rec.entries[from:])
	if err != nil {
		t.Fatal(err)
	}
	if len(d.Tracks) != 1 || d.Tracks[0].Seen.Aircraft != "400001" || len(d.Sightings) != 1 || len(d.Lists) != 1 {
		t.Fatalf("restored: %+v", d)
	}
	next := newSite(t, r, func(o *Options) { o.Durable = d })
	next.clock.wall = at.Add(time.Second)
	b := next.step(0)
	mustShut(t, b, closures.CodeAircraft)
	mustShut(t, b, closures.CodeSighting)
}

func TestKeptAndTalliedOnceAMinute(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	before := len(what[Kept](w.rec))
	for range 6 * 60 * 3 {
		w.step(500 * time.Millisecond / 3)
	}
	kept, tallied := len(what[Kept](w.rec))-before, what[Tallied](w.rec)
	if kept != 3 || len(tallied) != 3 {
		t.Errorf("in three quiet minutes %d kept and %d tallied", kept, len(tallied))
	}
	for i, c := range tallied {
		if c.Count < 300 || c.To <= c.From || i > 0 && c.From <= tallied[i-1].To {
			t.Errorf("tally: %+v", c)
		}
	}
	if d := what[Decided](w.rec); len(d) > 20 {
		t.Errorf("%d decisions on record of a quiet time", len(d))
	}
}

func TestNightsComeInTime(t *testing.T) {
	w := newSite(t, siteRules())
	w.step(0)
	has := func() (hours []int) {
		at, _ := w.clock.Read()
		for _, n := range w.e.View().Nights {
			mid := n.Covers().From.Add(n.Covers().Until.Sub(n.Covers().From) / 2)
			hours = append(hours, int(mid.Sub(at).Round(time.Hour).Hours()))
		}
		return hours
	}
	if got := has(); len(got) != 5 || got[0] > -6 || got[4] < 36 {
		t.Fatalf("nights at the start: %v h from now", got)
	}
	for range 5 {
		w.clock.advance(12 * time.Hour)
		w.step(0)
		if got := has(); len(got) < 5 || got[len(got)-1] < 36 {
			t.Fatalf("nights: %v h from now", got)
		}
	}
}
