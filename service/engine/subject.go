package engine

import "beamward/closures"

// subject is whose newest fact waits: never the same for two senders.
type subject struct {
	from    closures.Source // who sent it
	kind    kind
	variant uint8  // reports of different use do not replace each other
	name    string // of the beam, telescope, source or aircraft
	by      string // of the aim's sender or the aircraft's source
}

// Variants of aircraft reports. A report without a position must not replace
// one with, nor one from the ground one from the air, nor a drill a true one.
const (
	located  = 1 << 0
	onGround = 1 << 1
	drill    = 1 << 2
)

func subjectOf(from closures.Source, b closures.Body) subject {
	s := subject{from: from}
	switch f := b.(type) {
	case closures.AircraftSeen:
		s.kind, s.name, s.by = kindAircraft, f.Aircraft, string(f.Source)
		if f.Located {
			s.variant |= located
		}
		if f.OnGround {
			s.variant |= onGround
		}
		if f.Drill {
			s.variant |= drill
		}
	case closures.AimSeen:
		s.kind, s.by, s.variant = kindAim, f.From, motionOf(f.Aim)
		if s.name = string(f.Beam); f.Telescope != "" {
			s.name, s.variant = string(f.Telescope), s.variant|1<<7
		}
	case closures.Heard:
		s.kind, s.name, s.variant = kindHeard, string(f.Source), uint8(f.Scope)
	}
	return s
}

// carry keeps in the newer of two facts what the older says of the time
// between them: that a connection was made, after which reception starts
// again.
func carry(kept, dropped closures.Body) closures.Body {
	k, ok := kept.(closures.Heard)
	if d, also := dropped.(closures.Heard); ok && also && d.Connected && !k.Connected {
		k.Connected = true
		return k
	}
	return kept
}

// motionOf keeps aims of different motion apart, so that a slew is not lost
// behind the tracking that follows it.
func motionOf(a *closures.Aim) uint8 {
	if a == nil {
		return 0
	}
	return uint8(a.Motion) + 1
}
