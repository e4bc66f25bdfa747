package alerts

import (
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

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
