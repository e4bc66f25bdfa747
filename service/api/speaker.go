package api

import (
	"beamward/closures"
	"beamward/closures/wire"
)

// speaker is what a fact's name stands for: the same name may be a beam's and
// a source's.
type speaker uint8

const (
	aNothing speaker = iota
	aSource
	aBeam
	aTelescope
	aPost
	anAircraftSource
	aSightingSource
	aDetectorSource
	anInterlockSource
	aWeatherSource
)

func speakerOf(body closures.Body) speaker {
	switch b := body.(type) {
	case closures.AircraftSeen:
		return anAircraftSource
	case closures.AimSeen:
		if b.Telescope != "" {
			return aTelescope
		}
		return aBeam
	case closures.Heard:
		return aSource
	case closures.ShutterSeen, closures.LaserSeen:
		return aBeam
	case closures.Sighted:
		return aSightingSource
	case closures.DetectorSeen:
		return aDetectorSource
	case closures.InterlockSeen:
		return anInterlockSource
	case closures.WeatherSeen:
		return aWeatherSource
	case closures.WatchKept:
		return aPost
	}
	return aNothing
}

// configured reports whether the rules know the name as that.
func configured(r *closures.Rules, name closures.Source, as speaker) bool {
	kind := closures.NoKind
	switch as {
	case aBeam:
		return r.Beam(closures.BeamID(name)) != nil
	case aTelescope:
		return r.Neighbour(closures.TelescopeID(name)) != nil
	case aPost:
		for i := range r.Watches {
			if closures.Source(r.Watches[i].Post) == name {
				return true
			}
		}
		return false
	case aSource:
		return r.Source(name) != nil
	case anAircraftSource:
		kind = closures.AircraftSource
	case aSightingSource:
		kind = closures.SightingSource
	case aDetectorSource:
		kind = closures.DetectorSource
	case anInterlockSource:
		kind = closures.InterlockSource
	case aWeatherSource:
		kind = closures.WeatherSource
	}
	src := r.Source(name)
	return src != nil && kind != closures.NoKind && src.Kind == kind
}

// allowed refuses a fact for which the client may not speak, and one of what
// is not configured. The last name that was allowed is remembered, since lines
// of one source follow each other.
func (t *teller) allowed(name closures.Source, body closures.Body) error {
	as := speakerOf(body)
	if name == t.name && as == t.role {
		return nil
	}
	if !t.c.who.MaySpeakFor(name) {
		return &wire.FactError{Cause: "you are not bound to what the line speaks for", Mend: "send it with the token that is bound to it"}
	}
	if !configured(t.rules, name, as) {
		return &wire.FactError{Cause: "what the line speaks for is not configured as that", Mend: "name a configured source, beam, neighbour or post of this kind"}
	}
	t.name, t.role = name, as
	return nil
}
