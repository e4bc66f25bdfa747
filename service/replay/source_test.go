package replay_test

import (
	"bytes"
	"context"
	"errors"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/service/journal"
	"beamward/service/replay"
)

// twoRuns is a record of two runs, the first older than a day.
func twoRuns(t *testing.T) *world {
	w := newWorld(t, 11, siteText(t))
	w.opened()
	w.calm(3 * time.Second)
	w.stop()
	w.clock.Advance(24 * time.Hour)
	w.start()
	w.calm(3 * time.Second)
	w.flush()
	return w
}

func TestPrunedIsRefused(t *testing.T) {
	w := twoRuns(t)
	ctx := context.Background()
	opt := options(w.j.Reader)
	runs := w.identical().Runs
	if len(runs) != 2 {
		t.Fatalf("%d runs", len(runs))
	}
	if _, err := w.j.Prune(ctx, journal.Retention{Before: evening.Add(12 * time.Hour)}); err != nil {
		t.Fatal(err)
	}
	for name, part := range map[string]replay.Range{
		"the whole": {}, "by number": {From: 20, To: 40}, "by time": {Since: evening, Until: evening.Add(2 * time.Second)},
		"across": {From: 20}, "its end": {To: 10},
	} {
		rep, err := replay.Replay(ctx, w.j.Reader, part, opt)
		var refused *replay.RefusedError
		var gone *journal.PrunedError
		if !errors.As(err, &refused) || !errors.As(err, &gone) || refused.Next != runs[1].Seq || rep.Steps != 0 || rep.Identical() {
			t.Errorf("%s: %v, %+v", name, err, rep)
		}
		if err != nil && !strings.Contains(err.Error(), "ask for entries from") {
			t.Errorf("%s: %v", name, err)
		}
		for _, err := range replay.States(ctx, w.j.Reader, part, opt) {
			if !errors.As(err, &refused) {
				t.Errorf("%s: states: %v", name, err)
			}
		}
	}
	rep, err := replay.Replay(ctx, w.j.Reader, replay.Range{From: runs[1].Seq}, opt)
	if err != nil || !rep.Identical() || len(rep.Runs) != 1 || rep.First != runs[1].Seq {
		t.Errorf("what is left: %v, %+v", err, rep)
	}
	rep, err = replay.Replay(ctx, w.j.Reader, replay.Range{Since: evening.Add(24 * time.Hour)}, opt)
	if err != nil || !rep.Identical() || rep.First != runs[1].Seq {
		t.Errorf("what is left, by time: %v, %+v", err, rep)
	}
	w.stop()
}

// A range is replayed from the beginning of its run to its end.
func TestRange(t *testing.T) {
	w := twoRuns(t)
	ctx := context.Background()
	opt := options(w.j.Reader)
	whole := w.identical()
	second := whole.Runs[1].Seq
	for name, c := range map[string]struct {
		part        replay.Range
		first, last uint64
		runs        int
	}{
		"in the first run":  {replay.Range{From: 100, To: 120}, 1, 120, 1},
		"in the second":     {replay.Range{From: second + 50, To: second + 90}, second, second + 90, 1},
		"over both":         {replay.Range{From: 5, To: second + 10}, 1, second + 10, 2},
		"to the end":        {replay.Range{From: second + 1}, second, whole.Last, 1},
		"beyond the end":    {replay.Range{From: whole.Last + 100}, second, whole.Last, 1},
		"nothing by time":   {replay.Range{Since: evening.Add(time.Hour), Until: evening.Add(2 * time.Hour)}, 0, 0, 0},
		"nothing by number": {replay.Range{From: 10, To: 5}, 0, 0, 0},
	} {
		rep, err := replay.Replay(ctx, w.j.Reader, c.part, opt)
		if err != nil || rep.First != c.first || rep.Last != c.last || len(rep.Runs) != c.runs || rep.Different != 0 {
			t.Errorf("%s: %v, %+v", name, err, rep)
		}
	}
	ctx, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := replay.Replay(ctx, w.j.Reader, replay.Range{}, opt); !errors.Is(err, context.Canceled) {
		t.Errorf("a replay that nobody waits for: %v", err)
	}
	w.stop()
}

// States hands out what the engine decided, step by step.
func TestStates(t *testing.T) {
	w := newWorld(t, 5, siteText(t))
	var want []closures.Decision
	w.opened()
	for range 40 {
		w.steady(nil)
		w.fly(100 * time.Millisecond)
		v := w.turn(100 * time.Millisecond)
		w.flush()
		for _, b := range v.Beams {
			want = append(want, *b.Decision)
		}
	}
	ctx := context.Background()
	opt := options(w.j.Reader)
	at := make(map[uint64]closures.Decision)
	steps, granted := 0, 0
	since, until := evening.Add(500*time.Millisecond), evening.Add(4*time.Second)
	for s, err := range replay.States(ctx, w.j.Reader, replay.Range{Since: since, Until: until}, opt) {
		if err != nil {
			t.Fatal(err)
		}
		if s.At.Before(since) || !s.At.Before(until) || s.State == nil || s.Run.Seq != 1 || s.Lost != 0 || s.First {
			t.Fatalf("step %+v", s)
		}
		if n := len(s.Facts); s.Facts[n-1].Seq != s.Seq {
			t.Fatalf("the tick of step %d is not its last fact", s.Seq)
		}
		for _, d := range s.Decisions {
			if d.Beam == "north" {
				at[s.Seq] = d
			}
		}
		for _, r := range s.Recorded {
			if r.Granted {
				granted++
			}
		}
		steps++
	}
	n := 0
	for _, d := range want {
		if got, there := at[d.Seq]; there && d.Beam == "north" {
			n++
			if got.Open != d.Open && !d.Codes.Has(closures.CodeRecord) {
				t.Errorf("step %d: open %v, published %v", d.Seq, got.Open, d.Open)
			}
		}
	}
	if steps < 18 || n != steps || granted == 0 {
		t.Errorf("%d steps, %d compared, %d granted", steps, n, granted)
	}
	steps = 0
	for range replay.States(ctx, w.j.Reader, replay.Range{}, opt) {
		if steps++; steps == 3 {
			break
		}
	}
	if steps != 3 {
		t.Errorf("broke off after %d", steps)
	}
	w.stop()
}

func exported(t *testing.T, r *journal.Reader, q journal.Query) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := r.Export(context.Background(), &b, q); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// An export gives the same entries as the record, and replays alike.
func TestExport(t *testing.T) {
	w := twoRuns(t)
	ctx := context.Background()
	opt := options(w.j.Reader)
	text := exported(t, w.j.Reader, journal.Query{})
	x, err := replay.OpenExport(ctx, bytes.NewReader(text))
	if err != nil {
		t.Fatal(err)
	}
	_, head, err := w.j.Head(ctx)
	w.must(err)
	if x.Head() != head.String() {
		t.Errorf("head %s, want %s", x.Head(), head)
	}
	last := uint64(len(taken(t, w.j.Reader)))
	for name, q := range map[string]journal.Query{
		"all": {}, "newest first": {NewestFirst: true}, "some": {From: 40, To: 300, Kinds: []string{"tick", "aim"}},
		"by time": {Since: evening.Add(time.Second), Until: evening.Add(2 * time.Second)}, "the last start": {To: last, Kinds: []string{replay.KindBegun}, NewestFirst: true},
		"none": {Kinds: []string{"none"}}, "the next day": {Since: evening.Add(20 * time.Hour), NewestFirst: true},
	} {
		all := func(s replay.Source) (out slab) {
			w.must(s.Read(ctx, q, func(e journal.Entry) error {
				out = append(out, e)
				return nil
			}))
			return out
		}
		want, got := all(w.j.Reader), all(x)
		if len(want) != len(got) {
			t.Errorf("%s: %d entries, want %d", name, len(got), len(want))
			continue
		}
		for i := range want {
			a, b := want[i], got[i]
			if a.Seq != b.Seq || !a.At.Equal(b.At) || a.Kind != b.Kind || !bytes.Equal(a.Body, b.Body) {
				t.Fatalf("%s: entry %d: %+v, want %+v", name, i, b, a)
			}
		}
	}
	rep, err := replay.Replay(ctx, x, replay.Range{}, opt)
	if err != nil || !rep.Identical() || rep.Entries != last {
		t.Errorf("%v, %+v", err, rep)
	}

	for name, change := range map[string]func([]byte) []byte{
		"a word": func(b []byte) []byte {
			return bytes.Replace(b, []byte(`\"from\":\"encoder\"`), []byte(`\"from\":\"encodar\"`), 1)
		},
		"an instant": func(b []byte) []byte {
			return bytes.Replace(b, []byte(`"at":"2031-02-14T01:00:00.1Z"`), []byte(`"at":"2031-02-14T01:00:00.2Z"`), 1)
		},
		"its end":       func(b []byte) []byte { return b[:len(b)-len(b)/3] },
		"a line":        func(b []byte) []byte { return append(b[:200:200], b[600:]...) },
		"a block's sum": func(b []byte) []byte { return bytes.Replace(b, []byte(`"at_max_us":1`), []byte(`"at_max_us":2`), 1) },
		"a stranger":    func([]byte) []byte { return []byte("{\"beamward_record\":2,\"chain\":\"\"}\n") },
		"nothing":       func([]byte) []byte { return nil },
	} {
		b := change(bytes.Clone(text))
		if bytes.Equal(b, text) {
			t.Fatalf("%s: nothing was changed", name)
		}
		if _, err := replay.OpenExport(ctx, bytes.NewReader(b)); err == nil || !strings.Contains(err.Error(), "line ") {
			t.Errorf("%s: %v", name, err)
		}
	}

	// A part, and a record that was pruned.
	part := exported(t, w.j.Reader, journal.Query{From: rep.Runs[1].Seq})
	if x, err = replay.OpenExport(ctx, bytes.NewReader(part)); err != nil {
		t.Fatal(err)
	}
	rep, err = replay.Replay(ctx, x, replay.Range{}, opt)
	if err != nil || !rep.Identical() || len(rep.Runs) != 1 {
		t.Errorf("a part: %v, %+v", err, rep)
	}
	if _, err := w.j.Prune(ctx, journal.Retention{Before: evening.Add(12 * time.Hour)}); err != nil {
		t.Fatal(err)
	}
	if x, err = replay.OpenExport(ctx, bytes.NewReader(exported(t, w.j.Reader, journal.Query{}))); err != nil {
		t.Fatal(err)
	}
	var refused *replay.RefusedError
	if _, err = replay.Replay(ctx, x, replay.Range{}, opt); !errors.As(err, &refused) || refused.Next == 0 {
		t.Errorf("pruned: %v", err)
	}
	w.stop()
}
