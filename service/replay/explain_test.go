package replay_test

import (
	"context"
	"encoding/json"
	"errors"
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
	"beamward/service/replay"
)

var update = flag.Bool("update", false, "write the golden texts anew")

// long are numbers with more digits than another way to compute them keeps.
var long = regexp.MustCompile(`-?\d+\.\d{9,}(e-?\d+)?`)

// golden compares to nine digits.
func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	got = long.ReplaceAllFunc(got, func(b []byte) []byte {
		v, err := strconv.ParseFloat(string(b), 64)
		if err != nil {
			t.Fatal(err)
		}
		return strconv.AppendFloat(nil, v, 'g', 9, 64)
	})
	path := filepath.Join("testdata", "explain", name)
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(want), string(got)); d != "" {
		t.Errorf("%s: -want +got, written anew with -update:\n%s", name, d)
	}
}

// Each kind of entry explained, in words, and two of them as JSON.
func TestExplainGolden(t *testing.T) {
	s := whole(t)
	for _, name := range []string{
		"start", "open", "steady", "granted", "until", "aircraft", "many", "rearm", "list", "refused", "confirmed", "report", "hold", "released", "rearmed",
		"begun", "durable", "tallied", "gap", "after-gap", "unapplied", "ended",
	} {
		x, err := replay.Explain(context.Background(), s.entries, s.named[name], replay.Options{Texts: s.texts(), Build: thisBuild})
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		golden(t, name+".txt", []byte(x.Words()))
		if name == "many" || name == "hold" {
			b, err := json.MarshalIndent(x, "", " ")
			if err != nil {
				t.Fatal(err)
			}
			golden(t, name+".json", append(b, '\n'))
		}
	}
	for _, name := range []string{"late", "late-tick"} {
		x, err := replay.Explain(context.Background(), s.entries, s.named[name], replay.Options{Texts: s.texts(), Build: thisBuild, Near: 10})
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		golden(t, name+".txt", []byte(x.Words()))
	}
}

// Amid a run, what an explanation tells is what one from the beginning tells,
// but for what only the beginning knows.
func TestExplainAmidARun(t *testing.T) {
	s := whole(t)
	ctx := context.Background()
	opt := replay.Options{Texts: s.texts(), Build: thisBuild}
	far, err := replay.Explain(ctx, s.entries, s.named["late"], opt)
	if err != nil {
		t.Fatal(err)
	}
	opt.Near = 10
	near, err := replay.Explain(ctx, s.entries, s.named["late"], opt)
	if err != nil {
		t.Fatal(err)
	}
	if !far.Replayed.Whole || near.Replayed.Whole || near.Replayed.From == 0 || near.Replayed.Entries >= far.Replayed.Entries {
		t.Fatalf("far %+v\nnear %+v", far.Replayed, near.Replayed)
	}
	if far.Replayed.Identical == nil || !*far.Replayed.Identical {
		t.Errorf("from the beginning it is not identical: %s", far.Replayed.Differs)
	}
	for i := range near.Beams[0].Checks {
		c := &near.Beams[0].Checks[i]
		if c.Margin == nil {
			switch c.Code {
			case "shutter-fault", "starting", "reopening", "rearm":
				far.Beams[0].Checks[i].Margin = nil
			}
		}
		for j := range c.Findings { // an entry before the beginning is not named
			if c.Findings[j].RestsOn == 0 {
				far.Beams[0].Checks[i].Findings[j].RestsOn = 0
			}
		}
	}
	for i := range near.Beams[0].Inputs {
		if near.Beams[0].Inputs[i].RestsOn == 0 {
			far.Beams[0].Inputs[i].RestsOn = 0
		}
	}
	near.Replayed, far.Replayed = replay.ReplayedTold{}, replay.ReplayedTold{}
	if d := cmp.Diff(far, near); d != "" {
		t.Errorf("-far +near:\n%s", d)
	}
}

// Every decision that the real engine recorded is explained, and the replay
// gives it to the bit.
func TestExplainWhatTheEngineRecorded(t *testing.T) {
	w := newWorld(t, 21, siteText(t))
	w.opened()
	w.calm(3 * time.Second)
	w.wander(10*time.Second, 2)
	w.calm(2 * time.Second)
	ctx := context.Background()
	opt := options(w.j.Reader)
	record := taken(t, w.j.Reader)
	explained := map[string]int{}
	step := 1
	if raceOn {
		step = 7
	}
	for i, e := range record {
		if e.Kind != wire.KindDecision && explained[e.Kind] > 8 || i%step != 0 {
			continue
		}
		x, err := replay.Explain(ctx, record, e.Seq, opt)
		if err != nil {
			t.Fatalf("entry %d, %s: %v", e.Seq, e.Kind, err)
		}
		explained[e.Kind]++
		if text := x.Words(); !strings.Contains(text, x.What) || strings.Contains(text, "%!") {
			t.Fatalf("entry %d: %s", e.Seq, text)
		}
		if b, err := json.Marshal(x); err != nil || !json.Valid(b) {
			t.Fatalf("entry %d: %v", e.Seq, err)
		}
		if e.Kind != wire.KindDecision {
			continue
		}
		d := decoded(t, &e)
		b := &x.Beams[0]
		if len(x.Beams) != 1 || b.Beam != d.Beam || b.State == "open" != d.Open || x.Replayed.Identical == nil || !*x.Replayed.Identical {
			t.Fatalf("entry %d: %s", e.Seq, x.Words())
		}
		for c := closures.Code(0); c < closures.NumCodes; c++ {
			if told := b.Checks[c]; told.Code != c.String() || (told.Verdict == "clear") == d.Codes.Has(c) {
				t.Errorf("entry %d: check %+v of %v", e.Seq, told, d.Codes.Names())
			}
		}
	}
	if len(explained) < 15 {
		t.Errorf("only these kinds were explained: %v", explained)
	}
	t.Log(explained)
	w.stop()
}

// A changed record shows in the explanation.
func TestExplainSaysWhatDiffers(t *testing.T) {
	s := whole(t)
	i := s.entries.last(t, s.named["many"]+1, ofKind(wire.KindDecision))
	bad := s.entries.with(i, func(e *journal.Entry) {
		d := decoded(t, e)
		d.Reasons = d.Reasons[1:]
		mustEncode(t, e, &d)
	})
	x, err := replay.Explain(context.Background(), bad, s.named["many"], replay.Options{Texts: s.texts(), Build: thisBuild})
	if err != nil || *x.Replayed.Identical || !strings.HasPrefix(x.Replayed.Differs, "reasons[0].") {
		t.Errorf("%v, %+v", err, x.Replayed)
	}
}

func TestExplainRefuses(t *testing.T) {
	s := whole(t)
	ctx := context.Background()
	opt := replay.Options{Texts: s.texts(), Build: thisBuild}
	for seq, want := range map[uint64]string{
		s.named["gap"] - 5: "did not fit the record's queue",
		s.seq + 1:          "no such entry is on record",
	} {
		if _, err := replay.Explain(ctx, s.entries, seq, opt); !errors.Is(err, replay.ErrNoEntry) || !strings.Contains(err.Error(), want) {
			t.Errorf("entry %d: %v", seq, err)
		}
	}

	w := twoRuns(t)
	runs := w.identical().Runs
	if _, err := w.j.Prune(ctx, journal.Retention{Before: evening.Add(12 * time.Hour)}); err != nil {
		t.Fatal(err)
	}
	var refused *replay.RefusedError
	if _, err := replay.Explain(ctx, w.j.Reader, 20, options(w.j.Reader)); !errors.As(err, &refused) || refused.Next != runs[1].Seq {
		t.Errorf("a pruned entry: %v", err)
	}
	w.stop()
}

// Where the run's beginning is pruned, what is on record is told all the same.
func TestExplainWithoutTheBeginning(t *testing.T) {
	s := whole(t)
	opt := replay.Options{Texts: s.texts(), Build: thisBuild}
	for name, c := range map[string]struct {
		from uint64
		want string
	}{
		"the seconds before are there": {s.named["rearmed"], "Replayed from entry"},
		"nothing before is there":      {s.named["late-tick"] - 3, "Not replayed: the run's beginning is pruned"},
	} {
		x, err := replay.Explain(context.Background(), pruned{s.entries, c.from}, s.named["late"], opt)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		text := x.Words()
		if !strings.Contains(text, c.want) || !strings.Contains(text, "a person holds the beam") || x.Beams[0].State != "shuttered" || x.Run != nil {
			t.Errorf("%s: %s", name, text)
		}
	}
}

// pruned is a record whose entries before a number are gone.
type pruned struct {
	slab
	from uint64
}

func (p pruned) Read(ctx context.Context, q journal.Query, yield func(journal.Entry) error) error {
	gone := &journal.PrunedError{First: 1, Last: p.from - 1}
	if !q.NewestFirst && q.From < p.from {
		return gone
	}
	stopped := false
	err := p.slab.Read(ctx, q, func(e journal.Entry) error {
		if e.Seq < p.from {
			return gone
		}
		err := yield(e)
		stopped = errors.Is(err, journal.ErrStop)
		return err
	})
	if err == nil && !stopped && q.NewestFirst && q.From < p.from {
		return gone
	}
	return err
}
