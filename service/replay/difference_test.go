package replay_test

import (
	"bytes"
	"context"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
	"beamward/service/replay"
)

// quiet is a short record of a site that opens, is held, and opens again.
func quiet(t testing.TB) (slab, replay.Options) {
	t.Helper()
	quietOnce.Do(func() {
		w := newWorld(t, 7, siteText(t))
		w.opened()
		w.calm(4 * time.Second)
		_, err := w.s.Submit("console", closures.HoldPlaced{ID: "h-1", Beam: closures.EveryBeam, Reason: "check of the optics", By: "ana", Placed: w.clock.Wall()})
		w.must(err)
		w.holds = append(w.holds, "h-1")
		for range 10 {
			w.steady(nil)
			w.turn(100 * time.Millisecond)
		}
		w.calm(70 * time.Second)
		w.must(w.s.Close())
		quietRecord = taken(t, w.j.Reader)
		quietOptions = replay.Options{Texts: given(w.cfg.Rules), Build: thisBuild}
		quietOptions.Texts.List = func(d closures.Digest) (*closures.List, error) { return w.given[d], nil }
	})
	return quietRecord, quietOptions
}

// It is made once: the store takes its time.
var (
	quietOnce    sync.Once
	quietRecord  slab
	quietOptions replay.Options
)

func replayed(t testing.TB, src replay.Source, opt replay.Options) replay.Report {
	t.Helper()
	rep, err := replay.Replay(context.Background(), src, replay.Range{}, opt)
	if err != nil {
		t.Fatal(err)
	}
	return rep
}

// one asks for exactly one difference.
func one(t testing.TB, rep replay.Report) *replay.Difference {
	t.Helper()
	if len(rep.Differences) != 1 || rep.Different != 1 || rep.Identical() {
		t.Fatalf("%d differences, want 1: %+v", rep.Different, rep.Differences)
	}
	return &rep.Differences[0]
}

// Whatever is changed on record is found at its place.
func TestEachChangeIsFound(t *testing.T) {
	record, opt := quiet(t)
	if rep := replayed(t, record, opt); !rep.Identical() || rep.Granted < 2 || rep.Tallies == 0 || !rep.Ended {
		t.Fatalf("the record as it is: %+v", rep)
	}
	end := record[len(record)-1].Seq
	shut := record.last(t, end, func(e *journal.Entry) bool {
		return e.Kind == wire.KindDecision && !decoded(t, e).Open
	})
	replace := func(from, to string) func(*journal.Entry) {
		return func(e *journal.Entry) {
			b := bytes.Replace(e.Body, []byte(from), []byte(to), 1)
			if bytes.Equal(b, e.Body) {
				t.Fatalf("entry %d holds no %s: %s", e.Seq, from, e.Body)
			}
			e.Body = b
		}
	}
	for name, c := range map[string]struct {
		at     int
		change func(*journal.Entry)
		want   string // within the difference
		late   bool   // it shows in a later entry
	}{
		"a decision is flipped": {at: shut, want: ": the decision, beam south, codes: recorded nothing, replayed [", change: func(e *journal.Entry) {
			d := decoded(t, e)
			d.Open, d.Codes, d.Reasons = true, 0, nil
			mustEncode(t, e, &d)
		}},
		"the last bit of an age": {at: shut, want: "inputs[2].age_ns: recorded 100000001, replayed 100000000", change: func(e *journal.Entry) {
			d := decoded(t, e)
			d.Inputs[2].Age++
			mustEncode(t, e, &d)
		}},
		"a tally":                     {at: record.last(t, end, ofKind(replay.KindTallied)), change: replace(`"count":`, `"count":1`), want: "count: recorded 1"},
		"a tally's sum":               {at: record.last(t, end, ofKind(replay.KindTallied)), change: replace(`"sum":"sha256:`, `"sum":"sha256:0`), want: "sum: recorded sha256:0"},
		"what a restart rests on":     {at: record.last(t, end, ofKind(journal.KindDurable)), change: replace(`{"beam":"north"}`, `{"beam":"north","shutter_time_ns":5}`), want: "what a restart would rest on"},
		"a hold's word":               {at: record.last(t, end, ofKind(wire.KindHold)), change: replace("optics", "optocs"), want: `holds[0].reason: recorded "check of the optics", replayed "check of the optocs"`, late: true},
		"a hold that was never there": {at: record.last(t, end, ofKind(wire.KindHold)), change: replace(`"beam":"*"`, `"beam":"north"`), want: "the decision", late: true},
		"an interlock's word":         {at: record.last(t, end-3000, ofKind(wire.KindInterlock)), change: replace(`,"safe":true`, ""), want: "a decision that changed is not on record", late: true},
		"an instant":                  {at: record.last(t, end-3000, ofKind(wire.KindTick)), change: func(e *journal.Entry) { e.At = e.At.Add(1) }, want: "the tally of the decisions", late: true},
		"a grant's opening":           {at: record.last(t, end, ofKind(replay.KindGranted)), change: replace(`"opening":`, `"opening":1`), want: "an opening was granted that is not on record"},
		"a grant's step":              {at: record.last(t, end, ofKind(replay.KindGranted)), change: replace(`"seq":`, `"seq":1`), want: "an opening was granted by a step that is not the newest"},
	} {
		t.Run(name, func(t *testing.T) {
			d := one(t, replayed(t, record.with(c.at, c.change), opt))
			if !c.late && d.Seq != record[c.at].Seq || c.late && d.Seq <= record[c.at].Seq {
				t.Errorf("found at entry %d, changed at %d", d.Seq, record[c.at].Seq)
			}
			if !strings.Contains(d.String(), c.want) {
				t.Errorf("%s\nwant in it: %s", d.String(), c.want)
			}
		})
	}
	t.Run("an entry is gone", func(t *testing.T) {
		i := record.last(t, end-1000, ofKind(wire.KindAim))
		d := one(t, replayed(t, slices.Delete(slices.Clone(record), i, i+1), opt))
		if d.Seq != record[i+1].Seq || !strings.Contains(d.What, "entries before it are not on record") {
			t.Error(d.String())
		}
	})
	t.Run("an entry cannot be read", func(t *testing.T) {
		i := record.last(t, end-1000, ofKind(wire.KindAim))
		_, err := replay.Replay(context.Background(), record.with(i, replace(`"said"`, `"siad"`)), replay.Range{}, opt)
		if err == nil || !strings.Contains(err.Error(), "reading entry") {
			t.Error(err)
		}
	})
}

// A batch that no tick ended was never applied, and what a kill cut off after
// a tick is not missed.
func TestCutShort(t *testing.T) {
	rules := parsed(t, siteText(t)).Rules
	opt := replay.Options{Texts: given(rules), Build: thisBuild}
	s := newScribe(t, rules, thisBuild, evening)
	s.step(evening, closures.Started{}, closures.ClockState{Synchronised: true})
	hold := closures.HoldPlaced{ID: "h-1", Beam: "north", By: "ana", Placed: evening}
	s.facts(evening.Add(time.Second), hold, closures.Rearmed{Beam: "north", By: "ana"})
	s.begin("boot-1", thisBuild, evening.Add(2*time.Second), closures.Durable{})
	s.step(evening.Add(3*time.Second), closures.Started{})
	s.alter = func(*closures.Decision) bool { return false }
	s.step(evening.Add(4*time.Second), hold)
	s.alter = nil
	s.begin("boot-2", thisBuild, evening.Add(5*time.Second), closures.Durable{Holds: []closures.HoldPlaced{hold}})
	s.step(evening.Add(6 * time.Second))
	rep := replayed(t, s.entries, opt)
	if !rep.Identical() || len(rep.Runs) != 3 || rep.Unapplied != 2 || rep.Steps != 4 {
		t.Fatalf("%+v", rep)
	}

	// Were it not cut short, they would be missed.
	s = newScribe(t, rules, thisBuild, evening)
	s.step(evening, closures.Started{})
	s.alter = func(d *closures.Decision) bool { return d.Beam != "north" }
	s.step(evening.Add(time.Second), hold)
	s.step(evening.Add(2*time.Second), closures.Veto{Beam: "south"})
	d := one(t, replayed(t, s.entries, opt))
	if d.Beam != "north" || d.What != "a decision that changed is not on record" {
		t.Error(d.String())
	}

	// A new run is compared again.
	s.alter = nil
	s.begin("boot-2", thisBuild, evening.Add(5*time.Second), closures.Durable{})
	s.step(evening.Add(6 * time.Second))
	s.alter = func(d *closures.Decision) bool { d.Open = true; return true }
	s.step(evening.Add(7*time.Second), hold)
	if rep := replayed(t, s.entries, opt); rep.Different != 2 || len(rep.Runs) != 2 {
		t.Errorf("%+v", rep)
	}
}

// Entries that change no decision are passed over where their kind is named,
// and refused where it is not.
func TestBeside(t *testing.T) {
	rules := parsed(t, siteText(t)).Rules
	opt := replay.Options{Texts: given(rules), Build: thisBuild}
	s := newScribe(t, rules, thisBuild, evening)
	s.step(evening, closures.Started{})
	note := s.put(evening, "note", []byte(`{"text":"the Moon rises"}`))
	s.step(evening.Add(time.Second))
	if _, err := replay.Replay(context.Background(), s.entries, replay.Range{}, opt); err == nil || !strings.Contains(err.Error(), "no fact has this kind") {
		t.Errorf("not named: %v", err)
	}
	opt.Beside = []string{"note"}
	if rep := replayed(t, s.entries, opt); !rep.Identical() || rep.Steps != 2 {
		t.Errorf("%+v", rep)
	}
	x, err := replay.Explain(context.Background(), s.entries, note, opt)
	if err != nil || x.What != "an entry that changes no decision" || string(x.Body) != `{"text":"the Moon rises"}` {
		t.Errorf("%v, %+v", err, x)
	}
}

// Another build's last digits are not a difference; another meaning is.
func TestOtherBuild(t *testing.T) {
	record, opt := quiet(t)
	opt.Build = "beamward another"
	rep := replayed(t, record, opt)
	if !rep.Identical() || rep.OtherBuild != uint64(len(rep.Runs)) || rep.Rounded != 0 || rep.Close != 0 {
		t.Fatalf("to the bit all the same: %+v", rep)
	}
	rounded := slices.Clone(record)
	n := uint64(0)
	for i := range rounded {
		if e := &rounded[i]; e.Kind == wire.KindDecision {
			d := decoded(t, e)
			for j := range d.Coming {
				d.Coming[j].Over.Until = d.Coming[j].Over.Until.Add(1)
			}
			if len(d.Coming) > 0 {
				n++
			}
			mustEncode(t, e, &d)
		}
	}
	if rep := replayed(t, rounded, opt); !rep.Identical() || rep.Rounded < n || rep.Close != 0 {
		t.Errorf("rounded: %d of %d: %+v", rep.Rounded, n, rep)
	}
	i := record.last(t, record[len(record)-1].Seq, func(e *journal.Entry) bool {
		return e.Kind == wire.KindDecision && !decoded(t, e).Open
	})
	d := one(t, replayed(t, record.with(i, func(e *journal.Entry) {
		d := decoded(t, e)
		d.Codes = d.Codes.With(closures.CodeDaylight)
		mustEncode(t, e, &d)
	}), opt))
	if d.Seq != record[i].Seq {
		t.Error(d.String())
	}
}
