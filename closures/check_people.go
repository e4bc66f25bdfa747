package closures

import (
	"slices"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
)

// SightingGrowth is how fast what a spotter saw may move across the sky.
const SightingGrowth = 3 * s1.Degree // a second

// SightingLasts is how long a sighting counts that states no time.
const SightingLasts = 60 * time.Second

// until returns when a sighting is over by itself.
func (f *Sighted) until() time.Time {
	if f.For <= 0 {
		return f.Said.Add(SightingLasts)
	}
	return f.Said.Add(f.For)
}

func (s *State) applySighting(f Sighted, at time.Time) *Error {
	// A spotter is a configured source or a person; neither word can open but
	// by ending the same one's own sightings.
	if src := s.scene.source(f.Source); src != nil {
		if src.rules.Kind != SightingSource {
			return noSource(f.Source, "sighting")
		}
		src.hear(f.Said, at)
	}
	sightings := slices.Clone(s.scene.Sightings)
	if f.Clear {
		sightings = slices.DeleteFunc(sightings, func(o Sighted) bool { return o.Source == f.Source && !o.Said.After(f.Said) })
	} else {
		sightings = append(sightings, f)
	}
	s.scene.Sightings = sightings
	s.durable++
	return nil
}

// sighting is the check of what spotters saw: about its direction, in a circle
// that grows, or the whole sky where none was given.
type sighting struct{}

func (sighting) Code() Code { return CodeSighting }

func (sighting) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.Sightings {
		f := &c.Sightings[i]
		if !c.At.Before(f.until()) {
			continue
		}
		found := Finding{Code: CodeSighting, Source: f.Source, Verdict: Violated, Margin: UnknownMargin(), Detail: "a spotter saw something"}
		found.Over.From, found.Over.Until = f.Said, f.until()
		if f.HasDirection {
			// Positive: clear only where the aim is surely outside the circle at the
			// end of what a permit allows.
			ahead := c.At.Add(c.Rules.Guard(c.Beam.rules)).Sub(f.Said)
			radius := f.Spread + s1.Angle(SightingGrowth.Radians()*max(ahead, 0).Seconds())
			margin := UnknownMargin().Value
			if a := c.Beam.present(); a != nil {
				if d, e, ok := a.aim.At(c.Night, c.At); ok {
					r := c.Beam.rules
					margin = (geometry.Separation(d, f.Direction) - radius - e - r.Aim.Error - r.Asterism).Radians()
				}
			}
			if margin > 0 {
				continue
			}
			found.Margin = Margin{Value: margin, Unit: Radian}
		}
		sh.add(found)
	}
	sh.finish(CodeSighting, first, Margin{})
}

func (s *State) applyDetector(f DetectorSeen, at time.Time) *Error {
	src := s.scene.source(f.Source)
	if src == nil || src.rules.Kind != DetectorSource {
		return noSource(f.Source, "detector")
	}
	i := slices.IndexFunc(s.scene.Detectors, func(o DetectorSeen) bool { return o.Source == f.Source })
	if i >= 0 && f.Said.Before(s.scene.Detectors[i].Said) {
		return nil
	}
	src.hear(f.Said, at)
	detectors := slices.Clone(s.scene.Detectors)
	if i >= 0 {
		detectors[i] = f
	} else {
		detectors = append(detectors, f)
	}
	if i < 0 || s.scene.Detectors[i].State != f.State {
		s.durable++
	}
	s.scene.Detectors = detectors
	return nil
}

// detectorAlarm is the check of detectors of aircraft. An alarm counts until
// the detector says clear; blind, or too long without a word, is unknown for a
// required one.
type detectorAlarm struct{}

func (detectorAlarm) Code() Code { return CodeDetectorAlarm }

func (detectorAlarm) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.sources {
		s := &c.sources[i]
		if s.rules.Kind != DetectorSource {
			continue
		}
		f := Finding{Code: CodeDetectorAlarm, Source: s.rules.ID, Verdict: Unknown, Margin: UnknownMargin()}
		j := slices.IndexFunc(c.Detectors, func(o DetectorSeen) bool { return o.Source == s.rules.ID })
		switch {
		case j >= 0 && c.Detectors[j].State == DetectorAlarm:
			f.Verdict, f.Detail = Violated, "the detector raises the alarm"
			sh.add(f)
			continue
		case j >= 0 && c.Detectors[j].State == DetectorClear && !s.silent(c.At):
			continue
		case j >= 0 && c.Detectors[j].State == DetectorBlind && !s.silent(c.At):
			f.Detail = "the detector is blind"
		default:
			f.Detail = "the detector has not said that its sky is clear"
		}
		if s.rules.Required {
			sh.add(f)
		} else {
			sh.Cautions = append(sh.Cautions, Caution{Code: CodeDetectorAlarm, Source: s.rules.ID, Detail: f.Detail})
		}
	}
	sh.finish(CodeDetectorAlarm, first, Margin{})
}

func (s *State) applyWatch(f WatchKept, at time.Time) *Error {
	for i := range s.scene.watches {
		w := &s.scene.watches[i]
		if w.rules.Post == f.Post {
			if !f.Said.Before(w.kept.Said) {
				w.kept, w.heard = f, at
			}
			return nil
		}
	}
	return Errorf(NotFound, "name a configured watch post", "watch: post %.64q is not configured", f.Post)
}

// watchMissing is the check that each required post has its watch: enough
// people, no longer than their shift.
type watchMissing struct{}

func (watchMissing) Code() Code { return CodeWatchMissing }

func (watchMissing) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.watches {
		w := &c.watches[i]
		until := w.kept.Until
		if w.rules.Shift > 0 && until.After(w.kept.Said.Add(w.rules.Shift)) {
			until = w.kept.Said.Add(w.rules.Shift)
		}
		kept := !w.heard.IsZero() && c.At.Before(until) && len(w.kept.By) >= w.rules.Minimum && len(w.kept.By) > 0
		switch {
		case !kept && w.rules.Required:
			sh.add(Finding{Code: CodeWatchMissing, Source: Source(w.rules.Post), Verdict: Violated, Detail: "the post is not staffed"})
		case !kept:
			sh.Cautions = append(sh.Cautions, Caution{Code: CodeWatchMissing, Source: Source(w.rules.Post), Detail: "the post is not staffed"})
		case w.rules.Overlap > 0 && !c.At.Before(until.Add(-w.rules.Overlap)):
			sh.Cautions = append(sh.Cautions, Caution{Code: CodeWatchMissing, Source: Source(w.rules.Post), Detail: "the watch ends soon"})
		}
	}
	sh.finish(CodeWatchMissing, first, Margin{})
}

// expire drops tracks that are over. A track that is dropped was outside the
// detection range, so it was not durable.
func (s *Scene) expire(at time.Time) { s.tracks.expire(s, at) }

// forget drops sightings that have long been over, and reports whether there
// were any.
func (s *Scene) forget(at time.Time) bool {
	long := func(f Sighted) bool { return at.Sub(f.until()) > keepPast }
	if !slices.ContainsFunc(s.Sightings, long) {
		return false
	}
	s.Sightings = slices.DeleteFunc(slices.Clone(s.Sightings), long)
	return true
}

// present returns the sightings that count at an instant.
func (s *Scene) present(at time.Time) []Sighted {
	return slices.DeleteFunc(slices.Clone(s.Sightings), func(f Sighted) bool { return !at.Before(f.until()) })
}
