package replay

import (
	"beamward/closures"
)

// newest remembers the number of the newest fact about each subject, so that a
// decision's inputs can be named by their entries. Aircraft come and go: with
// mostSubjects the lot of them is forgotten.
type newest map[subject]uint64

// subject is what a fact is about.
type subject struct{ kind, name, of string }

const mostSubjects = 50_000

// subjects of a fact, most telling first.
func subjectsOf(b closures.Body) []subject {
	source := func(s closures.Source) subject { return subject{"source", string(s), ""} }
	switch f := b.(type) {
	case closures.AimSeen:
		if f.Telescope != "" {
			return []subject{{"telescope", string(f.Telescope), ""}}
		}
		return []subject{{"aim", string(f.Beam), ""}}
	case closures.AircraftSeen:
		return []subject{{"aircraft", f.Aircraft, string(f.Source)}, source(f.Source)}
	case closures.Sighted:
		return []subject{source(f.Source)}
	case closures.DetectorSeen:
		return []subject{source(f.Source)}
	case closures.InterlockSeen:
		return []subject{source(f.Source)}
	case closures.WeatherSeen:
		return []subject{source(f.Source)}
	case closures.Heard:
		return []subject{source(f.Source)}
	case closures.ShutterSeen:
		return []subject{{"shutter", string(f.Beam), ""}}
	case closures.LaserSeen:
		return []subject{{"shutter", string(f.Beam), ""}}
	case closures.WatchKept:
		return []subject{{"watch", f.Post, ""}}
	case closures.HoldPlaced:
		return []subject{{"hold", string(f.ID), ""}}
	case closures.ListOffered:
		if f.List != nil {
			return []subject{{"list", string(f.List.Authority()), string(f.List.ID())}}
		}
	case closures.ListConfirmed:
		return []subject{{"list", string(f.Authority), string(f.ID)}}
	case closures.ListWithdrawn:
		return []subject{{"list", string(f.Authority), string(f.ID)}}
	case closures.ClockState:
		return []subject{{"clock", "", ""}}
	case closures.RecordState:
		return []subject{{"record", "", ""}}
	}
	return nil
}

func (n newest) see(f *closures.Fact) {
	if len(n) >= mostSubjects {
		for s := range n {
			if s.kind == "aircraft" {
				delete(n, s)
			}
		}
	}
	for _, s := range subjectsOf(f.Body) {
		n[s] = f.Seq
	}
}

// of returns the entry that a finding about a beam rests on; 0 where it rests
// on none, or on one before what was replayed.
func (n newest) of(f *closures.Finding, beam closures.BeamID) uint64 {
	source := string(f.Source)
	switch f.Code {
	case closures.CodeListedClosure:
		return n[subject{"list", source, string(f.List)}]
	case closures.CodeAircraft:
		return n[subject{"aircraft", f.Ref, source}]
	case closures.CodeSighting, closures.CodeDetectorAlarm, closures.CodeInterlock, closures.CodeSourceSilent:
		return n[subject{"source", source, ""}]
	case closures.CodeFieldCrossing:
		return n[subject{"telescope", source, ""}]
	case closures.CodeHold:
		return n[subject{"hold", f.Ref, ""}]
	case closures.CodeWatchMissing:
		return n[subject{"watch", source, ""}]
	case closures.CodeAimUnknown, closures.CodeSlewing, closures.CodeElevationLimit:
		return n[subject{"aim", string(beam), ""}]
	case closures.CodeStarting:
		return n.input(f.Source, beam)
	case closures.CodeClock:
		return n[subject{"clock", "", ""}]
	case closures.CodeRecord:
		return n[subject{"record", "", ""}]
	case closures.CodeShutterFault:
		return n[subject{"shutter", string(beam), ""}]
	}
	return 0
}

// input returns the newest entry of an input: a source, or the beam's own aim.
func (n newest) input(in closures.Source, beam closures.BeamID) uint64 {
	if string(in) == string(beam) {
		return n[subject{"aim", string(beam), ""}]
	}
	return n[subject{"source", string(in), ""}]
}
