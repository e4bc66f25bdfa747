package recheck

import (
	"math"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
)

// Unsure bounds the error of a direction turned between the stars and the
// horizon by this package: annual aberration (20.5 arcsec) and nutation (9 in
// declination, 17 in longitude) are left out, UT1-UTC may be up to 0.9 s
// (13.5 arcsec) off. Their sum is under 61 arcsec.
const Unsure = 100 * arcsec

const (
	degree = math.Pi / 180
	arcsec = degree / 3600
)

// point is a place on a sphere: a longitude (right ascension, azimuth) and a
// latitude (declination, elevation), in radians.
type point struct{ lon, lat float64 }

func (p point) finite() bool { return finite(p.lon, p.lat) }

func finite(values ...float64) bool {
	for _, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

// equatorial reads a vector with X toward the equinox and Z toward the pole.
func equatorial(v r3.Vector) point {
	return point{math.Atan2(v.Y, v.X), math.Asin(max(-1, min(1, v.Z)))}
}

// horizontal reads a vector with X east, Y north and Z up.
func horizontal(v r3.Vector) point {
	return point{math.Atan2(v.X, v.Y), math.Asin(max(-1, min(1, v.Z)))}
}

// apart is the angle between two points by the haversine formula, which keeps
// its digits for small angles.
func apart(a, b point) float64 {
	u, v := math.Sin((b.lat-a.lat)/2), math.Sin((b.lon-a.lon)/2)
	return 2 * math.Asin(math.Sqrt(min(1, u*u+math.Cos(a.lat)*math.Cos(b.lat)*v*v)))
}

// along is where a great circle leads that leaves p toward increasing longitude
// at the rate east and toward increasing latitude at north, both on the sphere,
// after a time: the spherical triangle with the pole.
func along(p point, east, north, t float64) point {
	d := math.Hypot(east, north) * t
	if d == 0 {
		return p
	}
	sinB, cosB := math.Sincos(math.Atan2(east, north))
	sinD, cosD := math.Sincos(d)
	sinP, cosP := math.Sincos(p.lat)
	sinQ := max(-1, min(1, sinP*cosD+cosP*sinD*cosB))
	return point{p.lon + math.Atan2(sinB*sinD*cosP, cosD-sinP*sinQ), math.Asin(sinQ)}
}

// j2000 is 2000 January 1, 12 h TT, in UTC as counted with the leap seconds of
// 2017 on.
var j2000 = time.Date(2000, time.January, 1, 11, 58, 50, 816e6, time.UTC)

// precession is the three angles of Lieske et al. (1977) from J2000.0, as in
// Meeus, Astronomical Algorithms, eq. 21.3.
type precession struct{ zeta, z, theta float64 }

func precessionAt(at time.Time) precession {
	t := at.Sub(j2000).Hours() / 24 / 36525
	return precession{
		zeta:  arcsec * t * (2306.2181 + t*(0.30188+t*0.017998)),
		z:     arcsec * t * (2306.2181 + t*(1.09468+t*0.018203)),
		theta: arcsec * t * (2004.3109 - t*(0.42665+t*0.041833)),
	}
}

// toDate turns a point of J2000.0 to the mean equator and equinox of date.
func (c precession) toDate(p point) point {
	sinD, cosD := math.Sincos(p.lat)
	sinA, cosA := math.Sincos(p.lon + c.zeta)
	sinT, cosT := math.Sincos(c.theta)
	return point{
		math.Atan2(cosD*sinA, cosT*cosD*cosA-sinT*sinD) + c.z,
		math.Asin(max(-1, min(1, sinT*cosD*cosA+cosT*sinD))),
	}
}

// fromDate is the inverse of toDate.
func (c precession) fromDate(p point) point {
	sinD, cosD := math.Sincos(p.lat)
	sinA, cosA := math.Sincos(p.lon - c.z)
	sinT, cosT := math.Sincos(c.theta)
	return point{
		math.Atan2(cosD*sinA, cosT*cosD*cosA+sinT*sinD) - c.zeta,
		math.Asin(max(-1, min(1, cosT*sinD-sinT*cosD*cosA))),
	}
}

// sidereal is the mean sidereal time at Greenwich: the Earth rotation angle of
// the IAU (2000) and the precession in right ascension of Capitaine et al.
// (2003), to its square.
func sidereal(at time.Time, ut1 time.Duration) float64 {
	noon := time.Date(2000, time.January, 1, 12, 0, 0, 0, time.UTC)
	days := (at.Sub(noon) + ut1).Hours() / 24
	t := days / 36525
	turn := 0.7790572732640 + 0.00273781191135448*days + math.Mod(days, 1)
	return 2*math.Pi*turn + arcsec*(0.014506+t*(4612.156534+t*1.3915817))
}

// toHorizon turns a point of date to azimuth (from north through east) and
// elevation by its hour angle.
func toHorizon(p point, hourAngle, latitude float64) point {
	sinH, cosH := math.Sincos(hourAngle)
	sinD, cosD := math.Sincos(p.lat)
	sinL, cosL := math.Sincos(latitude)
	return point{
		math.Atan2(-cosD*sinH, sinD*cosL-cosD*cosH*sinL),
		math.Asin(max(-1, min(1, sinL*sinD+cosL*cosD*cosH))),
	}
}

// fromHorizon returns the hour angle and the declination of an azimuth and an
// elevation.
func fromHorizon(p point, latitude float64) (hourAngle, declination float64) {
	sinA, cosA := math.Sincos(p.lon)
	sinE, cosE := math.Sincos(p.lat)
	sinL, cosL := math.Sincos(latitude)
	return math.Atan2(-sinA*cosE, sinE*cosL-cosE*cosA*sinL), math.Asin(max(-1, min(1, sinL*sinE+cosL*cosE*cosA)))
}

// sun is the Sun's place of date, within 0.01° from 1950 to 2050 (Astronomical
// Almanac, low-precision formulas).
func sun(at time.Time) point {
	n := at.Sub(j2000).Hours() / 24
	mean := degree * (280.460 + 0.9856474*n)
	anomaly := degree * (357.528 + 0.9856003*n)
	sinL, cosL := math.Sincos(mean + degree*(1.915*math.Sin(anomaly)+0.020*math.Sin(2*anomaly)))
	sinO, cosO := math.Sincos(degree * (23.439 - 4e-7*n))
	return point{math.Atan2(cosO*sinL, cosL), math.Asin(sinO * sinL)}
}

// lifted bounds from above how much the air lifts an airless elevation: 1.3
// times the formula of Sæmundsson (Meeus, eq. 16.4) for sea level and 10 °C.
func lifted(elevation float64) float64 {
	h := max(elevation/degree, 0)
	return 1.3 * 1.02 / 60 * degree / math.Tan(degree*(h+10.3/(h+5.11)))
}

// place is what turns directions at one site.
type place struct {
	lat, lon float64
	ut1      time.Duration
}

func placeOf(r *closures.Rules) place {
	p := place{lat: r.Site.Position.Lat.Radians(), lon: r.Site.Position.Lon.Radians()}
	if r.Site.UT1.Known {
		p.ut1 = r.Site.UT1.Offset
	}
	return p
}

// local turns a point of J2000.0 to the horizon.
func (s place) local(p point, at time.Time) point {
	return s.ofDate(precessionAt(at).toDate(p), at)
}

// ofDate turns a point of date to the horizon.
func (s place) ofDate(p point, at time.Time) point {
	return toHorizon(p, sidereal(at, s.ut1)+s.lon-p.lon, s.lat)
}

// stars is the inverse of local.
func (s place) stars(p point, at time.Time) point {
	h, dec := fromHorizon(p, s.lat)
	return precessionAt(at).fromDate(point{sidereal(at, s.ut1) + s.lon - h, dec})
}
