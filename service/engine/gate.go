package engine

import "beamward/closures"

// gate stands between the core's word that a beam opens and its publication.
// The zero gate is shut.
type gate struct {
	granted bool
	opening uint64 // number of the entry that records the opening; 0: not queued
}

// pass returns the beam as published, and whether an opening has to be
// recorded. An opening is granted only by a decision made after its entry was
// seen to be durable.
func (g *gate) pass(d *closures.Decision, c Condition) (b BeamView, record, granted bool) {
	b.Decision = d
	switch {
	case !d.Open:
		*g = gate{}
	case g.granted:
	case g.opening != 0 && c.Durable >= g.opening && !c.Gap:
		g.granted, granted = true, true
	default:
		b.Decision, b.Opening = withheld(d), true
		record = g.opening == 0
	}
	return b, record, granted
}
