package modes

import (
	"math"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/encounter"

	"github.com/golang/geo/s1"
)

const (
	velocityFor = 10.0        // seconds for which a velocity helps
	aboveFor    = 10.0        // seconds for which a geometric difference does
	statusFor   = 30 * second // after which a status is not known any more
)

// drift bounds how fast the geometric difference changes as an aircraft
// climbs, in metres a metre: isobars and heights part by up to 8 %.
const drift = 0.1

// more is how far beyond its scale a saturated velocity may be, in metres a
// second: 2,000 kt over ground, and 20,000 ft/min of climb.
const (
	moreSpeed = 1000.0
	moreClimb = 100.0
)

func degrees(x float64) s1.Angle { return s1.Angle(x) * s1.Degree }

// unplaced fills what a report without a position does not state.
func unplaced(s closures.AircraftSeen) closures.AircraftSeen {
	s.Located = false
	s.Position.Lat, s.Position.Lon, s.Position.Height = degrees(nan), degrees(nan), geometry.Length(nan)
	s.Speed, s.Track, s.Climb = geometry.Speed(nan), degrees(nan), geometry.Speed(nan)
	s.Error, s.VerticalError = geometry.Length(nan), geometry.Length(nan)
	s.VelocityError, s.VerticalVelError = geometry.Speed(nan), geometry.Speed(nan)
	return s
}

// trusted reports whether everything heard under the address is one
// aircraft's, as far as can be told.
func (d *Decoder) trusted(a *aircraft, at int64) bool { return at >= a.suspect }

func (d *Decoder) lag(a *aircraft) float64 {
	if k := a.kind(); int(k) < len(lags) {
		return lags[k]
	}
	return 0
}

// radius is the containment that a position states; unknown: none.
func (d *Decoder) radius(a *aircraft, m message, at int64) (r float64, known bool) {
	known = a.stated != 0 && at-a.stated <= statusFor && d.trusted(a, at)
	// In what ground stations send the bit of supplement b means something
	// else.
	return containment(m.typeCode(), &a.status, known, m.bit(8), a.kind() < tisb), known
}

// describe adds to a position what else is known.
func (d *Decoder) describe(a *aircraft, m message, seen closures.AircraftSeen, at int64) closures.AircraftSeen {
	seen.Position.Height, seen.VerticalError = geometry.Length(nan), geometry.Length(nan)
	seen.Speed, seen.Track, seen.Climb = geometry.Speed(nan), degrees(nan), geometry.Speed(nan)
	seen.VelocityError, seen.VerticalVelError = geometry.Speed(nan), geometry.Speed(nan)
	if tc := m.typeCode(); tc <= 8 {
		seen.OnGround = true
		d.rolling(a, m, &seen)
		return seen
	}
	d.altitude(a, m, &seen, at)
	if d.trusted(a, at) {
		d.flying(a, &seen, at)
	}
	return seen
}

// rolling adds the motion that a surface position states itself. Its error is
// the source's own bound: the quality of a movement is not stated.
func (d *Decoder) rolling(a *aircraft, m message, seen *closures.AircraftSeen) {
	v := m.movement()
	switch {
	case v.Stopped:
		seen.Speed, seen.Track = 0, 0
	case !math.IsNaN(v.SpeedKt) && !math.IsNaN(v.TrackDeg):
		seen.Speed, seen.Track = geometry.Speed(v.SpeedKt*knot), degrees(v.TrackDeg)
	default:
		return
	}
	// A step of the track is 2.8°.
	turn := 0.05*(v.SpeedKt+v.StepKt)*knot + v.StepKt*knot
	seen.VelocityError = d.options.VelocityError + geometry.Speed(turn+d.lag(a)*float64(d.options.Motion.HorizontalAcceleration))
}

func (d *Decoder) altitude(a *aircraft, m message, seen *closures.AircraftSeen, at int64) {
	if m.typeCode() >= 20 {
		d.geometric(a, m, seen, at)
		return
	}
	feet, step, state := altitude12(m.bits(9, 12))
	switch state {
	case altitudeMissing:
		d.counts.NoAltitude++
		return
	case altitudeBad:
		d.counts.BadAltitude++
		return
	}
	seen.AltitudeFrom, seen.Position.Height = closures.PressureAltitude, geometry.Length(feet*foot)
	// With the geometric difference and its quality the height is much better
	// known than by pressure.
	status, known := a.quality(at)
	r95 := vertical(status, known)
	age := seconds(at - a.moved)
	if r95 == unknown || a.moved == 0 || age > aboveFor || math.IsNaN(a.velocity.AboveFt) || !d.trusted(a, at) {
		return
	}
	seen.AltitudeFrom = closures.AboveEllipsoid
	seen.Position.Height += geometry.Length(a.velocity.AboveFt * foot)
	seen.VerticalError = encounter.HardVertical(geometry.Length(r95)) + geometry.Length((step+25)*foot) +
		geometry.Length(age*drift)*geometry.Length(d.options.Motion.Climb) + d.aboveSeaLevel(status, known)
}

// quality returns the status, and whether it still holds.
func (a *aircraft) quality(at int64) (*Status, bool) {
	return &a.status, a.stated != 0 && at-a.stated <= statusFor
}

// aboveSeaLevel is what is added since older transponders may send heights
// above mean sea level for heights above the ellipsoid (from memory).
func (d *Decoder) aboveSeaLevel(s *Status, known bool) geometry.Length {
	if known && s.Version >= 2 {
		return 0
	}
	return geometry.Length(math.Abs(float64(d.options.Geoid)))
}

// geometric reads the height of type codes 20 to 22. Sources differ in whether
// it is in metres (The 1090 Megahertz Riddle) or coded as pressure altitude in
// feet (in use, from memory): the error holds both.
func (d *Decoder) geometric(a *aircraft, m message, seen *closures.AircraftSeen, at int64) {
	code := m.bits(9, 12)
	if code == 0 {
		d.counts.NoAltitude++
		return
	}
	metres := float64(code)
	feet, _, state := altitude12(code)
	if state != altitudeKnown {
		feet = metres / foot
	}
	status, known := a.quality(at)
	r95 := vertical(status, known && d.trusted(a, at))
	if r95 == unknown {
		return // neither the height nor its quality: every height
	}
	low, high := min(metres, feet*foot), max(metres, feet*foot)
	seen.AltitudeFrom, seen.Position.Height = closures.AboveEllipsoid, geometry.Length((low+high)/2)
	seen.VerticalError = encounter.HardVertical(geometry.Length(r95)) + geometry.Length((high-low)/2+100*foot) + d.aboveSeaLevel(status, known)
}

// flying adds the velocity, with the motion since it was measured.
func (d *Decoder) flying(a *aircraft, seen *closures.AircraftSeen, at int64) {
	age := seconds(at-a.moved) + d.lag(a)
	if a.moved == 0 || age > velocityFor {
		return
	}
	v, motion := &a.velocity, &d.options.Motion
	horizontal95, climb95 := speeds[v.NACv&7][0], speeds[v.NACv&7][1]
	if east, north, beyond := v.overGround(); !math.IsNaN(east) {
		seen.Speed, seen.Track = geometry.Speed(hypot(east, north)), degrees(modulo(math.Atan2(east, north)*180/math.Pi, 360))
		e := d.options.VelocityError
		if horizontal95 > 0 {
			e = encounter.HardSpeed(geometry.Speed(horizontal95))
		}
		seen.VelocityError = e + geometry.Speed(math.Sqrt2*v.step()*knot+beyond+age*float64(motion.HorizontalAcceleration))
	}
	if seen.AltitudeFrom == closures.NoAltitude || math.IsNaN(v.ClimbFpm) {
		return
	}
	seen.Climb = geometry.Speed(v.ClimbFpm * fpm)
	e := d.options.ClimbError
	if climb95 > 0 && !v.ClimbPressure {
		e = encounter.HardClimb(geometry.Speed(climb95))
	}
	seen.VerticalVelError = e + geometry.Speed(64*fpm+age*float64(motion.VerticalAcceleration))
	if v.ClimbMore {
		seen.Climb += geometry.Speed(math.Copysign(moreClimb/2, v.ClimbFpm))
		seen.VerticalVelError += moreClimb / 2
	}
}

// overGround is the velocity to report, in metres a second: a component at the
// end of its scale is somewhere from there to moreSpeed beyond, so that the
// middle of that is taken, and half of it added to the error.
func (v *Velocity) overGround() (east, north, beyond float64) {
	end := 1022 * v.step()
	shift := func(kt float64) (float64, float64) {
		if math.Abs(kt) >= end {
			return kt*knot + math.Copysign(moreSpeed/2, kt), moreSpeed / 2
		}
		return kt * knot, 0
	}
	east, a := shift(v.EastKt)
	north, b := shift(v.NorthKt)
	return east, north, hypot(a, b)
}

// finish completes a report with a position.
func (d *Decoder) finish(a *aircraft, seen closures.AircraftSeen, received time.Time) (closures.AircraftSeen, bool) {
	seen.Source, seen.Said, seen.Aircraft = d.options.Source, received.UTC(), a.name
	a.located = received.UnixNano()
	d.counts.Located++
	return seen, true
}
