package journal

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// later is a time after every entry of small.
var later = evening.Add(24 * time.Hour)

func TestPruneKeepsWhatARestartNeeds(t *testing.T) {
	dir, all := small(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	if p, err := j.Prune(ctx, Retention{}); err != nil || p != (Pruned{}) {
		t.Fatalf("the zero retention took %+v, %v", p, err)
	}
	// Blocks 1..16 lie before the block of the newest durable entry, 17..20.
	// Block 13 holds nothing newest; the newest hold is behind it.
	p, err := j.Prune(ctx, Retention{Before: all[10].At, DropLists: true, KeepLists: []string{"sha256:0"}})
	must(t, err)
	if p != (Pruned{Blocks: 2, Entries: 8}) {
		t.Fatalf("up to the eleventh entry: %+v", p)
	}
	p, err = j.Prune(ctx, Retention{Before: later, DropLists: true, KeepLists: []string{"sha256:0"}})
	must(t, err)
	if p != (Pruned{Blocks: 2, Entries: 8, Lists: 1}) {
		t.Fatalf("everything that may go: %+v", p)
	}
	rep, err := j.Verify(ctx, nil)
	if err != nil || rep.Damage != nil || rep.Blocks != 6 || rep.Pruned != 4 || rep.Gone != 16 || rep.Entries != 8 || rep.Lists != 2 {
		t.Fatalf("verify: %+v %v", rep, err)
	}
	var gone *PrunedError
	if err := j.Read(ctx, Query{}, func(Entry) error { return nil }); !errors.As(err, &gone) || gone.First != 1 {
		t.Fatalf("reading over it: %v", err)
	}
	var said []uint64
	same(t, readAll(t, j.Reader, Query{Pruned: func(first, _ uint64, _ int) error {
		said = append(said, first)
		return nil
	}}), all[16:])
	if fmt.Sprint(said) != "[1 5 9 13]" {
		t.Fatalf("told of %v", said)
	}
	if _, err := j.List(ctx, "sha256:1"); !errors.As(err, &gone) {
		t.Fatalf("a text that went: %v", err)
	}
	if _, err := j.List(ctx, "sha256:0"); err != nil {
		t.Fatalf("a text that stays: %v", err)
	}
	must(t, j.Close())
	j = mustOpen(t, Options{Dir: dir})
	if s := j.State(); !s.Sound || s.Durable != 24 {
		t.Fatalf("opened after pruning: %+v", s)
	}
	// A text that went is recorded again when it comes again, and then kept.
	b, err := Pack("sha256:1", []byte("a list a list "))
	must(t, err)
	must(t, j.Append(entries(25, 25, "aim"), b))
	must(t, j.Append([]Entry{entry(26, KindDurable)}, b))
	must(t, j.Flush(ctx))
	if text, err := j.List(ctx, "sha256:1"); err != nil || string(text) != "a list a list " {
		t.Fatalf("recorded again: %q %v", text, err)
	}
	if p, err := j.Prune(ctx, Retention{Before: later, DropLists: true}); err != nil || p.Lists != 2 {
		t.Fatalf("pruned %+v, %v", p, err)
	}
	if _, err := j.List(ctx, "sha256:1"); err != nil {
		t.Fatalf("recorded again and pruned: %v", err)
	}
	if rep, err := j.Verify(ctx, nil); err != nil || rep.Damage != nil {
		t.Fatalf("verify: %+v %v", rep, err)
	}
	other, err := Pack("sha256:1", []byte("another list"))
	must(t, err)
	if err := j.Append(entries(27, 27, "aim"), other); !errors.Is(err, ErrConflict) {
		t.Fatalf("another text under one digest: %v", err)
	}
}

func TestPruneKeepsKinds(t *testing.T) {
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	for seq, kind := range []string{"sighting", "aim", "hold", "aim", KindDurable, "aim"} {
		must(t, j.Append([]Entry{entry(uint64(seq+1), kind)}))
		must(t, j.Flush(ctx))
	}
	p, err := j.Prune(ctx, Retention{Before: later, KeepKinds: []string{"hold", "unheard-of"}})
	must(t, err)
	if p.Blocks != 3 {
		t.Fatalf("pruned %+v", p)
	}
	if e, ok, err := j.LastOf(ctx, "hold"); err != nil || !ok || e.Seq != 3 {
		t.Fatalf("kept hold: %v %v %v", e, ok, err)
	}
	var gone *PrunedError
	if _, _, err := j.LastOf(ctx, "sighting"); !errors.As(err, &gone) {
		t.Fatalf("pruned sighting: %v", err)
	}
}

func TestPruneWithoutDurableTakesNothing(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	must(t, j.Append(entries(1, 10, "aim")))
	must(t, j.Flush(context.Background()))
	if p, err := j.Prune(context.Background(), Retention{Before: later}); err != nil || p != (Pruned{}) {
		t.Fatalf("%+v %v", p, err)
	}
}

func TestPruneStopsAtDamageAndFault(t *testing.T) {
	dir, _ := small(t)
	db := surgery(t, dir)
	alter(t, db, `UPDATE block SET body = x'00' WHERE first = 9`)
	must(t, db.Close())
	f := &faults{op: "prune", times: 1, err: errDisk}
	j := mustOpen(t, Options{Dir: dir, Fault: f.fault})
	ctx := context.Background()
	if p, err := j.Prune(ctx, Retention{Before: evening.Add(85 * time.Millisecond)}); !errors.Is(err, errDisk) || p.Blocks != 0 {
		t.Fatalf("with a broken store: %+v %v", p, err)
	}
	p, err := j.Prune(ctx, Retention{Before: evening.Add(85 * time.Millisecond)})
	if err != nil || p.Blocks != 2 {
		t.Fatalf("before the damage: %+v %v", p, err)
	}
	var d *Damage
	if _, err := j.Prune(ctx, Retention{Before: later}); !errors.As(err, &d) || d.First != 9 {
		t.Fatalf("at the damage: %v", err)
	}
	// Writing goes on after a failed pruning.
	must(t, j.Append(entries(25, 25, "aim")))
	must(t, j.Flush(ctx))
}

func TestBackupAndRestore(t *testing.T) {
	dir, all := small(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	copied := filepath.Join(t.TempDir(), "copy.db")
	must(t, j.Backup(ctx, copied))
	if err := j.Backup(ctx, copied); err == nil {
		t.Fatal("a backup replaced another file")
	}
	if info, err := os.Stat(copied); err != nil || info.Mode().Perm() != 0o600 {
		t.Fatalf("mode of the copy: %v %v", info.Mode(), err)
	}
	if _, err := os.Stat(copied + ".part"); !errors.Is(err, os.ErrNotExist) {
		t.Fatalf("left over: %v", err)
	}
	must(t, j.Append(entries(25, 30, "aim"))) // after the backup
	must(t, j.Flush(ctx))

	fresh := place(t)
	must(t, os.Mkdir(fresh, 0o700))
	b, err := os.ReadFile(copied)
	must(t, err)
	must(t, os.WriteFile(filepath.Join(fresh, File), b, 0o644))
	r := mustOpen(t, Options{Dir: fresh})
	if s := r.State(); !s.Sound || s.Durable != 24 {
		t.Fatalf("restored: %+v", s)
	}
	same(t, readAll(t, r.Reader, Query{}), all)
	must(t, r.Append(entries(25, 26, "hold")))
	must(t, r.Flush(ctx))
	if rep, err := r.Verify(ctx, nil); err != nil || rep.Damage != nil || rep.Last != 26 {
		t.Fatalf("verify: %+v %v", rep, err)
	}
	if info, err := os.Stat(filepath.Join(fresh, File)); err != nil || info.Mode().Perm() != 0o600 {
		t.Fatalf("mode of the restored file: %v %v", info.Mode(), err)
	}
	if err := j.Backup(ctx, filepath.Join(dir, "no", "such", "folder")); err == nil {
		t.Fatal("a backup into a folder that is not there")
	}
}

// Any choice of Read is the same as choosing among all entries one by one.
func TestReadAgreesWithSlowTwin(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	kinds := []string{"aim", "hold", "aircraft", "tick", KindDurable}
	for n := range 70 { // more kinds than there are bits
		kinds = append(kinds, fmt.Sprint("kind-", n))
	}
	var all []Entry
	seq := uint64(0)
	at := evening
	for n := range 600 { // more blocks than a page
		for i := range 1 + n%3 {
			seq += uint64(1 + n%2)
			at = at.Add(time.Duration(n%7-2) * 700 * time.Millisecond) // now and then backwards
			all = append(all, Entry{Seq: seq, At: at, Kind: kinds[(n*n+i)%len(kinds)], Body: []byte("{}")})
			must(t, j.Append(all[len(all)-1:]))
		}
		must(t, j.Flush(context.Background()))
	}
	for _, q := range []Query{{}, {NewestFirst: true}} {
		if got := readAll(t, j.Reader, q); len(got) != len(all) {
			t.Fatalf("%+v gave %d of %d", q, len(got), len(all))
		}
	}
	rapid.Check(t, func(rt *rapid.T) {
		var q Query
		if rapid.Bool().Draw(rt, "numbers") {
			q.From = rapid.Uint64Range(0, seq+2).Draw(rt, "from")
			q.To = rapid.Uint64Range(0, seq+2).Draw(rt, "to")
		}
		if rapid.Bool().Draw(rt, "times") {
			q.Since = evening.Add(time.Duration(rapid.Int64Range(-1e9, 500e9).Draw(rt, "since")))
			q.Until = q.Since.Add(time.Duration(rapid.Int64Range(0, 100e9).Draw(rt, "length")))
		}
		if rapid.Bool().Draw(rt, "kinds") {
			q.Kinds = rapid.SliceOfN(rapid.SampledFrom(append(kinds, "unheard-of")), 1, 3).Draw(rt, "which")
		}
		q.NewestFirst = rapid.Bool().Draw(rt, "newest first")
		var want, got []Entry
		for i := range all {
			e := all[i]
			if q.NewestFirst {
				e = all[len(all)-1-i]
			}
			if q.wants(e) {
				want = append(want, e)
			}
		}
		if err := j.Read(context.Background(), q, func(e Entry) error {
			got = append(got, e)
			return nil
		}); err != nil {
			rt.Fatal(err)
		}
		if len(got) != len(want) {
			rt.Fatalf("%+v: %d entries, want %d", q, len(got), len(want))
		}
		for i := range got {
			if got[i].Seq != want[i].Seq {
				rt.Fatalf("%+v: entry %d is %d, want %d", q, i, got[i].Seq, want[i].Seq)
			}
		}
	})
	n := 0
	must(t, j.Read(context.Background(), Query{}, func(Entry) error {
		n++
		if n == 5 {
			return ErrStop
		}
		return nil
	}))
	if n != 5 {
		t.Fatalf("stopped after %d", n)
	}
}
