package replay_test

import (
	"errors"
	"fmt"
	"math"
	"os"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/journal"
	"beamward/service/replay"
)

// story is a record written by hand, step by step, whose entries have names.
type story struct {
	*scribe
	at    time.Time
	night *sky.Night
	dir   r3.Vector // ICRS, where the beam points
	lists map[closures.Digest]*closures.List
	named map[string]uint64
	said  time.Time // of clock and record
	safe  bool
}

func newStory(t testing.TB) *story {
	t.Helper()
	text, err := os.ReadFile("testdata/site.yaml")
	if err != nil {
		t.Fatal(err)
	}
	rules := parsed(t, text).Rules
	s := &story{at: evening, lists: map[closures.Digest]*closures.List{}, named: map[string]uint64{}, safe: true}
	s.scribe = newScribe(t, rules, thisBuild, evening)
	if s.night, err = sky.Prepare(rules.Site.Position, evening, rules.Site.UT1); err != nil {
		t.Fatal(err)
	}
	s.dir = s.night.ICRS(geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), evening)
	return s
}

func (s *story) texts() replay.Texts {
	texts := given(s.rules)
	texts.List = func(d closures.Digest) (*closures.List, error) {
		if l := s.lists[d]; l != nil {
			return l, nil
		}
		return nil, errors.New("no such list")
	}
	return texts
}

// name remembers the newest entry of a kind.
func (s *story) name(name, kind string) {
	s.t.Helper()
	s.named[name] = s.entries[s.entries.last(s.t, s.seq+1, ofKind(kind))].Seq
}

// go1 moves on by 100 ms and makes a step of what is steady and of bodies.
func (s *story) go1(bodies ...closures.Body) {
	s.t.Helper()
	s.at = s.at.Add(100 * time.Millisecond)
	at := s.at
	if at.Sub(s.said) >= time.Second {
		s.said = at
		bodies = append([]closures.Body{closures.ClockState{Synchronised: true, MaxError: 10 * time.Millisecond}, closures.RecordState{Durable: s.seq}}, bodies...)
	}
	bodies = append(bodies,
		closures.AimSeen{Beam: "north", Said: at, From: "encoder", Target: "f-101", Aim: &closures.Aim{Frame: closures.ICRS, Direction: s.dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}},
		closures.AimSeen{Telescope: "ridge-2", Said: at, From: "pointing", Aim: &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(320*s1.Degree, 50*s1.Degree), Reference: at, Error: geometry.Arcsecond, Motion: closures.Fixed}},
		closures.InterlockSeen{Source: "catwalk", Said: at, Safe: s.safe},
		closures.Heard{Source: "rx-1", Said: at, Scope: closures.HeardReception, MessagesPerMinute: 120},
	)
	s.step(at, bodies...)
}

func (s *story) run(d time.Duration) {
	s.t.Helper()
	for until := s.at.Add(d); s.at.Before(until); {
		s.go1()
	}
}

// list makes a list under which the sky is open but for windows on the field.
func (s *story) list(id closures.ListID, replaces []closures.ListID, windows ...[2]time.Duration) closures.ListOffered {
	s.t.Helper()
	text := &closures.ListText{
		ID: id, Authority: "orbital-desk", Issued: evening.Add(-time.Duration(10-len(s.lists)) * time.Hour), UnlistedOpen: true, Replaces: replaces,
		Covers:  span.Span{From: evening.Add(-12 * time.Hour), Until: evening.Add(12 * time.Hour)},
		Regions: []closures.Region{{ID: "f-101", Shape: closures.ICRSCone, Direction: near(s.dir, 0.01), Radius: 0.05 * s1.Degree}},
		Digest:  closures.Digest{byte(len(s.lists) + 1)},
	}
	if len(windows) == 0 {
		text.Regions[0].Throughout = closures.ThroughoutOpen
	}
	for i, w := range windows {
		text.Windows = append(text.Windows, closures.Window{From: evening.Add(w[0]).UnixNano(), Until: evening.Add(w[1]).UnixNano(), Ref: fmt.Sprintf("A-%d", i+1)})
	}
	l, err := closures.Index(text)
	if err != nil {
		s.t.Fatal(err)
	}
	s.lists[l.Digest()] = l
	return closures.ListOffered{List: l, By: "ana"}
}

// aircraft is a report of one in the beam, 7 km up it.
func (s *story) aircraft() closures.AircraftSeen {
	local := s.night.Horizon(s.dir, s.at)
	none := math.NaN()
	return closures.AircraftSeen{
		Source: "rx-1", Said: s.at, Aircraft: "a1b2c3", Located: true, Position: s.rules.Site.Position.Offset(local.Mul(7000)), AltitudeFrom: closures.AboveEllipsoid,
		Speed: 210, Track: 45 * s1.Degree, Climb: geometry.Speed(none), Error: 50, VerticalError: 30, VelocityError: 5, VerticalVelError: geometry.Speed(none),
	}
}

// whole tells a night in short: a start, an opening, closures of many kinds, a
// loss, another start, and a hold long after it.
func whole(t testing.TB) *story {
	t.Helper()
	s := newStory(t)
	s.named["begun"], s.named["durable"] = 1, 2
	bodies := []closures.Body{closures.Started{}}
	for _, off := range [...]time.Duration{0, 12 * time.Hour} {
		n, err := sky.Prepare(s.rules.Site.Position, evening.Add(off), s.rules.Site.UT1)
		if err != nil {
			t.Fatal(err)
		}
		bodies = append(bodies, closures.NightReady{Night: n})
	}
	s.go1(append(bodies, closures.WatchKept{Post: "east-lot", Said: s.at, By: []string{"ana", "ben"}, Until: s.at.Add(2 * time.Hour)},
		closures.WeatherSeen{Source: "mast", Said: s.at, PressureHPa: 760, Temperature: 4})...)
	s.name("start", "decision")
	s.go1(s.list("2031-045-A", nil))
	s.name("list", "list-offered")
	s.go1(closures.ListConfirmed{Authority: "orbital-desk", ID: "2031-045-A", Digest: s.lists[closures.Digest{1}].Digest(), By: "ana"})
	s.name("refused", "list-confirmed")
	s.go1(closures.ListConfirmed{Authority: "orbital-desk", ID: "2031-045-A", Digest: s.lists[closures.Digest{1}].Digest(), By: "ben"})
	s.name("confirmed", "list-confirmed")
	s.run(3 * time.Second)
	s.name("open", "decision")
	opening := s.named["open"]
	s.name("steady", "tick")
	s.put(s.at, replay.KindGranted, fmt.Appendf(nil, `{"beam":"north","opening":%d,"seq":%d}`, opening, s.named["steady"]))
	s.name("granted", replay.KindGranted)
	s.go1(s.list("2031-045-B", []closures.ListID{"2031-045-A"}, [2]time.Duration{20 * time.Second, 25 * time.Second}))
	s.name("until", "decision")
	s.run(500 * time.Millisecond)
	s.go1(s.aircraft(), closures.Sighted{Source: "spotter-east", Said: s.at, HasDirection: true, Direction: geometry.FromHorizon(140*s1.Degree, 60*s1.Degree), Spread: 10 * s1.Degree, For: 4 * time.Second})
	s.name("aircraft", "decision")
	s.name("report", "aircraft")
	s.safe = false
	s.go1(closures.HoldPlaced{ID: "h-1", Beam: closures.EveryBeam, Reason: "check of the optics", By: "ana", Placed: s.at})
	s.name("many", "decision")
	s.name("hold", "hold")
	s.keep(s.at)
	s.safe = true
	s.go1(closures.HoldReleased{ID: "h-1", By: "ben", Reference: "all is well"})
	s.name("released", "hold-released")
	s.run(15 * time.Second)
	s.name("rearm", "decision")
	s.go1(closures.Rearmed{Beam: "north", By: "ben", Note: "looked at the catwalk"})
	s.name("rearmed", "rearmed")
	s.run(10 * time.Second)
	s.put(s.at, replay.KindTallied, []byte(`{"from":10,"to":900,"count":250,"sum":"sha256:00"}`))
	s.name("tallied", replay.KindTallied)
	s.keep(s.at)
	s.run(70 * time.Second)
	s.go1(closures.HoldPlaced{ID: "h-2", Beam: "north", Reason: "a visitor on the roof", By: "cleo", Placed: s.at, Until: s.at.Add(time.Minute)})
	s.name("late", "decision")
	s.name("late-tick", "tick")
	s.seq += 40
	s.put(s.at, journal.KindGap, fmt.Appendf(nil, `{"count":41,"first":%d,"last":%d}`, s.seq-39, s.seq+1))
	s.name("gap", journal.KindGap)
	s.facts(s.at, closures.InterlockSeen{Source: "catwalk", Said: s.at, Safe: true}, closures.Tick{})
	s.name("after-gap", "tick")
	d, _ := s.state.Durable()
	s.begin("boot-1", thisBuild, s.at.Add(time.Second), d)
	s.facts(s.at.Add(time.Second), closures.InterlockSeen{Source: "catwalk", Said: s.at, Safe: true})
	s.name("unapplied", "interlock")
	s.begin("boot-2", thisBuild, s.at.Add(2*time.Second), d)
	s.named["ended"] = s.put(s.at.Add(3*time.Second), replay.KindEnded, []byte("{}"))
	return s
}
