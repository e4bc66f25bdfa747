package alerts

import (
	"slices"
	"strings"
	"testing"
	"time"
)

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
