package demo

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

func elevation(v r3.Vector) s1.Angle { return geometry.Elevation(v) }

// star is something to point at: where it stands when the night begins. It
// then goes with the sky.
type star struct {
	name string
	az   s1.Angle
	el   s1.Angle
}

// icrs returns the stars' ICRS directions by name.
func icrs(n *sky.Night, at time.Time, stars []star) map[string]r3.Vector {
	out := map[string]r3.Vector{}
	for _, s := range stars {
		out[s.name] = n.ICRS(geometry.FromHorizon(s.az, s.el), at)
	}
	return out
}

// between returns the direction that is part of the way from a to b along
// their great circle.
func between(a, b r3.Vector, part float64) r3.Vector {
	whole := geometry.Separation(a, b).Radians()
	if !(whole > 1e-9) {
		return b
	}
	sin := math.Sin(whole)
	return a.Mul(math.Sin((1-part)*whole) / sin).Add(b.Mul(math.Sin(part*whole) / sin)).Normalize()
}

// flight is one aircraft's way at a level and a speed, and when it is heard. It
// turns no harder than the site's bound of acceleration allows.
type flight struct {
	address string
	from    time.Duration // of the night
	at      r3.Vector     // metres east, north and up of the site at from
	speed   float64       // m/s over ground
	track   float64       // degrees from north through east, at from
	turns   []turn
	heard   []stretch
	placed  time.Duration // from when on its reports have a position
}

// turn is a change of track: degrees a second, to the right positive.
type turn struct {
	when stretch
	rate float64
}

// where returns place and track at a time of the night. Turns come after from.
func (f *flight) where(t time.Duration) (at r3.Vector, track float64) {
	at, track = f.at, f.track
	now := f.from
	fly := func(until time.Duration, rate float64) {
		d := (until - now).Seconds()
		east, north := ahead(track, f.speed, rate, d)
		at.X, at.Y, track, now = at.X+east, at.Y+north, track+rate*d, until
	}
	for _, u := range f.turns {
		if t <= u.when.from {
			break
		}
		fly(u.when.from, 0)
		fly(min(t, u.when.until), u.rate)
	}
	fly(t, 0)
	return at, track
}

// ahead returns how far east and north an aircraft gets in d seconds.
func ahead(track, speed, rate, d float64) (east, north float64) {
	const degree = math.Pi / 180
	if rate == 0 {
		sin, cos := math.Sincos(track * degree)
		return speed * d * sin, speed * d * cos
	}
	s0, c0 := math.Sincos(track * degree)
	s1, c1 := math.Sincos((track + rate*d) * degree)
	radius := speed / (rate * degree)
	return radius * (c0 - c1), radius * (s1 - s0)
}

// stretch is a part of the night.
type stretch struct{ from, until time.Duration }

func (s stretch) holds(t time.Duration) bool { return s.from <= t && t < s.until }

// report is what the receiver hears of the flight; false when it does not.
func (f *flight) report(t time.Duration, said time.Time) (closures.AircraftSeen, bool) {
	nan := math.NaN()
	seen := closures.AircraftSeen{
		Source: "rx-1", Said: said, Aircraft: f.address, Position: earth.Position{Lat: s1.Angle(nan), Lon: s1.Angle(nan), Height: geometry.Length(nan)},
		Speed: geometry.Speed(nan), Track: s1.Angle(nan), Climb: geometry.Speed(nan), Error: geometry.Length(nan), VerticalError: geometry.Length(nan),
		VelocityError: geometry.Speed(nan), VerticalVelError: geometry.Speed(nan),
	}
	heard := false
	for _, h := range f.heard {
		heard = heard || h.holds(t)
	}
	if !heard {
		return seen, false
	}
	if t < f.placed {
		return seen, true
	}
	at, track := f.where(t)
	p := earth.FromECEF(earth.FrameAt(skerry).ECEF(at))
	seen.Located, seen.Position, seen.AltitudeFrom = true, p, closures.AboveEllipsoid
	seen.Speed, seen.Track, seen.Climb = geometry.Speed(f.speed), s1.Angle(math.Mod(track+360, 360))*s1.Degree, 0
	seen.Error, seen.VerticalError, seen.VelocityError, seen.VerticalVelError = 100, 50, 5, 2
	return seen, true
}
