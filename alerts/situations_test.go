package alerts

import (
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

func TestShutterFaultIsFirst(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Sources[0].Silent = true
	r.run(20 * time.Second)
	r.o.Beams[0].Codes, r.o.Beams[0].Needs = codes(closures.CodeShutterFault), codes(closures.CodeShutterFault)
	r.run(time.Second)
	r.want(ShutterFault, "north", Unacknowledged)
	if a := r.m.Alarms(); a[0].Kind != ShutterFault || a[0].State != Unacknowledged {
		t.Errorf("first is %v", a[0])
	}
	// Latched: it stands until a person re-armed, though the shutter is mended.
	r.o.Beams[0].Codes = 0
	r.run(time.Hour)
	r.want(ShutterFault, "north", Unacknowledged)
	r.ack(ShutterFault, "north")
	r.o.Beams[0].Needs = 0
	r.run(31 * time.Second)
	r.want(ShutterFault, "north", Normal)
	if r.raised(ShutterFault) != 1 || r.raised(RearmWaiting) != 0 {
		t.Errorf("one situation was told %d and %d times", r.raised(ShutterFault), r.raised(RearmWaiting))
	}
}

func TestRoutineClosuresAreNoAlarms(t *testing.T) {
	r := newRoom(t, everyone())
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		switch c {
		case closures.CodeShutterFault, closures.CodeFault, closures.CodeClock, closures.CodeRecord:
			continue
		}
		r.o.Beams[0] = Beam{ID: "north", Codes: codes(c)}
		r.run(2 * time.Minute)
		r.o.Beams[0] = Beam{ID: "north", Open: true}
		r.run(2 * time.Minute)
	}
	if n := r.raised(""); n != 0 {
		t.Errorf("%d alarms of routine closures: %s", n, strings.Join(r.diary, "\n"))
	}
}

func TestOneRootAlarmASituation(t *testing.T) {
	for _, c := range []struct {
		name string
		do   func(*room)
		want Kind
	}{
		{"the network fails", func(r *room) {
			for i := range r.o.Sources {
				r.o.Sources[i].Silent = true
				r.run(2 * time.Second)
			}
			for i := range r.o.Beams {
				r.o.Beams[i].AimUnknown, r.o.Beams[i].ShutterSilent, r.o.Beams[i].Codes = true, true, codes(closures.CodeSourceSilent, closures.CodeAimUnknown)
			}
			r.o.Telescopes = []Telescope{{ID: "ridge-2", Silent: true}}
			r.run(10 * time.Minute)
		}, SourcesSilent},
		{"the clock steps", func(r *room) {
			for i := range r.o.Beams {
				r.o.Beams[i].Codes, r.o.Beams[i].Needs = codes(closures.CodeClock), codes(closures.CodeClock)
			}
			r.run(time.Minute)
			for i := range r.o.Beams {
				r.o.Beams[i].Codes = codes(closures.CodeRearm)
			}
			r.run(20 * time.Minute)
		}, Clock},
		{"the record is damaged", func(r *room) {
			r.o.Damaged = true
			for i := range r.o.Beams {
				r.o.Beams[i].Codes, r.o.Beams[i].Needs = codes(closures.CodeRecord), codes(closures.CodeRecord)
			}
			r.run(20 * time.Minute)
		}, RecordDamaged},
		{"an interlock opens", func(r *room) {
			r.o.Beams[0].Open = true
			r.run(5 * time.Second)
			r.o.Sources[2].Unsafe = true
			for i := range r.o.Beams {
				r.o.Beams[i].Open, r.o.Beams[i].Codes, r.o.Beams[i].Needs = false, codes(closures.CodeInterlock), codes(closures.CodeInterlock)
			}
			r.run(30 * time.Second)
			r.o.Sources[2].Unsafe = false
			r.run(20 * time.Minute)
		}, Interlock},
		{"the second opinion vetoes", func(r *room) {
			r.o.Beams[0].Codes, r.o.Beams[0].Needs = codes(closures.CodeFault), codes(closures.CodeFault)
			r.run(time.Second)
			r.o.Beams[0].Codes = codes(closures.CodeRearm)
			r.run(20 * time.Minute)
		}, Fault},
		{"the decision loop stands", func(r *room) {
			r.o = Observation{Stopped: true}
			r.run(20 * time.Minute)
		}, DecisionsStopped},
		{"aims disagree and then stop", func(r *room) {
			r.o.Beams[0].AimsDisagree = true
			r.run(10 * time.Second)
			r.o.Beams[0].AimUnknown = true
			r.run(20 * time.Minute)
		}, AimsDisagree},
		{"an antenna is deaf and its receiver dies", func(r *room) {
			r.o.Sources[0].Silent, r.o.Sources[0].Deaf = true, true
			r.run(20 * time.Minute)
		}, SourceSilent},
		{"a detector sees an aircraft", func(r *room) {
			r.o.Sources[3].Alarm = true
			r.o.Beams[0].Codes, r.o.Beams[0].Needs = codes(closures.CodeDetectorAlarm), codes(closures.CodeDetectorAlarm)
			r.run(40 * time.Second)
			r.o.Sources[3].Alarm = false
			r.run(20 * time.Minute)
		}, DetectorAlarm},
		{"the service starts anew", func(r *room) {
			for i := range r.o.Beams {
				r.o.Beams[i].Codes, r.o.Beams[i].Needs = codes(closures.CodeStarting), codes(closures.CodeStarting)
			}
			r.o.Beams = r.o.Beams[:1]
			r.run(20 * time.Minute)
		}, RearmWaiting},
	} {
		t.Run(strings.ReplaceAll(c.name, " ", "-"), func(t *testing.T) {
			r := newRoom(t, everyone())
			r.run(time.Minute)
			c.do(r)
			if r.raised(c.want) != 1 || r.raised("") != 1 {
				t.Errorf("%d alarms, of them %d %s:\n%s", r.raised(""), r.raised(c.want), c.want, strings.Join(r.diary, "\n"))
			}
		})
	}
}

// By day, with nobody at work, sources may be silent; what endangers the night
// or the record is told all the same.
func TestNobodyWorks(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Working = false
	r.o.Sources[0].Silent, r.o.Beams[0].AimUnknown = true, true
	r.run(time.Hour)
	if n := r.raised(""); n != 0 {
		t.Errorf("%d alarms by day: %s", n, strings.Join(r.diary, "\n"))
	}
	r.want(SourceSilent, "rx-1", Suppressed)
	r.o.DiskKnown, r.o.DiskFree = true, 0.05
	r.o.NotReady = []string{"orbital-desk: no list for tonight"}
	r.run(5 * time.Minute)
	r.want(DiskLow, "", Unacknowledged)
	r.want(NotReady, "", Suppressed) // by the disk, which it rests on
	r.o.DiskFree = 0.5
	r.run(5 * time.Minute)
	r.want(NotReady, "", Unacknowledged)
	r.o.Working = true
	r.run(5 * time.Minute)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	r.want(NotReady, "", Returned)
	// A beam that is open works, whatever people pressed.
	r = newRoom(t, everyone())
	r.o.Working, r.o.Beams[1].Open, r.o.Sources[0].Silent = false, true, true
	r.run(time.Minute)
	r.want(SourceSilent, "rx-1", Unacknowledged)
}

// Without fresh views nothing that views tell changes.
func TestStoppedFreezes(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Sources[0].Silent = true
	r.run(time.Minute)
	was := r.o
	r.o = Observation{Stopped: true, Receivers: []Receiver{{Name: "mail", FailingSince: r.at}}}
	r.run(10 * time.Minute)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	r.want(DecisionsStopped, "", Unacknowledged)
	r.want(ReceiverUnreachable, "mail", Unacknowledged)
	r.o = was
	r.run(10 * time.Minute)
	r.want(DecisionsStopped, "", Returned)
	r.want(SourceSilent, "rx-1", Unacknowledged)
}
