package earth

import (
	"math"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// nearCentre is the distance from the Earth's centre, in metres, within which
// a point has no latitude of its own: the ellipsoid's centres of curvature
// lie up to 43 km from it.
const nearCentre = 100e3

// FromECEF returns the geodetic position of an Earth-fixed vector in metres,
// its longitude in [-π, π], to better than a micrometre from -10 km to 1000 km
// of height, at the poles and the equator too. A vector that is not finite or
// lies within 100 km of the Earth's centre gives NaN throughout.
//
// The reduced latitude β is iterated after Bowring, Survey Review 23 (1976)
// 323, without a division that fails at a pole; the height is the projection
// on the vertical, which holds everywhere.
func FromECEF(v r3.Vector) Position {
	if !geometry.FiniteVector(v) || !(v.Norm() > nearCentre) {
		nan := math.NaN()
		return Position{s1.Angle(nan), s1.Angle(nan), geometry.Length(nan)}
	}
	const (
		a       = float64(EquatorialRadius)
		b       = a * (1 - Flattening)
		second2 = eccentricity2 / (1 - eccentricity2)
	)
	p := math.Hypot(v.X, v.Y)
	// sin and cos of β, then of the latitude; each pass gains five digits near
	// the ground and two at the edge of what is promised.
	sin, cos := unit(v.Z*a, p*b)
	for range 3 {
		sin, cos = unit(v.Z+second2*b*sin*sin*sin, p-eccentricity2*a*cos*cos*cos)
		sin, cos = unit(b*sin, a*cos)
	}
	sin, cos = unit(a*sin, b*cos)
	return Position{
		Lat:    s1.Angle(math.Atan2(sin, cos)),
		Lon:    s1.Angle(math.Atan2(v.Y, v.X)),
		Height: geometry.Length(p*cos + v.Z*sin - a*math.Sqrt(1-eccentricity2*sin*sin)),
	}
}

// unit scales a pair to the sine and cosine of its angle.
func unit(sin, cos float64) (float64, float64) {
	n := math.Hypot(sin, cos)
	return sin / n, cos / n
}

// Offset returns the position that lies east, north and up of p, in metres, in
// the frame at p.
func (p Position) Offset(enu r3.Vector) Position { return FromECEF(FrameAt(p).ECEF(enu)) }
