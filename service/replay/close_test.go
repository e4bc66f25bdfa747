package replay_test

import (
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/service/replay"
)

// hair is a story in which a spotter's circle misses or touches the aim by the
// angle given, positive when it misses, at the step recorded last. What is
// recorded of that step is as alter makes it.
func hair(t *testing.T, build string, miss s1.Angle, alter func(*closures.Decision) bool) *story {
	t.Helper()
	// A first try tells by how much it misses with a spread known.
	spread := 10 * s1.Degree
	for {
		s := newStory(t)
		s.entries[0].Body = []byte(strings.Replace(string(s.entries[0].Body), thisBuild, build, 1))
		s.go1(closures.Started{}, closures.NightReady{Night: s.night}, closures.WatchKept{Post: "east-lot", Said: s.at, By: []string{"ana", "ben"}, Until: s.at.Add(time.Hour)}, s.list("2031-045-A", nil))
		s.go1(closures.ListConfirmed{Authority: "orbital-desk", ID: "2031-045-A", Digest: closures.Digest{1}, By: "ben"})
		s.run(4 * time.Second)
		if !s.scribe.said["north"].Open {
			t.Fatal("the story does not open")
		}
		seen := closures.Sighted{Source: "spotter-east", Said: s.at, HasDirection: true, Direction: geometry.FromHorizon(150*s1.Degree, 40*s1.Degree), Spread: spread, For: 5 * time.Second}
		first := spread == 10*s1.Degree
		if first { // wide enough to touch surely
			seen.Spread += 20 * s1.Degree
		} else {
			s.alter = alter
		}
		s.go1(seen)
		s.alter = nil
		if !first {
			return s
		}
		d := s.scribe.said["north"]
		for _, f := range d.Reasons {
			if f.Code == closures.CodeSighting {
				spread = seen.Spread + s1.Angle(f.Margin.Value) - miss
			}
		}
		if spread == 10*s1.Degree {
			t.Fatal("the sighting does not close")
		}
	}
}

// A build that rounds otherwise by a hair records an opening where this one
// closes, and the other way round; both are listed, and neither is a
// difference. By the same build, or by more than a hair, it is one.
func TestCloseCalls(t *testing.T) {
	const other = "beamward elsewhere"
	shut := func(d *closures.Decision) bool {
		d.Open, d.OpenUntil = false, time.Time{}
		d.Codes = d.Codes.With(closures.CodeSighting)
		d.Reasons = append(d.Reasons, closures.Finding{Code: closures.CodeSighting, Source: "spotter-east", Verdict: closures.Violated, Margin: closures.Margin{Value: -1e-10, Unit: closures.Radian}})
		return true
	}
	leave := func(*closures.Decision) bool { return false }
	for name, c := range map[string]struct {
		build string
		miss  s1.Angle
		alter func(*closures.Decision) bool
		close bool
	}{
		"touched by a hair, recorded as open":       {other, -5e-10, leave, true},
		"touched by more, recorded as open":         {other, -5e-9, leave, false},
		"touched by a hair, by the same build":      {thisBuild, -5e-10, leave, false},
		"missed by a hair, recorded as shuttered":   {other, 5e-10, shut, true},
		"missed by a hair, shut, by the same build": {thisBuild, 5e-10, shut, false},
	} {
		t.Run(name, func(t *testing.T) {
			s := hair(t, c.build, c.miss, c.alter)
			if c.miss > 0 { // nothing changed, so nothing was recorded: do it by hand
				d := s.made("north", s.at)
				shut(&d)
				s.record(&d)
			}
			s.run(500 * time.Millisecond)
			rep := replayed(t, s.entries, replay.Options{Texts: s.texts(), Build: thisBuild})
			if c.close != (rep.Different == 0) || c.close != (rep.Close > 0) || len(rep.Calls) != int(rep.Close) {
				t.Fatalf("%s", rep.Words())
			}
			if c.close && (rep.Calls[0].Code != "sighting" || rep.Calls[0].Margin == nil || !strings.Contains(rep.Words(), "close: entry")) {
				t.Errorf("%s", rep.Words())
			}
		})
	}
}
