package simulate

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// What the judge measures, in the plainest form there is.

const degree = math.Pi / 180

// angle is the angle between two unit vectors, radians.
func angle(a, b r3.Vector) float64 { return math.Atan2(a.Cross(b).Norm(), a.Dot(b)) }

// seenElevation is the elevation through the air, degrees (Saemundsson's
// formula at 760 hPa and 4 °C).
func seenElevation(up r3.Vector) float64 {
	h := math.Atan2(up.Z, math.Hypot(up.X, up.Y)) / degree
	minutes := 1.02 / math.Tan((h+10.3/(h+5.11))*degree) * 760 / 1010 * 283 / (273 + 4)
	return h + minutes/60
}

// sunElevation is the airless elevation of the Sun's centre at the site,
// degrees, to 0.02 (the low-precision formulae of the Astronomical Almanac,
// page C5, and Greenwich mean sidereal time).
func sunElevation(at time.Time) float64 {
	n := at.Sub(time.Date(2000, 1, 1, 12, 0, 0, 0, time.UTC)).Hours() / 24
	mean := (280.460 + 0.9856474*n) * degree
	g := (357.528 + 0.9856003*n) * degree
	long := mean + (1.915*math.Sin(g)+0.020*math.Sin(2*g))*degree
	tilt := (23.439 - 0.0000004*n) * degree
	ra, dec := math.Atan2(math.Cos(tilt)*math.Sin(long), math.Cos(long)), math.Asin(math.Sin(tilt)*math.Sin(long))
	hour := (280.46061837+360.98564736629*n)*degree + skerry.Lon.Radians() - ra
	lat := skerry.Lat.Radians()
	return math.Asin(math.Sin(lat)*math.Sin(dec)+math.Cos(lat)*math.Cos(dec)*math.Cos(hour)) / degree
}

// heightOver is the height over the ellipsoid of a point, metres, to some
// metres.
func heightOver(x r3.Vector) float64 {
	return siteHeightM + x.Z + (x.X*x.X+x.Y*x.Y)/(2*earthM)
}

// inKeepOut reports whether any part of an aircraft is in the keep-out about
// the light.
func inKeepOut(x, up r3.Vector, p *beamPaper) bool {
	for _, l := range p.launches {
		v := x.Sub(l)
		along := v.Dot(up)
		if along <= -aircraftM || heightOver(x)-aircraftM > keepTopM {
			continue
		}
		if math.Sqrt(max(v.Norm2()-along*along, 0)) <= keepRadiusM+aircraftM {
			return true
		}
		r := v.Norm()
		if r <= aircraftM || angle(v.Mul(1/r), up)-math.Asin(aircraftM/r) <= keepHalfDeg*degree {
			return true
		}
	}
	return false
}

// crosses reports whether light of the beam lies in the neighbour's field: the
// column up to 40 km, and the star.
func crosses(up, axis r3.Vector, p *beamPaper) bool {
	for _, l := range p.launches {
		for s := 10.0; s < 400e3; s *= 1.03 {
			x := l.Add(up.Mul(s))
			h := heightOver(x)
			if h > 40e3 && (h < p.star[0] || h > p.star[1]) {
				continue
			}
			v := x.Sub(p.telescopeAt)
			r := v.Norm()
			wide := (p.aperture + mirrorM) / 2
			if r > 4*wide && v.Dot(axis) < 0.9*r {
				continue // more than 25° apart, which no width makes up for
			}
			if r <= wide || angle(v.Mul(1/r), axis)-math.Asin(wide/r) < fieldDeg*degree {
				return true
			}
		}
	}
	return false
}

func radians(a s1.Angle) float64 { return float64(a) }
