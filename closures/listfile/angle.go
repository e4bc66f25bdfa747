package listfile

import (
	"math"
	"strconv"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
)

// picodegrees counts units of 1e-12 degree, 3.6e-9 arcsec. Lists keep angles
// to this and no finer, for two reasons. A full turn is 3.6e14 of them, well
// under 2^53, so a float64 of degrees names each exactly. And the way through
// radians and a unit vector loses at most 0.2 of one, so rounding brings back
// the digits that were read.
type picodegrees int64

const (
	perDegree picodegrees = 1e12
	fullTurn              = 360 * perDegree
)

// roundDegrees returns deg to the nearest unit. deg must be within ±360.
func roundDegrees(deg float64) picodegrees { return picodegrees(math.Round(deg * float64(perDegree))) }

// degrees returns the angle in degrees: the float64 nearest to the decimal.
func (p picodegrees) degrees() float64 { return float64(p) / float64(perDegree) }

func (p picodegrees) angle() s1.Angle { return s1.Angle(p.degrees()) * s1.Degree }

func unitsOf(a s1.Angle) picodegrees { return roundDegrees(a.Degrees()) }

// equator returns the ICRS unit vector at right ascension ra and declination
// dec.
func equator(ra, dec picodegrees) r3.Vector { return geometry.FromEquator(ra.angle(), dec.angle()) }

// unitsOfEquator returns the right ascension, from 0 to under 360°, and the
// declination of v.
func unitsOfEquator(v r3.Vector) (ra, dec picodegrees) {
	a, d := geometry.ToEquator(v)
	ra, dec = unitsOf(a), unitsOf(d)
	if ra == fullTurn {
		ra = 0
	}
	return ra, dec
}

// appendDegrees appends p as a plain decimal with no more digits than it
// needs: no exponent, no plus, no negative zero.
func appendDegrees(dst []byte, p picodegrees) []byte {
	if p < 0 {
		dst = append(dst, '-')
		p = -p
	}
	dst = strconv.AppendInt(dst, int64(p/perDegree), 10)
	rest := p % perDegree
	if rest == 0 {
		return dst
	}
	dst = append(dst, '.')
	for unit := perDegree / 10; rest > 0; unit /= 10 {
		dst = append(dst, byte('0'+rest/unit))
		rest %= unit
	}
	return dst
}
