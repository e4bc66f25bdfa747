package asterix

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

// The quality tables are those of the squitters that the station heard: J. Sun,
// The 1090 Megahertz Riddle, 2nd ed. (TU Delft OPEN, 2021), "Uncertainties".
// Where a category stands for several radii the largest counts.
var (
	// radii holds the containment radius of each NIC, in metres.
	radii = [16]float64{unknown, 20 * nautical, 8 * nautical, 4 * nautical, 2 * nautical, nautical, 1111.2, 370, 185, 75, 25, 7.5,
		unknown, unknown, unknown, unknown}
	// oldRadii holds that of each NUCp, which version 0 states in its place.
	oldRadii = [16]float64{unknown, 20 * nautical, 10 * nautical, 2 * nautical, nautical, 926, 370, 185, 25, 7.5,
		unknown, unknown, unknown, unknown, unknown, unknown}
	// accuracies holds the horizontal 95 % bound of each NACp, in metres.
	accuracies = [16]float64{unknown, 10 * nautical, 4 * nautical, 2 * nautical, nautical, 926, 556, 185, 93, 30, 10, 3,
		unknown, unknown, unknown, unknown}
	// verticals holds the vertical 95 % bound of each NACp as version 1 states
	// it, geometricVerticals that of each GVA as version 2 does (DO-260B, from
	// memory), in metres.
	verticals          = [16]float64{9: 45, 10: 15, 11: 4}
	geometricVerticals = [4]float64{1: 150, 2: 45}
	// speeds holds the horizontal and the vertical 95 % bound of the velocity
	// of each NACv, in metres a second.
	speeds = [8][2]float64{1: {10, 15.2}, 2: {3, 4.5}, 3: {1, 1.5}, 4: {0.3, 0.46}}
	// scales brings a containment radius to a chance of 10⁻⁷ of lying outside,
	// by the integrity level that states 10⁻³, 10⁻⁵ or 10⁻⁷, for a normal
	// error. An unknown level is taken as the worst.
	scales = [4]float64{math.Sqrt(7.0 / 3), math.Sqrt(7.0 / 3), math.Sqrt(7.0 / 5), 1}
)

// radius is the containment that a record states; unknown: none.
func (r *Record) radius() float64 {
	switch {
	case !r.HasQuality:
		return unknown
	case r.HasVersion && r.Version == 0:
		return oldRadii[r.NIC&15]
	case r.HasVersion && r.Version <= 3:
		return radii[r.NIC&15]
	}
	a, b := oldRadii[r.NIC&15], radii[r.NIC&15]
	if a == unknown || b == unknown {
		return unknown
	}
	return max(a, b)
}

// stated reports whether accuracy and integrity are stated beside the
// containment.
func (r *Record) stated() bool { return r.HasNACp && r.HasVersion && r.Version > 0 && r.Version <= 3 }

// horizontal is the hard bound of the horizontal error, but for the position's
// step: the larger of what integrity and accuracy give, and the source's own
// bound besides where either says that it does not know.
func (r *Record) horizontal(own geometry.Length) geometry.Length {
	level, accuracy := uint8(0), float64(unknown)
	if r.stated() {
		level, accuracy = r.SIL, accuracies[r.NACp&15]
	}
	e := own
	if radius := r.radius(); radius != unknown {
		e = geometry.Length(radius * scales[level&3])
	}
	if r.stated() {
		if accuracy == unknown || level == 0 {
			e = max(e, own)
		}
		if accuracy != unknown {
			e = max(e, encounter.HardHorizontal(geometry.Length(accuracy)))
		}
	}
	return e
}

// vertical is the 95 % bound of the geometric height in metres; unknown: none
// is stated.
func (r *Record) vertical(gva bool) float64 {
	v := 0.0
	switch {
	case !r.stated():
	case r.Version >= 2 && r.HasGVA && gva:
		v = geometricVerticals[r.GVA&3]
	case r.Version == 1:
		v = verticals[r.NACp&15]
	}
	if v == 0 {
		return unknown
	}
	return v
}
