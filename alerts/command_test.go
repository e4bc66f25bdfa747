package alerts

import (
	"testing"
	"time"
)

func TestAcknowledgeAndReturn(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Sources[0].Silent = true
	r.run(14 * time.Second)
	r.want(SourceSilent, "rx-1", Normal)
	r.run(3 * time.Second)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	r.o.Sources[0].Silent = false
	r.run(58 * time.Second)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	r.run(5 * time.Second)
	r.want(SourceSilent, "rx-1", Returned)
	r.ack(SourceSilent, "rx-1")
	r.want(SourceSilent, "rx-1", Normal)
	if _, err := r.m.Acknowledge(r.at, Key{SourceSilent, "rx-1"}, "ana"); err == nil {
		t.Error("a normal alarm was acknowledged")
	}
	r.o.Sources[0].Silent = true
	r.run(20 * time.Second)
	r.ack(SourceSilent, "rx-1")
	r.ack(SourceSilent, "rx-1") // once more is harmless
	r.want(SourceSilent, "rx-1", Acknowledged)
	r.o.Sources[0].Silent = false
	r.run(10 * time.Minute)
	r.want(SourceSilent, "rx-1", Normal)
	if _, err := r.m.Acknowledge(r.at, Key{SourceSilent, "rx-1"}, ""); err == nil {
		t.Error("nobody acknowledged")
	}
}

func TestShelving(t *testing.T) {
	r := newRoom(t, everyone())
	key := Key{SourceSilent, "rx-1"}
	r.o.Sources[0].Silent = true
	r.run(20 * time.Second)
	if _, err := r.m.Shelve(r.at, key, "ana", "antenna work", 9*time.Hour); err == nil {
		t.Error("shelved for 9 h")
	}
	out, err := r.m.Shelve(r.at, key, "ana", "antenna\u202e work\n", 10*time.Minute)
	if err != nil {
		t.Fatal(err)
	}
	r.take(out)
	a := out.Changes[0].Alarm
	if a.State != Shelved || a.Reason != "antenna work " || a.Until != r.at.Add(10*time.Minute) || a.By != "ana" {
		t.Errorf("shelved: %+v", a)
	}
	if _, err := r.m.Acknowledge(r.at, key, "ana"); err == nil {
		t.Error("a shelved alarm was acknowledged")
	}
	before := r.sound
	r.run(9 * time.Minute)
	if r.sound != before {
		t.Error("a shelved alarm sounds")
	}
	r.run(2 * time.Minute)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	// One that is over meanwhile comes back as normal.
	if _, err = r.m.Shelve(r.at, key, "ana", "", time.Minute); err != nil {
		t.Fatal(err)
	}
	r.o.Sources[0].Silent = false
	r.run(2 * time.Minute)
	r.want(SourceSilent, "rx-1", Normal)
	for _, k := range []Key{{ShutterFault, "north"}, {Fault, ""}, {Clock, ""}, {Interlock, "catwalk"}} {
		if _, err := r.m.Shelve(r.at, k, "ana", "", time.Minute); err == nil {
			t.Errorf("%v was shelved", k)
		}
		if _, err := r.m.Remove(r.at, k, "ana", "because"); err == nil {
			t.Errorf("%v was taken out of service", k)
		}
	}
	for _, k := range []Key{{"no-such", "x"}, {SourceSilent, ""}, {DiskLow, "x"}, {SourceSilent, "a\x00b"}} {
		if _, err := r.m.Shelve(r.at, k, "ana", "", time.Minute); err == nil {
			t.Errorf("%v was shelved", k)
		}
	}
}

func TestOutOfService(t *testing.T) {
	r := newRoom(t, everyone())
	key := Key{ReceptionLost, "rx-1"}
	if _, err := r.m.Remove(r.at, key, "ana", ""); err == nil {
		t.Error("removed for no reason")
	}
	if _, err := r.m.Remove(r.at, key, "ana", "no antenna there"); err != nil {
		t.Fatal(err)
	}
	r.o.Sources[0].Deaf = true
	r.run(24 * time.Hour / 12)
	r.want(ReceptionLost, "rx-1", OutOfService)
	if _, err := r.m.Unshelve(r.at, key, "bo"); err == nil {
		t.Error("unshelved what is not shelved")
	}
	if _, err := r.m.Restore(r.at, key, "bo"); err != nil {
		t.Fatal(err)
	}
	r.want(ReceptionLost, "rx-1", Unacknowledged)
	// A parent that is out of service hides nothing.
	r = newRoom(t, everyone())
	if _, err := r.m.Remove(r.at, Key{SourcesSilent, ""}, "ana", "they share nothing"); err != nil {
		t.Fatal(err)
	}
	for i := range r.o.Sources {
		r.o.Sources[i].Silent = true
	}
	r.run(time.Minute)
	if n := r.raised(SourceSilent); n != 5 {
		t.Errorf("%d alarms, want one a source", n)
	}
}
