package alerts

import (
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
