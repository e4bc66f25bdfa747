package sky

import (
	"errors"
	"math"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"github.com/soniakeys/meeus/v3/sidereal"
)

const (
	binLength = 12 * time.Hour
	beyond    = 12 * time.Hour // covered on either side of the bin
	reach     = binLength/2 + beyond

	ttMinusUTC = 69184 * time.Millisecond // 32.184 s and TAI-UTC, taken as 37 s

	// modelError bounds the error of Horizon apart from UT1: 0.6 arcsec of polar
	// motion, which is not applied, and 0.15 for the model, whose largest error
	// against ERFA is 0.013 (2020-2035, 18 h from the bin's middle).
	modelError = 0.75 * geometry.Arcsecond

	lightSpeed       = 299792458.0    // m/s
	astronomicalUnit = 149597870700.0 // m
	turnRate         = 7.292115855e-5 // of the Earth against the stars, rad/s
	solarDeflection  = 1.974125743e-8 // twice the Sun's gravitational radius in au
	leastDeflector   = 1.08e-5        // 1-cos of the Sun's radius, 0.267 degree
)

// Night is the sky over a site in one bin of time. It is immutable and safe
// for concurrent use; the zero Night and a nil one answer NaN.
type Night struct {
	site earth.Position
	mid  time.Time // middle of the bin
	bin  span.Span

	toDate                 rotation  // ICRS to true equator and equinox of date, at mid
	spin                   r3.Vector // turn of that frame, rad/s: a direction p of date moves by spin × p
	velocity, velocityRate r3.Vector // of the Earth in units of light's, of date; its change a second
	sun, sunRate           r3.Vector // geocentric, of date; its change a second
	turned, turnedRate     float64   // local apparent sidereal time at mid, rad; rad/s

	sinLat, cosLat float64
	diurnal        float64   // the site's own speed toward east in units of light's
	place          r3.Vector // the site from the Earth's centre in its own frame, au

	within s1.Angle
}

// Bin returns the bin of time that holds at: 0 h to 12 h or 12 h to 24 h UTC.
func Bin(at time.Time) span.Span {
	from := at.UTC().Truncate(binLength)
	return span.Span{From: from, Until: from.Add(binLength)}
}

// Prepare makes the night of the bin that holds at. It depends on the site,
// the bin and ut1 alone. A ut1 that ends before the night's Covers does is
// unknown.
func Prepare(site earth.Position, at time.Time, ut1 UT1) (*Night, error) {
	if !site.Valid() {
		return nil, errors.New("site: latitude within ±90 degrees, longitude within ±360 degrees and height within -10 to 1000 km are needed")
	}
	if err := ut1.validate(); err != nil {
		return nil, err
	}
	n := &Night{site: site, bin: Bin(at)}
	n.mid = n.bin.From.Add(binLength / 2)
	if y := n.mid.Year(); y < 1900 || y > 2100 {
		return nil, errors.New("instant: the years 1900 to 2100 are covered")
	}
	offset, within := ut1.over(n.Covers().Until)
	n.within = modelError + angleOf(within)

	half := reach.Seconds()
	jd := julianDay(n.mid)
	jde := jd + ttMinusUTC.Hours()/24
	before, now, after := slowAt(jde-reach.Hours()/24), slowAt(jde), slowAt(jde+reach.Hours()/24)
	n.toDate, n.spin = now.toDate, spinBetween(before.toDate, now.toDate, after.toDate).Mul(1/(2*half))
	n.velocity, n.velocityRate = now.velocity, after.velocity.Sub(before.velocity).Mul(1/(2*half))
	n.sun, n.sunRate = now.sun, after.sun.Sub(before.sun).Mul(1/(2*half))
	n.turned = sidereal.Mean(jd).Rad() + angleOf(offset).Radians() + now.equinoxes + site.Lon.Radians()
	n.turnedRate = siderealRate + (after.equinoxes-before.equinoxes)/(2*half)

	n.sinLat, n.cosLat = math.Sincos(site.Lat.Radians())
	ecef := site.ECEF()
	n.diurnal = turnRate * math.Hypot(ecef.X, ecef.Y) / lightSpeed
	n.place = earth.FrameAt(site).Turn(ecef).Mul(1 / astronomicalUnit)
	return n, nil
}

// Covers returns the span in which the night answers: its bin and 12 h on
// either side.
func (n *Night) Covers() span.Span {
	if n == nil || n.bin.Empty() {
		return span.Span{}
	}
	return span.Span{From: n.bin.From.Add(-beyond), Until: n.bin.Until.Add(beyond)}
}

// Error bounds the error of a direction turned by Horizon or ICRS: the model,
// polar motion, and 15 arcsec for each second that UT1-UTC is uncertain. It
// holds outside the Sun's disc, for catalogue positions as given, and against
// the WGS 84 normal: the plumb line may lean from that by some 10 arcsec, near
// steep mountains by 60 (common practice, no source).
func (n *Night) Error() s1.Angle {
	if n == nil || n.within == 0 {
		return s1.Angle(math.Pi)
	}
	return n.within
}

// Site returns the place that the night was prepared for.
func (n *Night) Site() earth.Position { return n.site }

// julianDay returns the Julian day of an instant, exact to 40 µs.
func julianDay(at time.Time) float64 {
	const unixEpoch = 2440587.5
	days := math.Floor(float64(at.Unix()) / 86400)
	rest := float64(at.Unix()) - days*86400 + float64(at.Nanosecond())*1e-9
	return unixEpoch + days + rest/86400
}
