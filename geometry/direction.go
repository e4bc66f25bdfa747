package geometry

import (
	"math"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// FromHorizon returns the unit vector (X east, Y north, Z up) at azimuth az,
// from north through east, and elevation el.
func FromHorizon(az, el s1.Angle) r3.Vector {
	sa, ca := math.Sincos(az.Radians())
	se, ce := math.Sincos(el.Radians())
	return r3.Vector{X: sa * ce, Y: ca * ce, Z: se}
}

// ToHorizon returns the azimuth in [0, 2π) and the elevation of v (X east,
// Y north, Z up), which need not be a unit vector. At the zenith the azimuth
// is 0 by convention and means nothing.
func ToHorizon(v r3.Vector) (az, el s1.Angle) {
	a := math.Atan2(v.X, v.Y)
	if a < 0 {
		a += 2 * math.Pi
	}
	if a >= 2*math.Pi { // a tiny negative angle rounds up to a full turn
		a = 0
	}
	return s1.Angle(a), Elevation(v)
}

// FromEquator returns the unit vector at right ascension ra and declination
// dec: X toward the equinox, Z toward the celestial pole.
func FromEquator(ra, dec s1.Angle) r3.Vector {
	sr, cr := math.Sincos(ra.Radians())
	sd, cd := math.Sincos(dec.Radians())
	return r3.Vector{X: cr * cd, Y: sr * cd, Z: sd}
}

// ToEquator returns the right ascension in [0, 2π) and the declination of v.
func ToEquator(v r3.Vector) (ra, dec s1.Angle) {
	a := math.Atan2(v.Y, v.X)
	if a < 0 {
		a += 2 * math.Pi
	}
	if a >= 2*math.Pi {
		a = 0
	}
	return s1.Angle(a), s1.Angle(math.Atan2(v.Z, math.Hypot(v.X, v.Y)))
}

// Separation returns the angle between a and b in [0, π]. It is taken from
// both the sine and the cosine, so that it loses no digits near 0 and π. NaN
// in gives NaN out.
func Separation(a, b r3.Vector) s1.Angle {
	return s1.Angle(math.Atan2(a.Cross(b).Norm(), a.Dot(b)))
}

// Elevation returns the elevation of v (X east, Y north, Z up), which need not
// be a unit vector. NaN in gives NaN out.
func Elevation(v r3.Vector) s1.Angle {
	return s1.Angle(math.Atan2(v.Z, math.Hypot(v.X, v.Y)))
}
