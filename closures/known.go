package closures

import (
	"slices"
	"time"
)

// DurableVersion is the number that Durable returns, without the work of
// gathering what is durable.
func (s *State) DurableVersion() uint64 { return s.durable }

// Known is what is known at an instant, for people to look at: a copy, which
// nothing changes afterwards. Decisions do not rest on it.
type Known struct {
	At        time.Time
	Beams     []BeamKnown     // in the rules' order
	Sources   []SourceKnown   // in the rules' order
	Aircraft  []AircraftKnown // in no order
	Pointings []Pointing      // in order of telescope
	Sightings []Sighted
	Detectors []DetectorSeen
	Watches   []WatchKept // in the rules' order; the zero value where none was kept
	Weather   WeatherSeen // zero: none was heard
	Popups    uint64      // aircraft that were first reported where they could already touch a beam
}

// BeamKnown is what is known of one beam. An instant of hearing is zero where
// nothing was heard.
type BeamKnown struct {
	Beam         BeamID
	Aim          AimSeen // as said: the newest
	AimUsed      *Aim    // as the checks use it; nil: none is known
	AimHeard     time.Time
	AimBegan     time.Time
	Shutter      ShutterSeen
	ShutterHeard time.Time
	Laser        LaserSeen
	LaserHeard   time.Time
	Need         Codes         // causes that wait for a person to re-arm
	SlowShutter  time.Duration // the longest measured over shutter_time; zero: none
}

// SourceKnown is what is known of one source.
type SourceKnown struct {
	Source    Source
	Kind      SourceKind
	Required  bool
	Said      time.Time // the newest instant that it stated
	Heard     time.Time // zero: never
	Since     time.Time // of unbroken hearing
	Limit     time.Duration
	Silent    bool
	Receives  bool // reception is proven, or asks for no proof
	Warm      bool // heard without a break for its warm-up, where it has one
	PerMinute float64
	Interlock InterlockSeen // of an interlock: its newest word
}

// AircraftKnown is what is known of one aircraft by one source.
type AircraftKnown struct {
	Aircraft string
	Source   Source
	Seen     AircraftSeen // the newest report
	Heard    time.Time
	Located  bool // a position counts
	Unclear  bool // reports contradict each other: it could be anywhere
	Inside   bool // last seen within the detection range
	Popup    bool // first reported where it could already touch a beam
}

// Known copies what is known at an instant.
func (s *State) Known(at time.Time) *Known {
	c := &s.scene
	k := &Known{
		At: at, Pointings: slices.Clone(c.pointings), Sightings: c.present(at), Detectors: slices.Clone(c.Detectors),
		Weather: c.weather, Popups: c.tracks.popups,
	}
	for i := range s.beams {
		b := &s.beams[i]
		o := BeamKnown{
			Beam: b.rules.ID, Shutter: b.shutter, ShutterHeard: b.shutterHeard, Laser: b.laser, LaserHeard: b.laserHeard,
			Need: b.latch.need, SlowShutter: b.longestShutter,
		}
		if a := b.present(); a != nil {
			o.Aim, o.AimUsed, o.AimHeard, o.AimBegan = a.seen, a.aim, a.heard, a.began
		}
		k.Beams = append(k.Beams, o)
	}
	for i := range c.sources {
		o := &c.sources[i]
		k.Sources = append(k.Sources, SourceKnown{
			Source: o.rules.ID, Kind: o.rules.Kind, Required: o.rules.Required, Said: o.said, Heard: o.heard, Since: o.since,
			Limit: o.rules.StaleAfter, Silent: o.silent(at), Receives: o.receives(at), Warm: o.warm(at), PerMinute: o.counted(at),
			Interlock: o.interlock,
		})
	}
	for i := range c.watches {
		k.Watches = append(k.Watches, c.watches[i].kept)
	}
	k.Aircraft = make([]AircraftKnown, len(c.tracks.list))
	for i := range c.tracks.list {
		t := &c.tracks.list[i]
		k.Aircraft[i] = AircraftKnown{
			Aircraft: t.key.aircraft, Source: t.key.source, Seen: t.seen, Heard: t.heard, Located: t.n > 0 || t.lost,
			Unclear: t.lost, Inside: t.inside, Popup: t.popup,
		}
	}
	return k
}
