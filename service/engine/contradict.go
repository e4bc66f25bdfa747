package engine

import (
	"slices"

	"beamward/closures"
)

// deviceSays is what one device's word means for a beam.
type deviceSays struct {
	kind kind
	name string // of the source, the beam or the post
}

// saysOf returns whose word a fact is and what it says; ok is false for facts
// that are no device's state.
func saysOf(b closures.Body) (who deviceSays, state uint8, ok bool) {
	bit := func(yes bool) uint8 {
		if yes {
			return 1
		}
		return 0
	}
	switch f := b.(type) {
	case closures.InterlockSeen:
		return deviceSays{kindInterlock, string(f.Source)}, bit(f.Safe), true
	case closures.DetectorSeen:
		return deviceSays{kindDetector, string(f.Source)}, uint8(f.State), true
	case closures.Sighted:
		return deviceSays{kindSighting, string(f.Source)}, bit(f.Clear), true
	case closures.ShutterSeen:
		return deviceSays{kindShutter, string(f.Beam)}, uint8(f.Position), true
	case closures.LaserSeen:
		return deviceSays{kindLaser, string(f.Beam)}, bit(f.Emitting), true
	}
	return deviceSays{}, 0, false
}

// part cuts a turn's devices' words before the first that contradicts one
// before it, and keeps the rest for the turn that follows at once. A step
// decides once, after all its facts: an interlock that was unsafe for a moment
// must not be covered by the safe word that came after it.
func (e *Engine) part(b *batch) {
	all := b.devices
	if len(e.deferred) > 0 {
		all = append(e.deferred, all...)
		e.deferred = nil
	}
	clear(e.says)
	for i := range all {
		who, state, ok := saysOf(all[i].body)
		if !ok {
			continue
		}
		if before, said := e.says[who]; said && before != state {
			e.deferred = slices.Clone(all[i:])
			clear(all[i:])
			all = all[:i]
			break
		}
		e.says[who] = state
	}
	b.devices = all
	b.more = b.more || len(e.deferred) > 0
}
