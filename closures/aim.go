package closures

import (
	"sort"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
)

// AimFrame is the frame in which an aim is stated.
type AimFrame uint8

// The frames of aims. The zero value is no aim.
const (
	NoFrame AimFrame = iota
	ICRS
	OfDate  // apparent, topocentric: true equator and equinox of date
	Horizon // azimuth and elevation
	Table   // an ephemeris table of ICRS points
)

// Motion says what a telescope is doing.
type Motion uint8

// The motions. The zero value is not said, which is unknown for a beam.
const (
	MotionNotSaid Motion = iota
	Tracking
	Slewing
	Parked
	Fixed
)

// Aim is where something points, as a function of time. It is immutable.
type Aim struct {
	Frame     AimFrame
	Direction r3.Vector // unit vector in Frame at Reference; see geometry.FromEquator and FromHorizon
	Reference time.Time // when Direction holds; zero: J2000.0 proper motion only, no rates
	RateRA    float64   // rate of right ascension (or azimuth) times cos declination (elevation), rad/s
	RateDec   float64   // rate of declination (or elevation), rad/s
	PMRA      float64   // proper motion in right ascension times cos declination, rad/year from J2000.0
	PMDec     float64   // proper motion in declination, rad/year
	Refracted bool      // a Horizon aim is as seen through the air
	Error     s1.Angle  // hard bound of the pointing error
	Motion    Motion
	Points    []AimPoint // of a Table, in order of time
}

// AimPoint is one line of an ephemeris table.
type AimPoint struct {
	At        time.Time
	Direction r3.Vector // ICRS unit vector
}

// Valid reports whether the aim can be used: a known frame, finite numbers, a
// unit direction, an error from 0 to 10°, and for a table at least two points
// in strict order of time, each step under 90°.
func (a *Aim) Valid() bool {
	if a == nil || !(a.Error >= 0) || !(a.Error <= 10*s1.Degree) || !geometry.Finite(a.RateRA, a.RateDec, a.PMRA, a.PMDec) {
		return false
	}
	switch a.Frame {
	case ICRS, OfDate, Horizon:
		return unit(a.Direction)
	case Table:
		if len(a.Points) < 2 {
			return false
		}
		for i, p := range a.Points {
			if !unit(p.Direction) {
				return false
			}
			if i > 0 && (!p.At.After(a.Points[i-1].At) || !(p.Direction.Dot(a.Points[i-1].Direction) > 0)) {
				return false
			}
		}
		return true
	}
	return false
}

func unit(v r3.Vector) bool {
	n := v.Norm2()
	return n > 1-1e-9 && n < 1+1e-9
}

// segment returns the index of the table's segment that holds t.
func (a *Aim) segment(t time.Time) (int, bool) {
	if len(a.Points) < 2 || t.Before(a.Points[0].At) || t.After(a.Points[len(a.Points)-1].At) {
		return 0, false
	}
	i := sort.Search(len(a.Points), func(i int) bool { return a.Points[i].At.After(t) }) - 1
	if i > len(a.Points)-2 {
		i = len(a.Points) - 2
	}
	return i, true
}
