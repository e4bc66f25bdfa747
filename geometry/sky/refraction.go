package sky

import (
	"math"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Atmosphere is the air at the site. The zero value is unknown.
type Atmosphere struct {
	PressureHPa  float64 // at the site, not reduced to sea level
	TemperatureC float64
	Known        bool
}

// Refraction lifts directions by the air of one atmosphere. The zero value
// answers NaN.
type Refraction struct {
	scale  float64 // against 1010 hPa and 10 °C
	spread float64 // share of the refraction that is uncertain for want of the atmosphere
}

// What an unknown atmosphere leaves uncertain, as a share of the refraction.
const (
	// With the standard atmosphere of the height: air of -30 to 45 °C at sea
	// level and of -70 to -15 °C on the polar plateau, at pressures 6 % either
	// side, lies within it.
	unknownSpread = 0.25
	// Where the height is unknown too: 0.40 to 1.25 of the refraction at
	// 1010 hPa and 10 °C, which is sea level to 6000 m with the same air.
	anywhereScale, anywhereSpread = 0.825, 0.52
)

// Over returns the refraction seen from a height above the ellipsoid. An
// unknown atmosphere, or one outside 100 to 1100 hPa and -90 to 60 °C, is taken
// for the standard one of that height (ICAO Doc 7488) with a larger error.
func (a Atmosphere) Over(height geometry.Length) Refraction {
	if a.plausible() {
		return a.measured()
	}
	h := math.Min(math.Max(float64(height), -500), 9000)
	r := Atmosphere{PressureHPa: 1013.25 * math.Pow(1-2.25577e-5*h, 5.25588), TemperatureC: 15 - 0.0065*h}.measured()
	r.spread = unknownSpread
	return r
}

// Anywhere is Over where the height is not at hand: the same for a known
// atmosphere, and half the refraction as error for an unknown one.
func (a Atmosphere) Anywhere() Refraction {
	if a.plausible() {
		return a.measured()
	}
	return Refraction{scale: anywhereScale, spread: anywhereSpread}
}

func (a Atmosphere) measured() Refraction {
	return Refraction{scale: a.PressureHPa / 1010 * 283 / (273 + a.TemperatureC)}
}

func (a Atmosphere) plausible() bool {
	return a.Known && a.PressureHPa >= 100 && a.PressureHPa <= 1100 && a.TemperatureC >= -90 && a.TemperatureC <= 60
}

// Refraction is Over the night's site.
func (n *Night) Refraction(a Atmosphere) Refraction { return a.Over(n.site.Height) }

// What the air does to a rate: along an airless path of length x the observed
// direction moves at most x·RefractionStretch, and its stated error changes by
// at most x·RefractionErrorSlope.
const (
	RefractionStretch    = 1.03
	RefractionErrorSlope = 0.2
)

// Refract is a.Anywhere().Refract(airless).
func Refract(airless r3.Vector, a Atmosphere) (observed r3.Vector, err s1.Angle) {
	return a.Anywhere().Refract(airless)
}

// Unrefract is a.Anywhere().Unrefract(observed).
func Unrefract(observed r3.Vector, a Atmosphere) (airless r3.Vector, err s1.Angle) {
	return a.Anywhere().Unrefract(observed)
}

// Refract lifts an airless direction (X east, Y north, Z up, unit length) to
// the observed one. It is continuous and keeps the order of elevations over
// the whole sphere (to rounding); err bounds its error for visible and near infrared light.
func (r Refraction) Refract(airless r3.Vector) (observed r3.Vector, err s1.Angle) {
	return r.bend(airless, r.Observed)
}

// Unrefract is the inverse of Refract, to 1e-12 rad.
func (r Refraction) Unrefract(observed r3.Vector) (airless r3.Vector, err s1.Angle) {
	return r.bend(observed, r.Airless)
}

// bend moves v in elevation alone.
func (r Refraction) bend(v r3.Vector, elevation func(s1.Angle) (s1.Angle, s1.Angle)) (r3.Vector, s1.Angle) {
	if !isUnit(v) || !(r.scale > 0) {
		return nowhere(), math.Pi
	}
	flat := math.Hypot(v.X, v.Y)
	el, err := elevation(s1.Angle(math.Atan2(v.Z, flat)))
	if flat == 0 {
		return v, err
	}
	se, ce := math.Sincos(el.Radians())
	return r3.Vector{X: v.X / flat * ce, Y: v.Y / flat * ce, Z: se}, err
}

// Observed returns the observed elevation of an airless one in [-90°, 90°].
func (r Refraction) Observed(airless s1.Angle) (observed, err s1.Angle) {
	h := airless.Degrees()
	if !(math.Abs(h) <= 90) || !(r.scale > 0) {
		return s1.Angle(math.NaN()), math.Pi
	}
	// Newton's rule on airless(x) = h. The slope of airless is 0.97 to 1.5,
	// and it is nearly straight over a step, so few steps are needed: two at
	// 30 degrees, four at the horizon.
	x := h
	for range 20 {
		l, slope := r.lift(x)
		step := (x - l - h) / (1 - slope)
		x -= step
		if math.Abs(step) < 1e-6 { // what is left is under its square
			break
		}
	}
	x = math.Min(x, 90)
	return deg(x), r.err(x, x-h)
}

// Airless returns the airless elevation of an observed one in [-90°, 90°].
func (r Refraction) Airless(observed s1.Angle) (airless, err s1.Angle) {
	h := observed.Degrees()
	if !(math.Abs(h) <= 90) || !(r.scale > 0) {
		return s1.Angle(math.NaN()), math.Pi
	}
	l, _ := r.lift(h)
	return deg(h - l), r.err(h, l)
}

// lift returns the refraction at an observed elevation, and its slope, all in
// degrees.
func (r Refraction) lift(h float64) (lift, slope float64) {
	if h >= floor {
		lift, slope = bennett(h)
	} else {
		// Nothing was ever measured down here: it fades to nothing at the nadir.
		s, c := math.Sincos(h * radian)
		lift, _ = bennett(floor)
		lift /= math.Cos(floor * radian)
		lift, slope = lift*c, -lift*s*radian
	}
	return lift * r.scale, slope * r.scale
}

const (
	floor  = -0.5 // observed elevation down to which Bennett's formula is used, degrees
	radian = math.Pi / 180
)

// bennett returns the refraction at an observed elevation at 1010 hPa and
// 10 °C by Bennett's formula as improved by him (Meeus, ch. 16, p. 106; good
// to 0.015 arcmin), and its slope, all in degrees. Close to the zenith, where
// it would be below zero by 0.015 arcmin, it is zero.
func bennett(h float64) (lift, slope float64) {
	d := h + 4.4
	s, c := math.Sincos((h + 7.31/d) * radian)
	cot := c / s // arcmin
	sk, ck := math.Sincos((14.7*cot + 13) * radian)
	lift = cot - 0.06*sk
	if !(lift > 0) {
		return 0, 0
	}
	slope = -(1 - 7.31/(d*d)) * radian / (s * s) * (1 - 0.06*14.7*radian*ck)
	return lift / 60, slope / 60
}

// err bounds the error of a lift at an observed elevation h, in degrees: 2
// arcsec; 3 % for the formula, the colour and the measuring of the air; what is
// unknown of the air; and what its layers do near the horizon, 12 arcmin there
// and half an arcmin at 5 degrees. Below the horizon it grows to more than the
// whole refraction. It changes slowly, so that a search can rely on its rate.
func (r Refraction) err(h, lift float64) s1.Angle {
	layers := 0.2
	if h > 0 {
		layers *= math.Exp(-h * h / 8)
	} else {
		layers += 0.1 * math.Min(-h, 10)
	}
	return 2*geometry.Arcsecond + deg(lift*(0.03+r.spread)+layers)
}

func deg(d float64) s1.Angle { return s1.Angle(d) * s1.Degree }
