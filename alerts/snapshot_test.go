package alerts

import (
	"bytes"
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

// What people did outlives a restart: acknowledgements, shelves, removals, and
// a fault that has not come back to normal.
func TestSurvivesRestart(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Beams[0].Codes, r.o.Beams[0].Needs = codes(closures.CodeShutterFault), codes(closures.CodeShutterFault)
	r.o.Sources[0].Silent, r.o.Sources[4].Silent = true, true
	r.o.DiskKnown, r.o.DiskFree = true, 0.01
	r.run(2 * time.Minute)
	r.ack(ShutterFault, "north")
	if _, err := r.m.Shelve(r.at, Key{SourceSilent, "rx-1"}, "ana", "antenna", time.Hour); err != nil {
		t.Fatal(err)
	}
	if _, err := r.m.Remove(r.at, Key{SourceSilent, "mast"}, "ana", "sold"); err != nil {
		t.Fatal(err)
	}
	kept := r.m.Snapshot()
	m, dropped, err := Restored(everyone(), kept)
	if err != nil || len(dropped) > 0 {
		t.Fatal(err, dropped)
	}
	r.m = m
	r.at = r.at.Add(20 * time.Minute)
	before := len(r.sent)
	// The new start has heard nothing yet.
	for i := range r.o.Sources {
		r.o.Sources[i].Silent = true
	}
	r.run(3 * time.Second)
	for i := range r.o.Sources {
		r.o.Sources[i].Silent = i == 0 || i == 4
	}
	r.run(time.Minute)
	r.want(ShutterFault, "north", Acknowledged)
	r.want(DiskLow, "", Unacknowledged)
	r.want(SourceSilent, "rx-1", Shelved)
	r.want(SourceSilent, "mast", OutOfService)
	r.want(SourceSilent, "rx-2", Normal)
	for _, m := range r.sent[before:] {
		if m.What == Raised {
			t.Errorf("raised by the restart: %s", m.Title)
		}
	}
	r.run(time.Hour)
	r.want(SourceSilent, "rx-1", Unacknowledged)
}

func TestSnapshotRefusals(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Sources[0].Silent = true
	r.run(time.Minute)
	good := string(r.m.Snapshot())
	for name, bad := range map[string]string{
		"empty":                  "",
		"no object":              "[]",
		"cut":                    good[:len(good)-2],
		"trailing":               good + "{}",
		"unknown key":            strings.Replace(good, `"seq"`, `"sequence"`, 1),
		"another case":           strings.Replace(good, `"seq"`, `"Seq"`, 1),
		"twice":                  strings.Replace(good, `"seq"`, `"seq":1,"seq"`, 1),
		"another version":        strings.Replace(good, `"version":1`, `"version":2`, 1),
		"no such state":          strings.Replace(good, `"unacknowledged"`, `"unheard"`, 1),
		"no subject":             strings.Replace(good, `"rx-1"`, `""`, 1),
		"unclean subject":        strings.Replace(good, `"rx-1"`, `"rx\u202e1"`, 1),
		"shelved for ever":       strings.Replace(good, `"state":"unacknowledged"`, `"state":"shelved"`, 1),
		"a safety alarm shelved": strings.Replace(strings.Replace(good, `"source-silent"`, `"interlock"`, 1), `"state":"unacknowledged"`, `"state":"out-of-service"`, 1),
	} {
		if bad == good {
			t.Errorf("%s: the fault is not in it", name)
		}
		if _, _, err := Restored(Routing{}, []byte(bad)); err == nil {
			t.Errorf("%s: taken", name)
		}
	}
	m, dropped, err := Restored(Routing{}, []byte(strings.Replace(good, `"source-silent"`, `"of-an-older-build"`, 1)))
	if err != nil || !slices.Equal(dropped, []Key{{"of-an-older-build", "rx-1"}}) || len(m.alarms) != 0 {
		t.Errorf("of a kind that is gone: %v, %v", dropped, err)
	}
}

func FuzzRestored(f *testing.F) {
	r := newRoom(f, everyone())
	r.o.Sources[0].Silent = true
	r.o.Beams[0].Open, r.o.Beams[0].OpenUntil = true, evening.Add(time.Hour)
	r.run(2 * time.Minute)
	f.Add(r.m.Snapshot())
	f.Add([]byte(`{"version":1}`))
	f.Fuzz(func(t *testing.T, data []byte) {
		m, _, err := Restored(everyone(), data)
		if err != nil {
			return
		}
		kept := m.Snapshot()
		again, _, err := Restored(everyone(), kept)
		if err != nil {
			t.Fatalf("%v\n%s", err, kept)
		}
		if o := again.Snapshot(); !bytes.Equal(o, kept) {
			t.Fatalf("%s\n%s", kept, o)
		}
		for i := range 3 {
			m.Step(evening.Add(time.Duration(i)*time.Minute), &r.o)
		}
		m.Alarms()
	})
}
