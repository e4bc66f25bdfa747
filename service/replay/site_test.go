package replay_test

import (
	"bytes"
	"errors"
	"maps"
	"math"
	"slices"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"
	"beamward/service/journal"
)

// steady is what a quiet site says all the time, but for what leave holds back.
func (w *world) steady(leave func(closures.Body) bool) {
	at := w.clock.Wall()
	say := func(b closures.Body) {
		if leave == nil || !leave(b) {
			w.offer(b)
		}
	}
	r := w.cfg.Rules
	for i := range r.Beams {
		say(closures.AimSeen{Beam: r.Beams[i].ID, Said: at, From: "encoder", Target: "f-101", Aim: w.aim(w.dir0, at)})
		say(closures.ShutterSeen{Beam: r.Beams[i].ID, Said: at, Position: w.shutter(r.Beams[i].ID)})
	}
	for i := range r.Sources {
		switch s := &r.Sources[i]; s.Kind {
		case closures.InterlockSource:
			say(closures.InterlockSeen{Source: s.ID, Said: at, Safe: true})
		case closures.DetectorSource:
			say(closures.DetectorSeen{Source: s.ID, Said: at, State: closures.DetectorClear})
		case closures.AircraftSource:
			say(closures.Heard{Source: s.ID, Said: at, Scope: closures.HeardReception, MessagesPerMinute: 120})
		}
	}
	for i := range r.Neighbours {
		say(closures.AimSeen{Telescope: r.Neighbours[i].ID, Said: at, From: "pointing", Exposing: closures.Yes,
			Aim: &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(320*s1.Degree, 50*s1.Degree), Reference: at, Error: geometry.Arcsecond, Motion: closures.Fixed}})
	}
	for i := range r.Watches {
		say(closures.WatchKept{Post: r.Watches[i].Post, Said: at, By: []string{"ana", "ben"}, Until: at.Add(time.Hour)})
	}
}

func (w *world) shutter(id closures.BeamID) closures.ShutterPosition {
	if b := w.e.View().Beam(id); b != nil && b.Decision.Open {
		return closures.ShutterOpen
	}
	return closures.ShutterClosed
}

func (w *world) aim(dir r3.Vector, at time.Time) *closures.Aim {
	return &closures.Aim{Frame: closures.ICRS, Direction: dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
}

// give brings a list and its text, as the service does.
func (w *world) give(l *closures.List, by string) {
	w.t.Helper()
	var text bytes.Buffer
	w.must(listfile.Canonical(&text, l.Text()))
	if !w.text(l.Digest(), text.Bytes()) {
		return
	}
	w.given[l.Digest()] = l
	_, err := w.s.Submit(closures.Source(by), closures.ListOffered{List: l, By: by})
	w.tolerate(err)
}

// text records a text; false where the record has no room for it.
func (w *world) text(d closures.Digest, b []byte) bool {
	w.t.Helper()
	err := w.j.PutList(d.String(), b)
	if errors.Is(err, journal.ErrFull) {
		return false
	}
	w.must(err)
	return true
}

// tolerate lets the core's refusals pass.
func (w *world) tolerate(err error) {
	w.t.Helper()
	var e *closures.Error
	if err != nil && !errors.As(err, &e) {
		w.t.Fatal(err)
	}
}

// list makes a list that covers two days about the evening.
func (w *world) list(authority closures.AuthorityID, open bool, replaces []closures.ListID, windows ...[2]time.Time) *closures.List {
	w.t.Helper()
	at := w.clock.Wall().Truncate(time.Millisecond)
	text := &closures.ListText{
		ID: closures.ListID(w.name("list")), Authority: authority, Issued: at, Replaces: replaces, UnlistedOpen: open,
		Covers: span.Span{From: at.Add(-12 * time.Hour), Until: at.Add(36 * time.Hour)},
	}
	text.Regions = append(text.Regions, closures.Region{ID: "field", Shape: closures.ICRSCone, Direction: near(w.dir0, 0.1), Radius: 1 * s1.Degree})
	if len(windows) == 0 {
		text.Regions[0].Throughout = closures.ThroughoutOpen
	}
	for _, span := range windows {
		text.Windows = append(text.Windows, closures.Window{From: span[0].UnixNano(), Until: span[1].UnixNano(), Ref: "A-17"})
	}
	var b bytes.Buffer
	w.must(listfile.WriteJSON(&b, text))
	l, _, err := listfile.Load(&b, listfile.JSON, listfile.Limits{})
	w.must(err)
	return l
}

// near turns a direction by some degrees.
func near(v r3.Vector, deg float64) r3.Vector {
	east := r3.Vector{Z: 1}.Cross(v).Normalize()
	a := deg * math.Pi / 180
	return v.Mul(math.Cos(a)).Add(east.Mul(math.Sin(a))).Normalize()
}

// fly moves the aircraft and reports them.
func (w *world) fly(d time.Duration) {
	frame := earth.FrameAt(w.cfg.Rules.Site.Position)
	at := w.clock.Wall()
	for _, id := range slices.Sorted(maps.Keys(w.tracks)) {
		f := w.tracks[id]
		f.at = f.at.Add(f.v.Mul(d.Seconds()))
		if f.at.Norm() > 150e3 {
			delete(w.tracks, id)
			continue
		}
		if w.rng.IntN(10) > 0 {
			continue
		}
		p := earth.FromECEF(frame.ECEF(f.at))
		track := math.Atan2(f.v.X, f.v.Y)
		seen := closures.AircraftSeen{
			Source: f.from, Said: at.Add(-time.Duration(w.rng.IntN(400)) * time.Millisecond), Aircraft: id, Located: w.rng.IntN(30) > 0, Position: p,
			AltitudeFrom: closures.AltitudeFrom(1 + w.rng.IntN(3)), Speed: geometry.Speed(math.Hypot(f.v.X, f.v.Y)), Track: s1.Angle(track), Climb: geometry.Speed(f.v.Z),
			Error: geometry.Length(math.NaN()), VerticalError: geometry.Length(math.NaN()), VelocityError: geometry.Speed(math.NaN()), VerticalVelError: geometry.Speed(math.NaN()),
			OnGround: w.rng.IntN(60) == 0, Drill: w.rng.IntN(60) == 0,
		}
		if w.rng.IntN(8) == 0 {
			seen.Speed, seen.Track = geometry.Speed(math.NaN()), s1.Angle(math.NaN())
		}
		if w.rng.IntN(20) == 0 { // it contradicts itself
			seen.Position.Lat += s1.Angle(0.02 * w.rng.Float64())
		}
		w.offer(seen)
	}
}
