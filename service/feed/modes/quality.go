package modes

import (
	"math"

	"beamward/geometry"
	"beamward/geometry/encounter"
)

const (
	foot     = 0.3048
	knot     = 1852.0 / 3600
	fpm      = foot / 60
	nautical = 1852.0
)

// unknown marks a bound that is not stated.
const unknown = -1

// accuracies holds the horizontal 95 % bound in metres of each NACp, EPU.
var accuracies = [16]float64{unknown, 10 * nautical, 4 * nautical, 2 * nautical, nautical, 926, 556, 185, 93, 30, 10, 3,
	unknown, unknown, unknown, unknown}

// verticals holds the vertical 95 % bound in metres of each NACp, VEPU, as
// version 1 states it.
var verticals = [16]float64{9: 45, 10: 15, 11: 4}

// geometricVerticals holds the vertical 95 % bound in metres of each GVA, as
// version 2 states it (DO-260B, from memory).
var geometricVerticals = [4]float64{1: 150, 2: 45}

// speeds holds the horizontal and the vertical 95 % bound of the velocity in
// metres a second of each NACv.
var speeds = [8][2]float64{1: {10, 15.2}, 2: {3, 4.5}, 3: {1, 1.5}, 4: {0.3, 0.46}}

// containment returns the radius in metres that a position's type code states
// by its integrity category, with the supplements a and c of the status and b
// of the position. With no status at hand, or with a combination that is not
// defined, the largest radius that the type code could stand for counts.
// unknown: none is stated.
func containment(tc uint8, s *Status, known, b, bKnown bool) float64 {
	version := s.Version
	if !known {
		// What versions 0, 1 and 2 could mean.
		r := containment(tc, &Status{Version: 0}, true, false, true)
		for v := uint8(1); v <= 2; v++ {
			if o := containment(tc, &Status{Version: v, NICa: false, NICc: true}, true, false, false); o == unknown || r == unknown {
				return unknown
			} else if o > r {
				r = o
			}
		}
		return r
	}
	a := s.NICa
	switch tc {
	case 9, 20, 5:
		return 7.5
	case 10, 21, 6:
		return 25
	case 11:
		if version == 1 && a || version == 2 && a && b && bKnown {
			return 75
		}
		return 185
	case 12:
		return 370
	case 13:
		switch {
		case version == 0:
			return 926
		case version == 1 && !a:
			return 926
		case version == 2 && !a && b && bKnown:
			return 556
		case version == 2 && !a && !b && bKnown:
			return 926
		}
		return 1111.2 // 0.6 NM
	case 14:
		return nautical
	case 15:
		return 2 * nautical
	case 16:
		switch {
		case version == 0:
			return 10 * nautical
		case version == 1 && a, version == 2 && a && b && bKnown:
			return 4 * nautical
		}
		return 8 * nautical
	case 17:
		return 20 * nautical
	case 7: // surface codes 7 and 8: DO-260B, from memory
		if version == 2 && a && !s.NICc {
			return 75
		}
		return 185
	case 8:
		switch {
		case version == 2 && a && s.NICc:
			return 370
		case version == 2 && a:
			return 556
		case version == 2 && s.NICc:
			return 1111.2
		}
	}
	return unknown
}

// scales brings a containment radius to a chance of 10⁻⁷ of lying outside, by
// the integrity level that states 10⁻³, 10⁻⁵ or 10⁻⁷, for a normal error:
// sqrt(ln 10⁻⁷ / ln p). An unknown level is taken as the worst of them.
var scales = [4]float64{math.Sqrt(7.0 / 3), math.Sqrt(7.0 / 3), math.Sqrt(7.0 / 5), 1}

// binWidth is more than the width of a step of a position, in metres.
const binWidth = 6

// horizontal is the hard bound of a position's horizontal error: the larger of
// what integrity and accuracy give, and the source's own bound besides where
// either says that it does not know.
func horizontal(radius float64, s *Status, known bool, own geometry.Length) geometry.Length {
	level, accuracy := uint8(0), float64(unknown)
	if known && s.Version > 0 {
		level, accuracy = s.SIL, accuracies[s.NACp&15]
	}
	e := geometry.Length(0)
	if radius == unknown {
		e = own
	} else {
		e = geometry.Length(radius * scales[level&3])
	}
	if known && s.Version > 0 {
		if accuracy == unknown || level == 0 {
			e = max(e, own)
		}
		if accuracy != unknown {
			e = max(e, encounter.HardHorizontal(geometry.Length(accuracy)))
		}
	}
	return e + binWidth
}

// vertical is the 95 % bound of a geometric height in metres; unknown: none is
// stated.
func vertical(s *Status, known bool) float64 {
	v := 0.0
	switch {
	case !known:
	case s.Version == 2:
		v = geometricVerticals[s.GVA&3]
	case s.Version == 1:
		v = verticals[s.NACp&15]
	}
	if v == 0 {
		return unknown
	}
	return v
}
