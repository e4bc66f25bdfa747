package replay_test

import (
	"maps"
	"slices"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
)

// wander drives the world at random for a time: everything that can be said is
// said some time, and the clock and the store fail. One turn in often brings
// something new.
func (w *world) wander(d time.Duration, often int) {
	w.t.Helper()
	until := w.clock.Boot() + d
	quiet := map[string]time.Duration{}
	stalled := time.Duration(0)
	for w.clock.Boot() < until {
		if w.rng.IntN(40*often) == 0 {
			quiet[[...]string{"aim", "interlock", "heard", "shutter", "watch", "detector"}[w.rng.IntN(6)]] = w.clock.Boot() + time.Duration(w.rng.IntN(7000))*time.Millisecond
		}
		w.steady(func(b closures.Body) bool {
			kind := ""
			switch b.(type) {
			case closures.AimSeen:
				kind = "aim"
			case closures.InterlockSeen:
				kind = "interlock"
			case closures.Heard:
				kind = "heard"
			case closures.ShutterSeen:
				kind = "shutter"
			case closures.WatchKept:
				kind = "watch"
			case closures.DetectorSeen:
				kind = "detector"
			}
			return quiet[kind] > w.clock.Boot() || w.rng.IntN(3) == 0
		})
		step := time.Duration(20+w.rng.IntN(150)) * time.Millisecond
		w.fly(step)
		if w.rng.IntN(often) == 0 {
			w.happen()
		}
		w.turn(step)
		switch {
		case stalled > w.clock.Boot():
		case w.rng.IntN(200) == 0:
			stalled = w.clock.Boot() + time.Duration(w.rng.IntN(6000))*time.Millisecond
		case w.rng.IntN(5) == 0:
			w.flush()
		}
	}
	w.flush()
}

// calm mends everything and lets beams open.
func (w *world) calm(d time.Duration) {
	w.t.Helper()
	submit := func(b closures.Body) {
		_, err := w.s.Submit("console", b)
		w.tolerate(err)
	}
	w.clock.Discipline(true, true, 2*time.Millisecond)
	for _, id := range w.holds {
		submit(closures.HoldReleased{ID: id, By: "dora", Reference: "R-9"})
	}
	w.holds = nil
	for _, l := range w.lists {
		submit(closures.ListWithdrawn{Authority: l.Authority(), ID: l.ID(), By: "ana", ConfirmedBy: "dora", Reference: "W-9"})
	}
	w.lists = nil
	w.opened()
	for _, id := range slices.Sorted(maps.Keys(w.tracks)) {
		delete(w.tracks, id)
		submit(closures.TrackReleased{Aircraft: id, By: "ana", Spotter: "spotter-east"})
	}
	for t := time.Duration(0); t < d; t += 100 * time.Millisecond {
		if t == d/2 {
			submit(closures.Rearmed{Beam: closures.EveryBeam, By: "ana", Note: "all is well"})
		}
		w.steady(nil)
		w.turn(100 * time.Millisecond)
		if t%(400*time.Millisecond) == 0 { // each flush waits for the disk
			w.flush()
		}
	}
	w.flush()
}

// opened brings lists under which the whole sky is open.
func (w *world) opened() {
	w.t.Helper()
	l := w.list("orbital-desk", true, nil)
	w.give(l, "ana")
	_, err := w.s.Submit("console", closures.ListConfirmed{Authority: l.Authority(), ID: l.ID(), Digest: l.Digest(), By: "ben"})
	w.tolerate(err)
}

// happen makes one thing happen at random.
func (w *world) happen() {
	w.t.Helper()
	at := w.clock.Wall()
	submit := func(b closures.Body) {
		_, err := w.s.Submit("console", b)
		w.tolerate(err)
	}
	one := func(n int) bool { return w.rng.IntN(n) == 0 }
	beam := [...]closures.BeamID{"north", "south", closures.EveryBeam}[w.rng.IntN(3)]
	person := [...]string{"ana", "ben", "cleo"}[w.rng.IntN(3)]
	switch w.rng.IntN(24) {
	case 0:
		if one(3) {
			h := closures.HoldPlaced{ID: closures.HoldID(w.name("hold")), Beam: beam, Reason: "check of the optics", By: person, Placed: at, Authority: one(3)}
			if one(2) {
				h.Until = at.Add(time.Duration(1+w.rng.IntN(20)) * time.Second)
			}
			if one(3) {
				h.Region = &closures.Region{ID: "r", Shape: closures.ICRSCone, Direction: near(w.dir0, w.rng.Float64()*4), Radius: 2 * s1.Degree}
			}
			w.holds = append(w.holds, h.ID)
			submit(h)
		}
	case 1:
		if n := len(w.holds); n > 0 {
			submit(closures.HoldReleased{ID: w.holds[w.rng.IntN(n)], By: person, Reference: "R-1"})
		}
	case 2:
		submit(closures.Rearmed{Beam: beam, By: person, Note: "looked"})
	case 3:
		if one(4) {
			var replaces []closures.ListID
			if n := len(w.lists); n > 0 && one(2) {
				replaces = []closures.ListID{w.lists[w.rng.IntN(n)].ID()}
			}
			var windows [][2]time.Time
			for range w.rng.IntN(4) {
				from := at.Add(time.Duration(w.rng.IntN(120)-20) * time.Second).Truncate(time.Millisecond)
				windows = append(windows, [2]time.Time{from, from.Add(time.Duration(1+w.rng.IntN(8)) * time.Second)})
			}
			l := w.list("orbital-desk", true, replaces, windows...)
			w.lists = append(w.lists, l)
			w.give(l, person)
		}
	case 4, 5:
		if n := len(w.lists); n > 0 {
			l := w.lists[w.rng.IntN(n)]
			submit(closures.ListConfirmed{Authority: l.Authority(), ID: l.ID(), Digest: l.Digest(), By: person})
		}
	case 6:
		if n := len(w.lists); n > 2 && one(4) {
			l := w.lists[w.rng.IntN(n)]
			submit(closures.ListWithdrawn{Authority: l.Authority(), ID: l.ID(), By: person, ConfirmedBy: "dora", Reference: "W-1"})
		}
	case 7:
		w.offer(closures.Sighted{Source: "spotter-east", Said: at, HasDirection: one(2), Direction: near(w.dir0, 40), Spread: 5 * s1.Degree, For: time.Duration(1+w.rng.IntN(6)) * time.Second, Clear: one(2)})
	case 8:
		w.offer(closures.DetectorSeen{Source: "thermal-1", Said: at, State: closures.DetectorState(w.rng.IntN(3))})
	case 9:
		w.offer(closures.InterlockSeen{Source: "catwalk", Said: at, Safe: !one(3)})
	case 10:
		w.offer(closures.LaserSeen{Beam: "north", Said: at, Emitting: w.shutter("north") == closures.ShutterOpen, PowerW: 21.8})
	case 11:
		w.offer(closures.WeatherSeen{Source: "mast", Said: at, PressureHPa: 755 + 10*w.rng.Float64(), Temperature: 5 * w.rng.Float64()})
	case 12, 13, 14:
		id := [...]string{"a1b2c3", "a1b2c4", "a1b2c5", "a1b2c6", "a1b2c7"}[w.rng.IntN(5)]
		if w.tracks[id] == nil { // towards the site, to pass it near
			at := r3.Vector{X: (w.rng.Float64() - 0.5) * 40e3, Y: (w.rng.Float64() - 0.5) * 40e3, Z: 3e3 + 8e3*w.rng.Float64()}
			v := at.Mul(-(100 + 150*w.rng.Float64()) / at.Norm()).Add(r3.Vector{X: 20 * w.rng.Float64(), Y: 20 * w.rng.Float64()})
			v.Z = 0
			w.tracks[id] = &flight{from: [...]closures.Source{"rx-1", "rx-2"}[w.rng.IntN(2)], at: at, v: v}
		}
	case 15:
		w.offer(closures.AimSeen{Beam: "north", Said: at, From: "command", Aim: w.aim(near(w.dir0, 0.02*w.rng.Float64()), at)})
	case 16:
		a := w.aim(near(w.dir0, 3*w.rng.Float64()), at)
		a.Motion = closures.Motion(w.rng.IntN(5))
		w.offer(closures.AimSeen{Beam: "north", Said: at, From: "encoder", Aim: a})
	case 17:
		w.offer(closures.AimSeen{Beam: "south", Said: at, From: "encoder", Aim: &closures.Aim{
			Frame: closures.Horizon, Direction: geometry.FromHorizon(149*s1.Degree, 64.5*s1.Degree), Reference: at, Refracted: one(2), Error: 20 * geometry.Arcsecond, Motion: closures.Tracking}})
	case 18:
		w.offer(closures.AimSeen{Telescope: "ridge-2", Said: at, From: "pointing", Exposing: closures.Tristate(w.rng.IntN(3)), Field: 0.25 * s1.Degree, Aim: w.aim(near(w.dir0, 0.3+2*w.rng.Float64()), at)})
	case 19:
		w.offer(closures.Heard{Source: "rx-1", Said: at, Scope: closures.HeardReception, MessagesPerMinute: 30, Connected: one(4)})
	case 20:
		submit(closures.TrackReleased{Aircraft: "a1b2c5", By: person, Spotter: "spotter-east"})
	case 21:
		switch w.rng.IntN(12) {
		case 0:
			w.clock.Step(time.Duration(w.rng.IntN(4000)-2000) * time.Millisecond)
		case 1:
			w.clock.Suspend(time.Duration(w.rng.IntN(5000)) * time.Millisecond)
		case 2:
			w.clock.Discipline(true, one(2), time.Duration(w.rng.IntN(250))*time.Millisecond)
		case 3:
			w.clock.Discipline(true, true, 2*time.Millisecond)
		}
	case 22:
		if one(20) {
			submit(closures.Veto{Beam: beam, Detail: "the second opinion disagrees"})
		}
	case 23:
		if one(10) {
			w.reload()
		}
	}
}

// reload puts other rules in force, now and then with another place.
func (w *world) reload() {
	w.t.Helper()
	at := [...]string{"elevation_min_deg: 30", "elevation_min_deg: 31", "elevation_min_deg: 32"}[w.rng.IntN(3)]
	more := []string{"elevation_min_deg: 30", at}
	if w.rng.IntN(4) == 0 {
		more = append(more, "height_m: 2450", "height_m: 2451")
	}
	c := parsed(w.t, siteText(w.t, more...))
	if !w.text(c.Rules.Digest, c.Canonical()) {
		return
	}
	_, err := w.s.Submit("console", closures.RulesSet{Rules: c.Rules, By: "ana"})
	w.tolerate(err)
	w.cfg = c
}
