package sky

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
)

const julianYear = 365.25 * 86400 // seconds

// ProperMotion is a star's own motion from J2000.0 on, along a great circle,
// in rad a Julian year. RA is that on the sky: the change of right ascension
// times the cosine of the declination, as modern catalogues print it.
type ProperMotion struct{ RA, Dec float64 }

// At returns where the star is at an instant whose place at J2000.0 is given,
// both ICRS unit vectors.
func (m ProperMotion) At(j2000 r3.Vector, at time.Time) r3.Vector {
	// J2000.0 is 12 h TT. Counted with the leap seconds of 2017 on, so that the
	// years to an instant since then are right.
	epoch := time.Date(2000, time.January, 1, 12, 0, 0, 0, time.UTC).Add(-ttMinusUTC)
	years := at.Sub(epoch).Seconds() / julianYear
	return moved(j2000, m.RA, m.Dec, years)
}

// Rate returns the motion in rad a second.
func (m ProperMotion) Rate() float64 { return math.Hypot(m.RA, m.Dec) / julianYear }

// Drift is a steady motion along a great circle from a stated instant on, as
// of a comet or a satellite's slow arc, in rad a second. RA is that on the
// sky, as in ProperMotion. It reaches back before From as well.
type Drift struct {
	RA, Dec float64
	From    time.Time
}

// At returns where at From's dir is at an instant, in the frame of dir.
func (d Drift) At(dir r3.Vector, at time.Time) r3.Vector {
	return moved(dir, d.RA, d.Dec, at.Sub(d.From).Seconds())
}

// Rate returns the motion in rad a second.
func (d Drift) Rate() float64 { return math.Hypot(d.RA, d.Dec) }

// moved carries p along the great circle that leaves it at the rates toward
// east and north for time t. At a pole east is taken for right ascension 0 h.
func moved(p r3.Vector, east, north, t float64) r3.Vector {
	p = unitLength(p)
	rate := math.Hypot(east, north)
	if rate == 0 {
		return p
	}
	e := r3.Vector{Y: 1}
	if h := math.Hypot(p.X, p.Y); h != 0 {
		e = r3.Vector{X: -p.Y / h, Y: p.X / h}
	}
	along := e.Mul(east / rate).Add(p.Cross(e).Mul(north / rate))
	s, c := math.Sincos(rate * t)
	return unitLength(p.Mul(c).Add(along.Mul(s)))
}
