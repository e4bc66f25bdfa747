package closures

import (
	"slices"
	"time"

	"beamward/geometry/sky"
)

// Scene is all that a live check may see. It is owned by State; checks only
// read it, at the instant At for the beam Beam.
type Scene struct {
	*Foreseen
	At        time.Time
	Beam      *beam
	Night     *sky.Night
	Sightings []Sighted
	Detectors []DetectorSeen

	boot      time.Time
	started   bool
	sources   []source // in the order of the rules
	pointings []Pointing
	watches   []watch
	tracks    tracks
	weather   WeatherSeen
	clock     clockKnown
	record    recordKnown
	fault     string // of this step, on every beam
}

// source is what is known of one configured source.
type source struct {
	rules     *SourceRules
	said      time.Time // newest
	heard     time.Time
	since     time.Time // unbroken from here on
	interlock InterlockSeen
	minute    [60]uint32 // messages by second, for proof of reception
	second    int64
	rate      float64 // messages a minute, as the source itself says
	rateSaid  time.Time
	reference time.Time // when the reference address was last heard
}

type watch struct {
	rules *WatchRules
	kept  WatchKept
	heard time.Time
}

type clockKnown struct {
	ClockState
	heard   time.Time
	stepped bool // in this step
}

type recordKnown struct {
	RecordState
	heard time.Time
}

// How old the shell's own word of its clock and its record may be.
const (
	clockStale  = 5 * time.Second
	recordStale = 5 * time.Second
)

func (s *Scene) setRules(r *Rules) {
	old := s.sources
	s.sources = make([]source, len(r.Sources))
	for i := range r.Sources {
		for j := range old {
			if old[j].rules.ID == r.Sources[i].ID && old[j].rules.Kind == r.Sources[i].Kind {
				s.sources[i] = old[j]
			}
		}
		s.sources[i].rules = &r.Sources[i]
	}
	kept := s.watches
	s.watches = make([]watch, len(r.Watches))
	for i := range r.Watches {
		for j := range kept {
			if kept[j].rules.Post == r.Watches[i].Post {
				s.watches[i] = kept[j]
			}
		}
		s.watches[i].rules = &r.Watches[i]
	}
	s.tracks.setRules(r)
	s.pointings = slices.DeleteFunc(slices.Clone(s.pointings), func(p Pointing) bool { return r.Neighbour(p.Telescope) == nil })
}

func (s *Scene) source(id Source) *source {
	for i := range s.sources {
		if s.sources[i].rules.ID == id {
			return &s.sources[i]
		}
	}
	return nil
}

// air returns the newest weather, or what the rules state.
func (s *Scene) air(r *Rules) sky.Atmosphere {
	if !s.weather.Said.IsZero() {
		return sky.Atmosphere{PressureHPa: s.weather.PressureHPa, TemperatureC: s.weather.Temperature, Known: true}
	}
	return r.Site.Air
}

// age is the larger of the times since said and since heard; an instant ahead
// counts as now.
func age(at, said, heard time.Time) time.Duration {
	return max(at.Sub(said), at.Sub(heard), 0)
}

// hear takes in that the source lives. Silence breaks the run of reception.
func (s *source) hear(said, at time.Time) {
	if s.heard.IsZero() || age(at, s.said, s.heard) > s.rules.StaleAfter {
		s.since = at
	}
	if said.After(s.said) {
		s.said = said
	}
	s.heard = at
}

// silent reports whether nothing was heard for too long.
func (s *source) silent(at time.Time) bool {
	return s.heard.IsZero() || !(age(at, s.said, s.heard) <= s.rules.StaleAfter)
}

// count counts one message toward the proof of reception.
func (s *source) count(at time.Time) {
	now := at.Unix()
	if s.second == 0 || now-s.second >= int64(len(s.minute)) || now < s.second {
		s.minute = [60]uint32{}
		s.second = now
	}
	for s.second < now {
		s.second++
		s.minute[s.second%60] = 0
	}
	s.minute[now%60]++
}

// counted returns how many messages came in the last minute.
func (s *source) counted(at time.Time) float64 {
	var n uint32
	now := at.Unix()
	for i, c := range s.minute {
		// The bucket i holds the newest second that is i modulo 60.
		second := s.second - (s.second-int64(i)%60+60)%60
		if now-second < 60 {
			n += c
		}
	}
	return float64(n)
}

// receives reports whether reception is proven, or asks for no proof.
func (s *source) receives(at time.Time) bool {
	r := s.rules
	if r.MinMessagesPerMin <= 0 && r.ReferenceAddress == "" {
		return true
	}
	if r.ReferenceAddress != "" && !s.reference.IsZero() && at.Sub(s.reference) <= r.StaleAfter {
		return true
	}
	if !(r.MinMessagesPerMin > 0) {
		return false
	}
	return s.counted(at) >= r.MinMessagesPerMin ||
		!s.rateSaid.IsZero() && at.Sub(s.rateSaid) <= time.Minute && s.rate >= r.MinMessagesPerMin
}

// warm reports whether an aircraft source has been received without a break
// for its warm-up.
func (s *source) warm(at time.Time) bool {
	return s.rules.Kind != AircraftSource || !s.heard.IsZero() && at.Sub(s.since) >= s.rules.WarmUp
}
