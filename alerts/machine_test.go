package alerts

import (
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

var evening = time.Date(2031, 2, 14, 20, 0, 0, 0, time.UTC)

// everyone takes everything at every hour.
func everyone() Routing {
	return Routing{Routes: []Route{{Receiver: "desk", AtLeast: Low, Changes: true, Notices: true}}}
}

// room drives a machine as the service does, and keeps a diary.
type room struct {
	t     testing.TB
	m     *Machine
	at    time.Time
	o     Observation
	diary []string
	sent  []Message
	sound int
}

func newRoom(t testing.TB, r Routing) *room {
	if errs := r.Validate(); len(errs) > 0 {
		t.Fatal(errs)
	}
	o := Observation{Working: true, Beams: []Beam{{ID: "north"}, {ID: "south"}}}
	for _, id := range []closures.Source{"rx-1", "rx-2", "catwalk", "thermal-1", "mast"} {
		o.Sources = append(o.Sources, Source{ID: id, Required: true})
	}
	return &room{t: t, m: New(r), at: evening, o: o}
}

func (r *room) take(out Output) {
	for _, c := range out.Changes {
		r.diary = append(r.diary, c.From.String()+" > "+c.Alarm.State.String()+" "+string(c.Alarm.Kind)+about(c.Alarm.Subject))
	}
	r.sent = append(r.sent, out.Messages...)
	r.sound += len(out.Sound)
}

// run steps every second for a while.
func (r *room) run(d time.Duration) {
	for end := r.at.Add(d); r.at.Before(end); {
		r.at = r.at.Add(time.Second)
		r.take(r.m.Step(r.at, &r.o))
	}
}

func (r *room) state(k Kind, subject string) State {
	if a := r.m.find(Key{k, subject}); a != nil {
		return a.state
	}
	return Normal
}

func (r *room) want(k Kind, subject string, s State) {
	r.t.Helper()
	if got := r.state(k, subject); got != s {
		r.t.Errorf("%s %s: %v, want %v\n%s", k, subject, got, s, strings.Join(r.diary, "\n"))
	}
}

// raised counts raises of a kind; of all where it is empty.
func (r *room) raised(k Kind) (n int) {
	for i := range r.sent {
		if r.sent[i].What == Raised && (k == "" || r.sent[i].Kind == k) {
			n++
		}
	}
	return n
}

func (r *room) ack(k Kind, subject string) {
	r.t.Helper()
	out, err := r.m.Acknowledge(r.at, Key{k, subject}, "ana")
	if err != nil {
		r.t.Fatal(err)
	}
	r.take(out)
}

func codes(c ...closures.Code) (s closures.Codes) {
	for _, o := range c {
		s = s.With(o)
	}
	return s
}

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

// A source that comes and goes at any pace is told of seldom: never three
// times in a minute, and ever less.
func TestFlappingDoesNotChatter(t *testing.T) {
	for _, half := range []time.Duration{time.Second, 16 * time.Second, 45 * time.Second, 61 * time.Second, 2 * time.Minute, 4 * time.Minute} {
		r := newRoom(t, everyone())
		for range int(2 * time.Hour / (2 * half)) {
			r.o.Sources[0].Silent = true
			r.run(half)
			r.o.Sources[0].Silent = false
			r.run(half)
		}
		n := r.raised(SourceSilent)
		t.Logf("silent and heard for %v each: %d alarms in 2 h", half, n)
		if n < 1 || n > 12 {
			t.Errorf("silent and heard for %v each: %d alarms in 2 h", half, n)
		}
		noChatter(t, r.sent)
	}
	// So is a parent cause that comes and goes, which hides and shows the other.
	r := newRoom(t, everyone())
	for i := range 7200 {
		r.o.Sources[0].Silent = true
		r.o.Sources[1].Silent = i%9 < 5
		r.o.Sources[2].Silent = i%7 < 4
		r.run(time.Second)
	}
	noChatter(t, r.sent)
	if n := r.raised(""); n > 12 {
		t.Errorf("%d alarms in 2 h:\n%s", n, strings.Join(r.diary, "\n"))
	}
}

// noChatter fails where one alarm is raised three times in a minute.
func noChatter(t testing.TB, sent []Message) {
	t.Helper()
	raises := map[Key][]time.Time{}
	for i := range sent {
		if sent[i].What == Raised {
			k := Key{sent[i].Kind, sent[i].Subject}
			raises[k] = append(raises[k], sent[i].At)
			if n := len(raises[k]); n >= 3 && sent[i].At.Sub(raises[k][n-3]) < time.Minute {
				t.Errorf("%v chatters at %v", k, sent[i].At)
			}
		}
	}
}

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

func TestSoundsAgainAndEscalates(t *testing.T) {
	r := newRoom(t, Routing{Routes: []Route{
		{Receiver: "desk", AtLeast: Low},
		{Receiver: "bell", AtLeast: Low, Sounds: true},
		{Receiver: "chief", AtLeast: Medium, Level: 1},
		{Receiver: "head", AtLeast: Medium, Level: 2},
	}})
	r.o.Sources[0].Silent = true
	r.run(15*time.Second + 25*time.Minute)
	count := map[string]int{}
	for _, m := range r.sent {
		for _, to := range m.To {
			count[to+" "+m.What.String()]++
		}
	}
	for want, n := range map[string]int{"desk raised": 1, "bell raised": 1, "chief escalated": 1, "head escalated": 1, "chief raised": 0, "head raised": 0, "desk reminder": 0} {
		if count[want] != n {
			t.Errorf("%s: %d, want %d", want, count[want], n)
		}
	}
	if n := count["bell reminder"]; n < 45 || n > 50 {
		t.Errorf("the bell rang %d times in 25 min", n)
	}
	before := r.sound
	r.ack(SourceSilent, "rx-1")
	r.run(10 * time.Minute)
	if r.sound != before {
		t.Error("it sounds though it is acknowledged")
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

func TestDeadBands(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.DiskKnown = true
	for i := range 4000 {
		r.o.DiskFree = 0.10 + 0.015*float64(i%2)
		if i == 0 {
			r.o.DiskFree = 0.095
		}
		r.run(time.Second)
	}
	if n := r.raised(DiskLow); n != 1 {
		t.Errorf("%d alarms about the edge", n)
	}
	r.o.DiskFree = 0.13
	r.run(5 * time.Minute)
	r.want(DiskLow, "", Returned)
	r.o.Sources[0].RefusedKnown, r.o.Sources[0].RefusedPerMinute = true, 29
	r.run(5 * time.Minute)
	r.want(FactsRefused, "rx-1", Normal)
	r.o.Sources[0].RefusedPerMinute = 31
	r.run(5 * time.Minute)
	r.o.Sources[0].RefusedPerMinute = 6
	r.run(5 * time.Minute)
	r.want(FactsRefused, "rx-1", Unacknowledged)
}

func TestCountFilter(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Popups = 40 // of before
	r.run(time.Minute)
	for range 2 {
		r.o.Popups++
		r.run(time.Minute)
	}
	r.run(31 * time.Minute)
	r.o.Popups += 2
	r.run(time.Minute)
	r.want(Popups, "", Normal)
	r.o.Popups++
	r.run(time.Second)
	r.want(Popups, "", Unacknowledged)
	r.o.Popups = 0 // the service started anew
	r.run(2 * time.Hour)
	r.want(Popups, "", Returned)
	r.o.Popups = 100000
	r.run(time.Second)
	r.want(Popups, "", Unacknowledged)
}

func TestFlood(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Sources = nil
	for i := range 14 {
		r.o.Posts = append(r.o.Posts, Post{ID: string(rune('a' + i)), Missing: true})
	}
	r.run(61 * time.Second)
	if !r.m.Flood() {
		t.Fatal("14 alarms at once are no flood")
	}
	r.o.Telescopes = []Telescope{{ID: "ridge-2", Silent: true}}
	r.run(2 * time.Minute)
	low := r.sent[slices.IndexFunc(r.sent, func(m Message) bool { return m.Kind == NeighbourSilent })]
	if len(low.To) != 0 {
		t.Errorf("an alarm of low priority was sent in a flood: %+v", low)
	}
	r.run(12 * time.Minute)
	if r.m.Flood() {
		t.Error("the flood lasts")
	}
	var told []string
	for _, m := range r.sent {
		if m.What == FloodTold {
			told = append(told, m.Title+m.Detail)
		}
	}
	if len(told) != 2 || !strings.Contains(told[1], "1 alarms of low") {
		t.Errorf("told: %q", told)
	}
}

func TestNotices(t *testing.T) {
	r := newRoom(t, everyone())
	r.run(time.Minute)
	b := &r.o.Beams[0]
	b.Open, b.OpenUntil = true, r.at.Add(6*time.Minute)
	r.run(5*time.Minute + 59*time.Second)
	b.Open, b.OpenUntil, b.Codes, b.Why = false, time.Time{}, codes(closures.CodeListedClosure), "a region that may hold the aim is closed"
	r.run(time.Minute)
	var got []string
	for _, m := range r.sent {
		got = append(got, m.Title)
	}
	want := []string{"Beam north is open.", "Beam north closes in 5m0s.", "Beam north closes in 1m0s.", "Beam north closes in 10s.", "Beam north is shuttered: listed-closure."}
	if !slices.Equal(got, want) {
		t.Errorf("told:\n%s", strings.Join(got, "\n"))
	}
	// One that opens with less left is told only what is true, and an end that
	// moves a little is the same end.
	r.sent = nil
	b.Open, b.OpenUntil, b.Codes = true, r.at.Add(40*time.Second), 0
	r.run(3 * time.Second)
	b.OpenUntil = b.OpenUntil.Add(5 * time.Second)
	r.run(3 * time.Second)
	if len(r.sent) != 2 || r.sent[1].Title != "Beam north closes in 39s." {
		t.Errorf("told: %+v", r.sent)
	}
	// A beam that flaps is told of at most every ten seconds, last as it is.
	r.sent = nil
	for i := range 600 {
		b.Open, b.OpenUntil = i%2 == 0, time.Time{}
		r.run(time.Second)
	}
	b.Open = true
	r.run(time.Minute)
	if n := len(r.sent); n > 61 {
		t.Errorf("%d notices in 11 minutes", n)
	}
	if last := r.sent[len(r.sent)-1].Title; last != "Beam north is open." {
		t.Errorf("last told: %s", last)
	}
	for _, m := range r.sent {
		if m.What != Notice || m.Priority != NoPriority || m.Expires.IsZero() {
			t.Errorf("not a notice: %+v", m)
		}
	}
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

// A clock that goes far back takes all with it; one that jitters does nothing.
func TestClockGoesBack(t *testing.T) {
	r := newRoom(t, everyone())
	if _, err := r.m.Shelve(r.at, Key{SourceSilent, "rx-1"}, "ana", "", time.Hour); err != nil {
		t.Fatal(err)
	}
	r.o.Sources[0].Silent = true
	r.o.Sources[1].Silent = true
	r.run(time.Minute)
	r.at = r.at.Add(-48 * time.Hour)
	r.run(58 * time.Minute)
	r.want(SourceSilent, "rx-1", Shelved)
	r.run(2 * time.Minute)
	r.want(SourceSilent, "rx-1", Unacknowledged)
	r.at = r.at.Add(-10 * time.Second)
	before := len(r.diary)
	r.run(20 * time.Second)
	if len(r.diary) != before {
		t.Errorf("a small step back changed: %v", r.diary[before:])
	}
}

// A hostile name is only ever text.
func TestHostileNames(t *testing.T) {
	r := newRoom(t, everyone())
	evil := "\x1b[31m=cmd|' /C calc'!A0\r\nBcc: x\u202e<script>\x00\xff" + strings.Repeat("x", 500)
	r.o.Sources = []Source{{ID: closures.Source(evil), Required: true, Silent: true, Unsafe: true, RefusedKnown: true, RefusedPerMinute: 100}}
	r.o.Beams[0] = Beam{ID: closures.BeamID(evil), Codes: codes(closures.CodeShutterFault), Why: evil, Lost: []string{evil}}
	r.o.NotReady = []string{evil}
	r.o.Authorities = []Authority{{ID: "a", Waiting: closures.ListID(evil)}}
	r.run(20 * time.Minute)
	r.o.Beams[0].Open = true
	r.run(time.Minute)
	if r.raised("") < 4 {
		t.Fatal("nothing was raised")
	}
	for _, m := range r.sent {
		for _, text := range []string{m.Title, m.Detail, m.Subject, m.Effect, m.Do} {
			if strings.ContainsAny(text, "\r\n\x00\x1b\u202e") || len(text) > 2000 {
				t.Errorf("unclean: %q", text)
			}
		}
	}
}
