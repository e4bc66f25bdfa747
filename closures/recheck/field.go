package recheck

import (
	"math"

	"github.com/golang/geo/r3"

	"beamward/closures"
)

// fields checks the neighbour telescopes that we yield to: each must be heard,
// or be one whose silence is ignored, and no sampled point of the beam may lie
// in its field.
func (l *look) fields() string {
	for i := range l.rules.Neighbours {
		n := &l.rules.Neighbours[i]
		if n.Yields != closures.YieldsOurs || !sees(n, l.beam) {
			continue
		}
		var p *closures.Pointing
		for j := range l.f.Pointings {
			if l.f.Pointings[j].Telescope == n.ID {
				p = &l.f.Pointings[j]
			}
		}
		silent := p == nil || p.Aim == nil || older(l.at, p.Seen.Said, p.Heard) > n.StaleAfter+instants
		if silent && !n.IgnoreSilent {
			return "second opinion: a neighbour's pointing is not known"
		}
		if silent || n.OnlyExposing && p.Seen.Exposing == closures.No {
			continue
		}
		if l.crosses(n, p) {
			return "second opinion: the beam is in a neighbour's field"
		}
	}
	return ""
}

func sees(n *closures.NeighbourRules, b *closures.BeamRules) bool {
	for _, band := range n.Passbands {
		if b.Wavelength >= band.From && b.Wavelength <= band.Until {
			return true
		}
	}
	return len(n.Passbands) == 0
}

// vector is the unit vector (X east, Y north, Z up) of an azimuth and an
// elevation.
func vector(p point) r3.Vector {
	sinA, cosA := math.Sincos(p.lon)
	sinE, cosE := math.Sincos(p.lat)
	return r3.Vector{X: sinA * cosE, Y: cosA * cosE, Z: sinE}
}

// crosses samples the beam from each launch at heights of its light, each a
// fifth higher than the last, and asks whether one lies within the field's
// radius. The errors that the decision adds are left out: they are more than
// this package is unsure.
func (l *look) crosses(n *closures.NeighbourRules, p *closures.Pointing) bool {
	theirs := aim{Aim: p.Aim, site: l.aim.site}
	q, ok := theirs.local(l.at)
	if !ok || !(l.now.lat > 5*degree) || !(q.lat > 10*degree) {
		return false // the limits tell of our beam; a low telescope is left to the decision
	}
	axis, beam := vector(q), vector(l.now)
	field := n.Field
	if p.Seen.Field > 0 {
		field = p.Seen.Field
	}
	cos := math.Cos(field.Radians())
	const column, first = 40e3, 100.0 // m above the ellipsoid; m above the launch
	for _, launch := range l.beam.Launches {
		from := launch.Offset.Sub(n.Offset)
		for h := first; ; h *= 1.2 {
			height := h + launch.Offset.Z + float64(l.rules.Site.Position.Height)
			if height > column {
				break
			}
			v := from.Add(beam.Mul(h / beam.Z))
			if v.Dot(axis) >= cos*v.Norm() {
				return true
			}
		}
	}
	return false
}
