package sky

import (
	"math"

	"github.com/golang/geo/r3"
	"github.com/soniakeys/meeus/v3/apparent"
	"github.com/soniakeys/meeus/v3/base"
	"github.com/soniakeys/meeus/v3/coord"
	"github.com/soniakeys/meeus/v3/nutation"
	"github.com/soniakeys/meeus/v3/precess"
	"github.com/soniakeys/meeus/v3/solar"
	"github.com/soniakeys/unit"
)

// slow is what changes slowly, at one instant.
type slow struct {
	toDate    rotation  // ICRS to true equator and equinox of date
	equinoxes float64   // equation of the equinoxes, rad
	velocity  r3.Vector // Earth's barycentric velocity in units of light's, of date
	sun       r3.Vector // geocentric apparent direction of the Sun, of date
}

// slowAt computes it for a Julian ephemeris day (TT).
func slowAt(jde float64) slow {
	t := base.J2000Century(jde)
	dpsi, deps := nutation.Nutation(jde)
	// The precession rates of IAU 2000 against IAU 1976 (IERS Conventions
	// 2003, ch. 5; eraPr00), small enough to go with the nutation.
	psi := dpsi.Rad() - 0.29965*arcsec*t
	eps := deps.Rad() - 0.02524*arcsec*t
	mean := nutation.MeanObliquity(jde).Rad()

	nutate := aboutX(-(mean + eps)).after(aboutZ(-psi)).after(aboutX(mean))
	toDate := nutate.after(precession(jde)).after(bias())
	return slow{
		toDate:    toDate,
		equinoxes: psi*math.Cos(mean+eps) + 0.014506*arcsec, // the IAU 2000 sidereal time at J2000.0 less that of 1982 (eraGmst00)
		velocity:  toDate.turn(velocity(jde)),
		sun:       sunOfDate(t, psi, mean+eps),
	}
}

// precession is the rotation from the mean equator and equinox of J2000.0 to
// those of jde. Meeus's routine works on a pair of angles; the images of two
// axes give the matrix.
func precession(jde float64) rotation {
	p := precess.NewPrecessor(2000, base.JDEToJulianYear(jde))
	image := func(ra unit.RA) r3.Vector {
		eq := coord.Equatorial{RA: ra}
		p.Precess(&eq, &eq)
		sr, cr := eq.RA.Sincos()
		sd, cd := eq.Dec.Sincos()
		return r3.Vector{X: cr * cd, Y: sr * cd, Z: sd}
	}
	x, y := image(0), image(math.Pi/2)
	z := x.Cross(y)
	return rotation{
		r3.Vector{X: x.X, Y: y.X, Z: z.X},
		r3.Vector{X: x.Y, Y: y.Y, Z: z.Y},
		r3.Vector{X: x.Z, Y: y.Z, Z: z.Z},
	}
}

// bias is the rotation from ICRS to the mean equator and equinox of J2000.0
// (IERS Conventions 2003, ch. 5; eraBi00): 0.02 arcsec in all.
func bias() rotation {
	const (
		xi    = -0.041775 * 0.39777716 * arcsec // in longitude, times the sine of the obliquity
		eta   = -0.0068192 * arcsec
		alpha = -0.0146 * arcsec
	)
	return rotation{
		r3.Vector{X: 1, Y: alpha, Z: -xi},
		r3.Vector{X: -alpha, Y: 1, Z: -eta},
		r3.Vector{X: xi, Y: eta, Z: 1},
	}
}

// velocity is the Earth's by the Ron-Vondrák expression. Meeus's routine gives
// its effect on a star; the effect on stars at right ascension 0 h and 6 h on
// the equator is the velocity's components.
func velocity(jde float64) r3.Vector {
	y, z := apparent.AberrationRonVondrak(0, 0, jde)
	x, _ := apparent.AberrationRonVondrak(unit.RA(math.Pi/2), 0, jde)
	return r3.Vector{X: -x.Rad(), Y: y.Rad(), Z: z.Rad()}
}

// sunOfDate is the Sun's apparent direction: true longitude (ch. 25, to 0.01
// degree), nutation and aberration.
func sunOfDate(t, psi, obliquity float64) r3.Vector {
	s, _ := solar.True(t)
	lon := s.Rad() + psi - 20.4898*arcsec/solar.Radius(t)
	sl, cl := math.Sincos(lon)
	se, ce := math.Sincos(obliquity)
	return r3.Vector{X: cl, Y: ce * sl, Z: se * sl}
}
