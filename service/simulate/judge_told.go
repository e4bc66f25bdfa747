package simulate

import (
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
)

// told is what the judge wrote down of what was told to the daemon and, where
// people rely on it, acknowledged. All by true time.
type told struct {
	started   time.Time // of the newest life of the process
	lead      time.Duration
	leadKnown time.Time
	lists     []*toldList
	uncovered time.Time // when the last withdrawal was acknowledged
	holds     map[closures.HoldID]*toldHold
	sightings []toldSighting
	heard     map[string]time.Time
	unbroken  map[string]time.Time // since when
	interlock struct {
		since time.Time // of the unsafe words; zero: safe
	}
	alarm     time.Time // of the detector; zero: none
	watch     time.Time // until when
	slews     map[closures.BeamID]time.Time
	clockBad  time.Time
	pointing  int // of the neighbour, as told
	pointedAt time.Time
}

type toldList struct {
	text      *closures.ListText
	known     time.Time
	confirmed bool
	gone      bool
}

type toldHold struct {
	beam        closures.BeamID
	from, until time.Time // zero until: none
	known       time.Time
}

type toldSighting struct {
	closures.Sighted
	known time.Time
}

// After how long silence of what is required closes.
const (
	interlockStale = 5 * time.Second
	detectorStale  = 5 * time.Second
	receiverStale  = 10 * time.Second
	neighbourStale = 10 * time.Second
	aimStale       = 3 * time.Second
)

func newTold() told {
	return told{
		lead: leads[0], holds: map[closures.HoldID]*toldHold{}, heard: map[string]time.Time{}, unbroken: map[string]time.Time{},
		slews: map[closures.BeamID]time.Time{},
	}
}

// restarted forgets what a new process cannot know, and nothing that was
// acknowledged.
func (t *told) restarted(at time.Time) {
	t.started = at
	clear(t.heard)
	clear(t.unbroken)
	clear(t.slews)
	t.watch, t.pointing, t.pointedAt = time.Time{}, -1, time.Time{}
}

// hear writes down that a source's word reached the daemon.
func (t *told) hear(source string, stale time.Duration, at time.Time) {
	if last, ever := t.heard[source]; !ever || at.Sub(last) > stale {
		t.unbroken[source] = at
	}
	t.heard[source] = at
}

// sources finds who is silent, who was not heard since the start, and who not
// long enough.
func (t *told) sources(beam closures.BeamID, at time.Time, live func(string, time.Time)) {
	for _, s := range [...]struct {
		name  string
		stale time.Duration
	}{{string(beam), aimStale}, {"rx-1", receiverStale}, {"thermal-1", detectorStale}, {"catwalk", interlockStale}, {"ridge-2", neighbourStale}} {
		last, ever := t.heard[s.name]
		switch {
		case !ever:
			live(s.name+" not heard since the start", t.started)
		case at.Sub(last) > s.stale:
			live(s.name+" silent", last.Add(s.stale))
		}
	}
	if since, ever := t.unbroken["rx-1"]; !ever || at.Sub(since) < warmUp {
		known := t.started
		if ever {
			known = since
		}
		live("rx-1 not warm", known)
	}
	if !t.clockBad.IsZero() {
		live("the clock is wrong", t.clockBad)
	}
	if !t.alarm.IsZero() {
		live("detector", t.alarm)
	}
	if !t.interlock.since.IsZero() {
		live("interlock", t.interlock.since)
	}
	if !at.Before(t.watch) {
		live("watch", later(t.watch, t.started))
	}
	if s := t.slews[beam]; !s.IsZero() {
		live("slewing", s)
	}
}

// people finds what persons said: holds and sightings.
func (t *told) people(beam closures.BeamID, at time.Time, up r3.Vector, p *beamPaper, live func(string, time.Time), foreseen func(string, time.Time, time.Time)) {
	for id, h := range t.holds {
		if h.beam != beam && h.beam != closures.EveryBeam || at.Before(h.from) || !h.until.IsZero() && !at.Before(h.until) {
			continue
		}
		foreseen("hold "+string(id), h.known, h.from)
	}
	for i := range t.sightings {
		s := &t.sightings[i]
		if at.Before(s.known) || !at.Before(s.Said.Add(s.For)) {
			continue
		}
		if !s.HasDirection || angle(up, s.Direction)-p.asterism <= radians(s.Spread)+3*degree*max(at.Sub(s.Said).Seconds(), 0) {
			live("sighting", s.known)
		}
	}
}

// neighbourKnown is when the daemon knew of one of the neighbour's pointings,
// or that it knew nothing newer.
func (t *told) neighbourKnown(pointing int) time.Time {
	if t.pointing == pointing {
		return t.pointedAt
	}
	return later(t.heard["ridge-2"].Add(neighbourStale), t.started)
}

// listed finds what the authorities' lists close, and time that nobody covers.
func (t *told) listed(beam closures.BeamID, at time.Time, aim, up r3.Vector, p *beamPaper, live func(string, time.Time), foreseen func(string, time.Time, time.Time)) {
	covered := false
	for _, l := range t.lists {
		if l.gone {
			continue
		}
		lead, tail, known := t.lead, listTail, later(l.known, t.leadKnown)
		if l.text.Authority != "orbital-desk" {
			lead, tail, known = surveyLead, surveyTail, l.known
		}
		inside := func(s time.Time) bool { return !s.Before(l.text.Covers.From) && s.Before(l.text.Covers.Until) }
		if l.text.Authority == "orbital-desk" && l.confirmed && inside(at) {
			covered = true
		}
		opened := l.text.UnlistedOpen || !inside(at)
		for i := range l.text.Regions {
			r := &l.text.Regions[i]
			holds := holdsAim(r, aim, up, p.asterism, at)
			if !holds {
				continue
			}
			shut, from := closedAt(l.text, int32(i), at, lead, tail)
			if shut {
				foreseen("list "+string(l.text.ID)+" region "+r.ID, known, from)
			} else {
				opened = true
			}
		}
		if !opened {
			foreseen("list "+string(l.text.ID)+": nothing open holds the aim", known, l.text.Covers.From)
		}
	}
	if !covered {
		live("not covered", t.uncovered)
	}
}

// holdsAim reports whether light about the true aim lies in the region.
func holdsAim(r *closures.Region, aim, up r3.Vector, asterism float64, at time.Time) bool {
	switch r.Shape {
	case closures.WholeSky:
		return true
	case closures.ICRSCone:
		return angle(aim, r.Direction)-asterism <= radians(r.Radius)
	case closures.HorizonBox:
		return r.Box.Margin(up) <= 0
	case closures.TrackCone:
		for i := 1; i < len(r.Points); i++ {
			a, b := r.Points[i-1], r.Points[i]
			if at.Before(a.At) || at.After(b.At) {
				continue
			}
			f := at.Sub(a.At).Seconds() / b.At.Sub(a.At).Seconds()
			here := a.Direction.Mul(1 - f).Add(b.Direction.Mul(f)).Normalize()
			if angle(aim, here)-asterism <= radians(r.Radius) {
				return true
			}
		}
	}
	return false
}

// closedAt reports whether a region is closed at an instant by its windows, and
// since when; the authority's lead and tail are counted.
func closedAt(l *closures.ListText, region int32, at time.Time, lead, tail time.Duration) (shut bool, from time.Time) {
	r := &l.Regions[region]
	hasOpen, opened := false, false
	for _, w := range l.Windows {
		if w.Region != region {
			continue
		}
		s := w.Span()
		if w.Open {
			hasOpen = true
			opened = opened || !at.Before(s.From.Add(tail)) && at.Before(s.Until.Add(-lead))
			continue
		}
		if !at.Before(s.From.Add(-lead)) && at.Before(s.Until.Add(tail)) {
			return true, s.From.Add(-lead)
		}
	}
	covers := !at.Before(l.Covers.From) && at.Before(l.Covers.Until)
	if covers && (r.Throughout == closures.ThroughoutClosed || hasOpen && !opened) {
		return true, l.Covers.From
	}
	return false, time.Time{}
}
