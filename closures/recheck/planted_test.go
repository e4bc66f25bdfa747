package recheck_test

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/recheck"
	"beamward/geometry/earth"
	"beamward/geometry/span"
)

// asked is what one look is given.
type asked struct {
	d     *closures.Decision
	k     *closures.Known
	f     *closures.Foreseen
	rules *closures.Rules
	at    time.Time
}

func (a *asked) look() (string, bool) {
	v, vetoed := recheck.Check(a.d, a.k, a.f, a.rules, a.at)
	return v.Detail, vetoed
}

// list puts a list into what is foreseen.
func (a *asked) list(t *testing.T, waiting bool, text closures.ListText) {
	f := *a.f
	f.Lists = append(slices.Clone(f.Lists), closures.Listed{List: index(t, text), Waiting: waiting})
	a.f = &f
}

func (a *asked) hold(h closures.HoldPlaced) {
	f := *a.f
	f.Holds = append(slices.Clone(f.Holds), h)
	a.f = &f
}

func window(from, until time.Time) []closures.Window {
	return []closures.Window{{From: from.UnixNano(), Until: until.UnixNano()}}
}

// Each planted bug is an open decision beside something that closes, as if the
// decision had overlooked it. The second opinion must say so, and why.
// BW-033
func TestCatchesPlantedBugs(t *testing.T) {
	sec := func(n float64) time.Duration { return time.Duration(n * float64(time.Second)) }
	cone := func(a *asked, radius float64) []closures.Region {
		return []closures.Region{{ID: "r", Shape: closures.ICRSCone, Direction: a.k.Beams[0].AimUsed.Direction, Radius: s1.Angle(radius) * s1.Degree}}
	}
	listed := func(from, until float64) func(*testing.T, *world, *asked) {
		return func(t *testing.T, _ *world, a *asked) {
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Regions: cone(a, 0.5), Windows: window(a.at.Add(sec(from)), a.at.Add(sec(until)))})
		}
	}
	plane := func(w *world, change func(*closures.AircraftSeen)) closures.AircraftKnown {
		b := w.night.Horizon(w.aim.Direction, w.at)
		p := earth.FromECEF(earth.FrameAt(w.r.Site.Position).ECEF(b.Mul(9000)))
		s := closures.AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "abc123", Located: true, Position: p, AltitudeFrom: closures.AboveEllipsoid, Speed: 100, Track: 0, Climb: 0}
		if change != nil {
			change(&s)
		}
		return closures.AircraftKnown{Aircraft: s.Aircraft, Source: s.Source, Seen: s, Heard: w.at, Located: true}
	}
	aircraft := func(change func(*closures.AircraftSeen)) func(*testing.T, *world, *asked) {
		return func(_ *testing.T, w *world, a *asked) {
			a.k.Aircraft = append(a.k.Aircraft, plane(w, change))
		}
	}
	for _, c := range []struct {
		name, want string
		plant      func(*testing.T, *world, *asked)
	}{
		{"a reason against it", "reason", func(_ *testing.T, _ *world, a *asked) { a.d.Codes = a.d.Codes.With(closures.CodeHold) }},
		{"past its own end", "own end", func(_ *testing.T, _ *world, a *asked) {
			a.d.OpenUntil, a.d.ClosesAt = a.at, a.at.Add(time.Second)
		}},
		{"no time to shutter", "too little time", func(_ *testing.T, _ *world, a *asked) {
			a.d.ClosesAt = a.at.Add(time.Minute)
			a.d.OpenUntil = a.d.ClosesAt.Add(-600 * time.Millisecond)
		}},
		{"an old decision published again", "another instant", func(_ *testing.T, _ *world, a *asked) { a.at = a.at.Add(time.Second); a.k.At = a.at }},
		{"other rules", "other rules", func(_ *testing.T, _ *world, a *asked) { a.d.Rules[5]++ }},
		{"a window in force", "listed window closes", listed(-1, 1)},
		{"a window whose lead has begun", "listed window closes", listed(4, 6)},
		{"a window whose tail runs", "listed window closes", listed(-8, -4)},
		{"a window that begins before the end", "begins before", listed(20, 30)},
		{"a window one second after the beam could be off", "listed window", listed(6.5, 7)},
		{"an end too late for a window", "begins before", func(t *testing.T, w *world, a *asked) {
			listed(20, 30)(t, w, a)
			a.d.ClosesAt = a.at.Add(sec(15.01))
			a.d.OpenUntil = a.d.ClosesAt.Add(-700 * time.Millisecond)
		}},
		{"a waiting list's window", "listed window closes", func(t *testing.T, _ *world, a *asked) {
			a.list(t, true, closures.ListText{ID: "x", UnlistedOpen: true, Regions: cone(a, 0.5), Windows: window(a.at.Add(-time.Second), a.at.Add(time.Second))})
		}},
		{"a region closed throughout", "listed window closes", func(t *testing.T, _ *world, a *asked) {
			r := cone(a, 0.5)
			r[0].Throughout = closures.ThroughoutClosed
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Regions: r})
		}},
		{"a region reached only by the errors", "listed window closes", func(t *testing.T, _ *world, a *asked) {
			r := cone(a, 0.5)
			d := r[0].Direction
			r[0].Direction = turned(d, 0.5+40.0/3600)
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Regions: r, Windows: window(a.at.Add(-time.Second), a.at.Add(time.Second))})
		}},
		{"outside the open window", "listed window closes", func(t *testing.T, _ *world, a *asked) {
			w := window(a.at.Add(time.Minute), a.at.Add(time.Hour))
			w[0].Open = true
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Regions: cone(a, 0.5), Windows: w})
		}},
		{"the open window ends", "listed window", func(t *testing.T, _ *world, a *asked) {
			w := window(a.at.Add(-time.Hour), a.at.Add(20*time.Second))
			w[0].Open = true
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Regions: cone(a, 0.5), Windows: w})
		}},
		{"nothing open holds the aim", "nothing that is open", func(t *testing.T, _ *world, a *asked) {
			r := cone(a, 0.5)
			r[0].Direction, r[0].Throughout = turned(r[0].Direction, 1), closures.ThroughoutOpen
			a.list(t, false, closures.ListText{ID: "x", Regions: r})
		}},
		{"a box on the sky", "listed window closes", func(t *testing.T, w *world, a *asked) {
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Windows: window(a.at.Add(-time.Second), a.at.Add(time.Second)), Regions: []closures.Region{{ID: "b", Shape: closures.HorizonBox, Box: box(140, 160, 60, 70)}}})
		}},
		{"a track on the sky", "listed window closes", func(t *testing.T, w *world, a *asked) {
			d := a.k.Beams[0].AimUsed.Direction
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Windows: window(a.at.Add(-time.Second), a.at.Add(time.Second)), Regions: []closures.Region{{ID: "t", Shape: closures.TrackCone, Radius: 0.2 * s1.Degree,
				Points: []closures.AimPoint{{At: a.at.Add(-time.Hour), Direction: turned(d, -1)}, {At: a.at.Add(time.Hour), Direction: turned(d, 1)}}}}})
		}},
		{"no coverage", "no list in force", func(_ *testing.T, _ *world, a *asked) { f := *a.f; f.Lists = nil; a.f = &f }},
		{"coverage only by a list that waits", "no list in force", func(_ *testing.T, _ *world, a *asked) {
			f := *a.f
			f.Lists = []closures.Listed{{List: f.Lists[0].List, Waiting: true}}
			a.f = &f
		}},
		{"coverage that ends", "coverage ends", func(t *testing.T, _ *world, a *asked) {
			f := *a.f
			f.Lists = nil
			a.f = &f
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Covers: span.Span{From: a.at.Add(-time.Hour), Until: a.at.Add(time.Minute)}})
		}},
		{"coverage that has just begun", "no list in force", func(t *testing.T, _ *world, a *asked) {
			f := *a.f
			f.Lists = nil
			a.f = &f
			a.list(t, false, closures.ListText{ID: "x", UnlistedOpen: true, Covers: span.Span{From: a.at.Add(-time.Second), Until: a.at.Add(time.Hour)}})
		}},
		{"a hold", "holds the beam", func(_ *testing.T, _ *world, a *asked) {
			a.hold(closures.HoldPlaced{ID: "h", Beam: closures.EveryBeam, Placed: a.at.Add(-time.Second)})
		}},
		{"a hold on a piece of sky", "holds the beam", func(_ *testing.T, _ *world, a *asked) {
			r := cone(a, 3)
			a.hold(closures.HoldPlaced{ID: "h", Beam: "north", Placed: a.at.Add(-time.Second), Until: a.at.Add(time.Hour), Region: &r[0]})
		}},
		{"a hold to come", "hold begins", func(_ *testing.T, _ *world, a *asked) {
			a.hold(closures.HoldPlaced{ID: "h", Beam: "north", Placed: a.at, From: a.at.Add(50 * time.Second), Until: a.at.Add(51 * time.Second)})
		}},
		{"an interlock that is not safe", "interlock is not safe", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[0].Interlock.Safe = false }},
		{"an interlock that was never heard", "interlock has not said", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[0].Interlock = closures.InterlockSeen{} }},
		{"a stale interlock", "required source is silent", func(_ *testing.T, _ *world, a *asked) {
			a.k.Sources[0].Heard = a.at.Add(-6 * time.Second)
		}},
		{"a source never heard", "never heard", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[1].Heard = time.Time{} }},
		{"a source that says old things", "silent", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[1].Said = a.at.Add(-11 * time.Second) }},
		{"a source that is not warm", "not heard long enough", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[1].Since = a.at.Add(-time.Second / 2) }},
		{"a deaf source", "does not prove", func(_ *testing.T, _ *world, a *asked) { a.k.Sources[1].Receives = false }},
		{"a detector's alarm", "raises the alarm", func(_ *testing.T, _ *world, a *asked) { a.k.Detectors[0].State = closures.DetectorAlarm }},
		{"a blind detector", "not said that its sky", func(_ *testing.T, _ *world, a *asked) { a.k.Detectors[0].State = closures.DetectorBlind }},
		{"a sighting", "spotter saw something", func(_ *testing.T, _ *world, a *asked) {
			a.k.Sightings = append(a.k.Sightings, closures.Sighted{Source: "s", Said: a.at.Add(-time.Second)})
		}},
		{"a sighting near the aim", "near the aim", func(_ *testing.T, w *world, a *asked) {
			a.k.Sightings = append(a.k.Sightings, closures.Sighted{Source: "s", Said: a.at.Add(-time.Second), For: time.Minute, HasDirection: true, Direction: w.night.Horizon(w.aim.Direction, w.at), Spread: 5 * s1.Degree})
		}},
		{"no watch", "watch is missing", func(_ *testing.T, _ *world, a *asked) { a.k.Watches[0].By = nil }},
		{"a watch past its shift", "watch is missing", func(_ *testing.T, _ *world, a *asked) { a.k.Watches[0].Said = a.at.Add(-5 * time.Hour) }},
		{"a cause that waits for a person", "waits for a person", func(_ *testing.T, _ *world, a *asked) {
			a.k.Beams[0].Need = a.k.Beams[0].Need.With(closures.CodeInterlock)
		}},
		{"a slow shutter", "slower", func(_ *testing.T, _ *world, a *asked) { a.k.Beams[0].SlowShutter = time.Second }},
		{"a silent shutter", "shutter is silent", func(_ *testing.T, _ *world, a *asked) {
			r := *a.rules
			r.Beams = slices.Clone(r.Beams)
			r.Beams[0].FeedbackRequired = true
			a.rules = &r
		}},
		{"light through a closed shutter", "says it is closed", func(_ *testing.T, _ *world, a *asked) {
			b := &a.k.Beams[0]
			b.Shutter, b.ShutterHeard = closures.ShutterSeen{Beam: "north", Said: a.at.Add(-2 * time.Second), Position: closures.ShutterClosed}, a.at.Add(-2*time.Second)
			b.Laser, b.LaserHeard = closures.LaserSeen{Beam: "north", Said: a.at, Emitting: true}, a.at
		}},
		{"no aim", "no aim", func(_ *testing.T, _ *world, a *asked) { a.k.Beams[0].AimUsed = nil }},
		{"a stale aim", "too old", func(_ *testing.T, _ *world, a *asked) { a.k.Beams[0].Aim.Said = a.at.Add(-4 * time.Second) }},
		{"a slew", "slews", func(_ *testing.T, _ *world, a *asked) {
			o := *a.k.Beams[0].AimUsed
			o.Motion = closures.Slewing
			a.k.Beams[0].AimUsed = &o
		}},
		{"another aim than was said", "not the aim that was said", func(_ *testing.T, _ *world, a *asked) {
			o := *a.k.Beams[0].AimUsed
			o.Direction = turned(o.Direction, 0.1)
			a.k.Beams[0].AimUsed = &o
		}},
		{"too low", "elevation limits", func(_ *testing.T, _ *world, a *asked) {
			r := *a.rules
			r.Beams = slices.Clone(r.Beams)
			r.Beams[0].Limits.ElevationMin = 65.5 * s1.Degree
			a.rules = &r
		}},
		{"too high", "elevation limits", func(_ *testing.T, _ *world, a *asked) {
			r := *a.rules
			r.Beams = slices.Clone(r.Beams)
			r.Beams[0].Limits.ElevationMax = 64.5 * s1.Degree
			a.rules = &r
		}},
		{"the Sun", "Sun is above", func(_ *testing.T, _ *world, a *asked) {
			r := *a.rules
			r.Beams = slices.Clone(r.Beams)
			r.Beams[0].Limits.SunBelow = -60 * s1.Degree
			a.rules = &r
		}},
		{"an aircraft in the beam", "in the keep-out", aircraft(nil)},
		{"an aircraft that flies into the beam", "in the keep-out", aircraft(func(s *closures.AircraftSeen) {
			s.Said = s.Said.Add(-5 * time.Second)
			s.Position.Lat -= s1.Angle(5.0 * 340 / 6.36e6)
			s.Speed = 340
		})},
		{"an aircraft of no altitude", "in the keep-out", aircraft(func(s *closures.AircraftSeen) {
			s.AltitudeFrom, s.Position.Height = closures.NoAltitude, 0
		})},
		{"an aircraft of no velocity", "in the keep-out", aircraft(func(s *closures.AircraftSeen) {
			s.Speed, s.Climb, s.Track = closures.AircraftSeen{}.Speed, closures.AircraftSeen{}.Climb, s1.Angle(math.NaN())
		})},
		{"an aircraft of no position", "gives no position", func(_ *testing.T, w *world, a *asked) {
			a.k.Aircraft = append(a.k.Aircraft, closures.AircraftKnown{Aircraft: "abc", Source: "rx-1"})
		}},
		{"an aircraft that contradicts itself", "contradicts itself", func(_ *testing.T, w *world, a *asked) {
			p := plane(w, nil)
			p.Unclear = true
			a.k.Aircraft = append(a.k.Aircraft, p)
		}},
		{"a neighbour's field", "neighbour's field", func(_ *testing.T, w *world, a *asked) {
			f := *a.f
			f.Pointings = slices.Clone(f.Pointings)
			f.Pointings[0].Aim = w.aim
			a.f = &f
		}},
		{"a silent neighbour", "pointing is not known", func(_ *testing.T, _ *world, a *asked) { f := *a.f; f.Pointings = nil; a.f = &f }},
		{"nothing known", "not given", func(_ *testing.T, _ *world, a *asked) { a.k = nil }},
		{"a beam of another name", "beam is not known", func(_ *testing.T, _ *world, a *asked) { a.d.Beam = "south" }},
	} {
		t.Run(strings.ReplaceAll(c.name, " ", "-"), func(t *testing.T) {
			w := newWorld(t, busyRules(), evening, openList(t))
			d := w.mustOpen()
			a := asked{d: &d, k: w.s.Known(w.at), f: w.s.Foreseen(), rules: w.r, at: w.at}
			if detail, vetoed := a.look(); vetoed {
				t.Fatalf("vetoed before the bug is planted: %s", detail)
			}
			c.plant(t, w, &a)
			detail, vetoed := a.look()
			if !vetoed || !strings.Contains(detail, c.want) {
				t.Errorf("veto %v: %q, want one that says %q", vetoed, detail, c.want)
			}
			d.Open = false
			if detail, vetoed := a.look(); vetoed {
				t.Errorf("vetoed a shuttered decision: %s", detail)
			}
		})
	}
}
