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
// before it, and keeps the rest for the turn that follows at once; until then
// no more are taken from their lane. A step decides once, after all its facts:
// an interlock that was unsafe for a moment must not be covered by the safe
// word that came after it.
func (e *Engine) part(b *batch) {
	all, kept := e.deferred, len(e.deferred) > 0
	if !kept {
		all = b.devices
	}
	n := e.agree(all)
	switch {
	case n == len(all):
		e.deferred = nil
	case kept:
		e.deferred = all[n:]
	default: // the batch's memory is used again
		e.deferred = slices.Clone(all[n:])
		clear(all[n:])
	}
	b.devices = all[:n:n]
	b.more = b.more || len(e.deferred) > 0
}

// agree returns how many words come before the first contradiction.
func (e *Engine) agree(words []pending) int {
	clear(e.says)
	for i := range words {
		who, state, ok := saysOf(words[i].body)
		if !ok {
			continue
		}
		if before, said := e.says[who]; said && before != state {
			return i
		}
		e.says[who] = state
	}
	return len(words)
}
