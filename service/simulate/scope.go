package simulate

import (
	"math"
	"math/rand/v2"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/geometry"
)

// slewTime is how long a telescope is on its way to another target.
const slewTime = 12 * time.Second

// scope is a telescope: where its encoders say that it points among the stars,
// and by how much they are wrong.
type scope struct {
	name   string
	from   r3.Vector // ICRS, unit
	to     r3.Vector
	off    r3.Vector // added to the told direction, radians
	target string
	asked  time.Time // a slew was asked for; it begins once the light is off
	moved  time.Time // it began to move; zero: it tracks
	number int       // of pointings so far
}

// wrongBy is a fixed error of a telescope's encoders, at most bound radians.
func wrongBy(rng *rand.Rand, bound float64) r3.Vector {
	sin, cos := math.Sincos(rng.Float64() * 2 * math.Pi)
	return r3.Vector{X: bound * cos, Y: bound * sin, Z: 0}
}

// says is where the encoders put it.
func (s *scope) says(at time.Time) r3.Vector {
	switch {
	case s.asked.IsZero():
		return s.to
	case s.moved.IsZero():
		return s.from
	}
	part := min(max(at.Sub(s.moved).Seconds()/slewTime.Seconds(), 0), 1)
	if whole := geometry.Separation(s.from, s.to).Radians(); whole > 1e-9 {
		sin := math.Sin(whole)
		return s.from.Mul(math.Sin((1-part)*whole) / sin).Add(s.to.Mul(math.Sin(part*whole) / sin)).Normalize()
	}
	return s.to
}

// truly is where it points.
func (s *scope) truly(at time.Time) r3.Vector {
	v := s.says(at)
	e1 := v.Ortho()
	return v.Add(e1.Mul(s.off.X)).Add(v.Cross(e1).Mul(s.off.Y)).Normalize()
}

// ask asks for a slew; it turns one round that is under way.
func (s *scope) ask(target string, to r3.Vector, at time.Time) {
	s.from, s.to, s.target, s.asked, s.moved = s.says(at), to, target, at, time.Time{}
}

// step moves the telescope on: a slew that was asked for begins once dark says
// so, and ends after its time.
func (s *scope) step(at time.Time, dark bool) {
	switch {
	case !s.moved.IsZero() && at.Sub(s.moved) >= slewTime:
		s.moved, s.asked = time.Time{}, time.Time{}
		s.number++
	case !s.asked.IsZero() && s.moved.IsZero() && dark && at.Sub(s.asked) >= time.Second:
		s.moved = at
	}
}

// slewing reports whether it moves or is about to.
func (s *scope) slewing() bool { return !s.asked.IsZero() }

// aim is what it says of itself.
func (s *scope) aim(at time.Time) closures.AimSeen {
	a := &closures.Aim{Frame: closures.ICRS, Direction: s.says(at), Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
	if s.slewing() {
		a.Motion = closures.Slewing
	}
	seen := closures.AimSeen{Said: at, Aim: a, From: "encoder", Target: s.target}
	if s.name == "ridge-2" {
		seen.Telescope, seen.Exposing = "ridge-2", closures.Yes
	} else {
		seen.Beam = closures.BeamID(s.name)
	}
	return seen
}
