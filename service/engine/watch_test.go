package engine

import (
	"testing"
	"time"

	"beamward/closures"
)

func drain(c <-chan Update) (out []Update, open bool) {
	for {
		select {
		case u, ok := <-c:
			if !ok {
				return out, false
			}
			out = append(out, u)
		default:
			return out, true
		}
	}
}

func TestWatcherIsToldAtOnceAndElseTenTimesASecond(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	c, cancel := w.e.Watch(100)
	first, _ := drain(c)
	if len(first) != 1 || first[0].View != w.e.View() || len(first[0].Beams) != 1 || !first[0].Kept {
		t.Fatalf("first: %+v", first)
	}
	for range 100 { // a second in steps of 10 ms, in which nothing changes
		w.step(10 * time.Millisecond)
	}
	quiet, _ := drain(c)
	if n := len(quiet); n < 9 || n > 11 {
		t.Errorf("%d updates in a quiet second, want 10", n)
	}
	for _, u := range quiet {
		if u.Kept || len(u.Beams) != 0 {
			t.Errorf("nothing changed: %+v", u)
		}
	}
	w.clock.advance(time.Millisecond)
	if _, err := w.s.Submit("console", hold("h-1")); err != nil {
		t.Fatal(err)
	}
	at, _ := drain(c)
	if len(at) != 1 || !at[0].Kept || len(at[0].Beams) != 1 || at[0].Beams[0] != "north" || at[0].View.Beams[0].Decision.Open {
		t.Fatalf("after a hold: %+v", at)
	}
	w.clock.advance(time.Millisecond)
	if _, err := w.s.Submit("console", closures.HoldPlaced{ID: "h-2", Beam: "*", By: "ana", Placed: evening, From: evening.Add(time.Hour)}); err != nil {
		t.Fatal(err)
	}
	if at, _ := drain(c); len(at) != 1 || !at[0].Kept || len(at[0].Beams) != 0 {
		t.Fatalf("after a hold that changes no beam: %+v", at)
	}
	cancel()
	cancel()
	if _, open := drain(c); open {
		t.Error("the channel stays open after cancel")
	}
	if err := w.s.Close(); err != nil {
		t.Fatal(err)
	}
	c, cancel = w.e.Watch(1)
	defer cancel()
	if last, open := drain(c); open || len(last) != 1 || !last[0].View.Stopped {
		t.Errorf("watching an engine that ended: %+v", last)
	}
}

func TestSlowWatcherIsCutOff(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	slow, cancel := w.e.Watch(3)
	defer cancel()
	quick, cancelQuick := w.e.Watch(3)
	defer cancelQuick()
	for range 10 {
		w.step(100 * time.Millisecond)
		if _, open := drain(quick); !open {
			t.Fatal("a quick watcher was cut off")
		}
	}
	got, open := drain(slow)
	if open || len(got) != 3 {
		t.Fatalf("the slow one has %d updates, open %v", len(got), open)
	}
	if s := w.e.Stats(); s.CutOff != 1 || s.Watchers != 1 {
		t.Errorf("counted: %d cut off, %d left", s.CutOff, s.Watchers)
	}
}

func TestStopTellsWatchersLast(t *testing.T) {
	w := newSite(t, siteRules()).opened()
	c, _ := w.e.Watch(10)
	w.clock.advance(time.Millisecond)
	if err := w.s.Close(); err != nil {
		t.Fatal(err)
	}
	got, open := drain(c)
	last := got[len(got)-1]
	if open || !last.View.Stopped {
		t.Fatalf("last: %+v", last)
	}
	mustShut(t, last.View.Beams[0], closures.CodeStarting)
	if n := len(what[Ended](w.rec)); n != 1 {
		t.Errorf("%d ends on record", n)
	}
	if w.rec.c.Durable != w.rec.entries[len(w.rec.entries)-1].Seq {
		t.Error("the record was not flushed")
	}
	if _, err := w.e.Offer("feed", hold("h")); codeOf(err) != closures.Busy {
		t.Errorf("offering after the end: %v", err)
	}
}
