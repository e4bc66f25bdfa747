package engine

import (
	"time"

	"beamward/closures"
)

// kind numbers the kinds of facts for counting.
type kind uint8

const (
	kindNone kind = iota
	kindRules
	kindListOffered
	kindListConfirmed
	kindListWithdrawn
	kindNight
	kindAim
	kindAircraft
	kindSighting
	kindDetector
	kindInterlock
	kindShutter
	kindLaser
	kindWatch
	kindWeather
	kindHeard
	kindHold
	kindRelease
	kindRearm
	kindTrackReleased
	kindClock
	kindRecord
	kindStarted
	kindVeto
	kindFault
	kindTick
	numKinds
)

var kindNames = [numKinds]string{
	"none", "rules", "list", "list-confirmed", "list-withdrawn", "night", "aim", "aircraft", "sighting", "detector", "interlock",
	"shutter", "laser", "watch", "weather", "heard", "hold", "hold-released", "rearm", "track-released", "clock", "record", "started",
	"veto", "fault", "tick",
}

func kindOf(b closures.Body) kind {
	switch b.(type) {
	case closures.AircraftSeen:
		return kindAircraft
	case closures.AimSeen:
		return kindAim
	case closures.Heard:
		return kindHeard
	case closures.RulesSet:
		return kindRules
	case closures.ListOffered:
		return kindListOffered
	case closures.ListConfirmed:
		return kindListConfirmed
	case closures.ListWithdrawn:
		return kindListWithdrawn
	case closures.NightReady:
		return kindNight
	case closures.Sighted:
		return kindSighting
	case closures.DetectorSeen:
		return kindDetector
	case closures.InterlockSeen:
		return kindInterlock
	case closures.ShutterSeen:
		return kindShutter
	case closures.LaserSeen:
		return kindLaser
	case closures.WatchKept:
		return kindWatch
	case closures.WeatherSeen:
		return kindWeather
	case closures.HoldPlaced:
		return kindHold
	case closures.HoldReleased:
		return kindRelease
	case closures.Rearmed:
		return kindRearm
	case closures.TrackReleased:
		return kindTrackReleased
	case closures.ClockState:
		return kindClock
	case closures.RecordState:
		return kindRecord
	case closures.Started:
		return kindStarted
	case closures.Veto:
		return kindVeto
	case closures.Fault:
		return kindFault
	case closures.Tick:
		return kindTick
	}
	return kindNone
}

// lane says where facts of a kind wait.
type lane uint8

const (
	laneOwn     lane = iota // the engine's own, refused from outside
	lanePeople              // never superseded, first
	laneDevices             // never superseded, second
	laneLatest              // the newest of each source and subject
)

func (k kind) lane() lane {
	switch k {
	case kindRules, kindListOffered, kindListConfirmed, kindListWithdrawn, kindHold, kindRelease, kindRearm, kindTrackReleased, kindVeto, kindFault:
		return lanePeople
	case kindSighting, kindDetector, kindInterlock, kindShutter, kindLaser, kindWatch, kindWeather:
		return laneDevices
	case kindAim, kindAircraft, kindHeard:
		return laneLatest
	}
	return laneOwn
}

// onlyCloses reports whether a fact of this kind can open nothing, so that it
// is taken even where the record has no room for it.
func (k kind) onlyCloses() bool { return k == kindHold || k == kindVeto || k == kindFault }

// saidBy returns the instant a fact states for itself; zero when it states
// none.
func saidBy(b closures.Body) time.Time {
	switch f := b.(type) {
	case closures.AimSeen:
		return f.Said
	case closures.AircraftSeen:
		return f.Said
	case closures.Heard:
		return f.Said
	case closures.Sighted:
		return f.Said
	case closures.DetectorSeen:
		return f.Said
	case closures.InterlockSeen:
		return f.Said
	case closures.ShutterSeen:
		return f.Said
	case closures.LaserSeen:
		return f.Said
	case closures.WatchKept:
		return f.Said
	case closures.WeatherSeen:
		return f.Said
	}
	return time.Time{}
}
