package sky

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Rates of change in the horizon frame, rad a second: no direction moves
// faster.
const (
	// SkyRate bounds a fixed ICRS direction: the sidereal turn of 15.0411
	// arcsec a second, 1.0001 of it by aberration, and the changes of
	// aberration, nutation and deflection (under 0.001).
	SkyRate = 15.05 * arcsec
	// SunRate bounds the Sun: the turn, its own motion (0.0425) and its
	// parallax.
	SunRate = 15.1 * arcsec
)

// SunError bounds the error of the Sun's direction, UT1 apart.
const SunError = s1.Angle(0.02 * math.Pi / 180)

// Sun is At(at).Sun(), without the work for the stars.
func (n *Night) Sun(at time.Time) r3.Vector {
	t, ok := n.since(at)
	if !ok {
		return nowhere()
	}
	d := n.frame(t)
	s := d.turn(n.sunAt(t)).Sub(n.place)
	return scaled(s, s.Norm2())
}

// sunAt returns the Sun's geocentric direction of date, t seconds from the
// bin's middle. The straight line leaves the unit sphere by 0.00009 in 18 h,
// which is much beside 1-cos of a small distance from the Sun.
func (n *Night) sunAt(t float64) r3.Vector {
	s := n.sun.Add(n.sunRate.Mul(t))
	return s.Mul(1 / math.Sqrt(s.Norm2()))
}

// SiderealTime returns the local apparent sidereal time in [0, 2π).
func (n *Night) SiderealTime(at time.Time) s1.Angle {
	t, ok := n.since(at)
	if !ok {
		return s1.Angle(math.NaN())
	}
	a := math.Mod(n.turned+n.turnedRate*t, 2*math.Pi)
	if a < 0 {
		a += 2 * math.Pi
	}
	return s1.Angle(a)
}
