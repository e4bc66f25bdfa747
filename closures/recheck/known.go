package recheck

import (
	"time"

	"beamward/closures"
)

// older is the larger of the times since said and since heard.
func older(at, said, heard time.Time) time.Duration { return max(at.Sub(said), at.Sub(heard)) }

// heard checks what must be heard: every required source, within its limit,
// receiving and warm; interlocks that say safe; detectors that say clear.
// BW-003, BW-005.
func (l *look) heard() string {
	for i := range l.rules.Sources {
		r := &l.rules.Sources[i]
		var s *closures.SourceKnown
		for j := range l.k.Sources {
			if l.k.Sources[j].Source == r.ID {
				s = &l.k.Sources[j]
			}
		}
		if s == nil {
			return "second opinion: a configured source is not known"
		}
		if r.Required {
			switch {
			case s.Heard.IsZero():
				return "second opinion: a required source was never heard"
			case older(l.at, s.Said, s.Heard) > r.StaleAfter+instants:
				return "second opinion: a required source is silent"
			case r.Kind == closures.AircraftSource && !s.Receives:
				return "second opinion: a required source does not prove that it receives"
			case r.Kind == closures.AircraftSource && l.at.Sub(s.Since) < r.WarmUp-instants:
				return "second opinion: a required source was not heard long enough"
			}
		}
		switch r.Kind {
		case closures.InterlockSource:
			w := &s.Interlock
			if !w.Said.IsZero() && !w.Safe {
				return "second opinion: an interlock is not safe"
			}
			if r.Required && (w.Said.IsZero() || older(l.at, w.Said, s.Heard) > r.StaleAfter+instants) {
				return "second opinion: an interlock has not said that it is safe"
			}
		case closures.DetectorSource:
			clear := false
			for j := range l.k.Detectors {
				if o := &l.k.Detectors[j]; o.Source == r.ID {
					if o.State == closures.DetectorAlarm {
						return "second opinion: a detector raises the alarm"
					}
					clear = o.State == closures.DetectorClear
				}
			}
			if r.Required && !clear {
				return "second opinion: a detector has not said that its sky is clear"
			}
		}
	}
	return ""
}

// people checks the watches and what spotters saw. A sighting without a
// direction is about the whole sky; one with a direction grows by 3° a second.
func (l *look) people() string {
	for i := range l.rules.Watches {
		r := &l.rules.Watches[i]
		if !r.Required {
			continue
		}
		kept := false
		for j := range l.k.Watches {
			w := &l.k.Watches[j]
			kept = kept || w.Post == r.Post && len(w.By) > 0 && len(w.By) >= r.Minimum && l.at.Before(w.Until.Add(instants)) &&
				(r.Shift <= 0 || l.at.Before(w.Said.Add(r.Shift+instants)))
		}
		if !kept {
			return "second opinion: a watch is missing"
		}
	}
	for i := range l.k.Sightings {
		s := &l.k.Sightings[i]
		lasts := s.For
		if lasts <= 0 {
			lasts = closures.SightingLasts
		}
		since := l.at.Sub(s.Said)
		if since >= lasts-instants {
			continue
		}
		if !s.HasDirection {
			return "second opinion: a spotter saw something"
		}
		a := aim{Aim: l.known.AimUsed, site: placeOf(l.rules)}
		if a.Aim == nil {
			continue // pointing tells of it
		}
		const growth = 3 * degree
		if p, ok := a.local(l.at); ok && apart(p, horizontal(s.Direction)) <= s.Spread.Radians()+growth*max(since.Seconds(), 0) {
			return "second opinion: a spotter saw something near the aim"
		}
	}
	return ""
}

// shutter checks the shutter's own word and the causes that wait for a person.
// BW-011, BW-023.
func (l *look) shutter() string {
	k, r := l.known, l.beam
	silent := k.ShutterHeard.IsZero() || older(l.at, k.Shutter.Said, k.ShutterHeard) > r.FeedbackStale+instants
	switch {
	case k.Need != 0:
		return "second opinion: a cause waits for a person to re-arm"
	case k.SlowShutter > r.ShutterTime:
		return "second opinion: the shutter was slower than its shutter_time"
	case r.FeedbackRequired && silent:
		return "second opinion: the shutter is silent"
	case k.ShutterHeard.IsZero() || k.LaserHeard.IsZero():
		return ""
	}
	between := k.Laser.Said.Sub(k.Shutter.Said)
	fresh := older(l.at, k.Shutter.Said, k.ShutterHeard) < r.FeedbackStale-instants && older(l.at, k.Laser.Said, k.LaserHeard) < r.FeedbackStale-instants
	if fresh && k.Laser.Emitting && k.Shutter.Position == closures.ShutterClosed && max(between, -between) > r.ShutterTime+instants {
		return "second opinion: light leaves through a shutter that says it is closed"
	}
	return ""
}

// pointing checks that the aim is known, fresh, tracking or at rest, and the
// one that was said.
func (l *look) pointing() string {
	k, r := l.known, l.beam
	l.aim = aim{Aim: k.AimUsed, site: placeOf(l.rules)}
	switch {
	case k.AimUsed == nil || k.AimHeard.IsZero():
		return "second opinion: no aim is known"
	case older(l.at, k.Aim.Said, k.AimHeard) > r.Aim.StaleAfter+instants:
		return "second opinion: the aim is too old"
	case k.AimUsed.Motion == closures.Slewing:
		return "second opinion: the telescope slews"
	case k.AimUsed.Motion == closures.MotionNotSaid:
		return "second opinion: the aim does not say how it moves"
	case k.Aim.Beam != k.Beam || !l.aim.asSaid(k.Aim.Aim):
		return "second opinion: the aim used is not the aim that was said"
	}
	var ok bool
	if l.now, ok = l.aim.local(l.at); !ok {
		return "second opinion: the aim does not reach to now"
	}
	l.aim.pad = (k.AimUsed.Error + r.Aim.Error + r.Asterism).Radians()
	if !(l.aim.pad >= 0) {
		return "second opinion: the aim's error is not a number"
	}
	return ""
}
