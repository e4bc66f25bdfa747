package recheck

import (
	"math"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
)

// aircraft checks that no aircraft, taken to fly on as reported, is in the
// keep-out now or before a permit given now is over; that none is unlocated
// where that must shutter; and that none contradicts itself. Only the middle of
// each reach is asked, so that a touch here is one for the decision, whose
// reach is larger. BW-022.
func (l *look) aircraft() string {
	r := &l.rules.Aircraft
	if !r.Configured {
		return ""
	}
	beam, farthest := vector(l.now), l.farthest()
	site := &l.rules.Site.Position
	// A degree of latitude is over 110 km everywhere. One of longitude is over
	// wide within 2° of latitude toward the pole.
	const degree, band = 110e3, 2
	wide := degree * max(0, math.Cos((math.Abs(site.Lat.Degrees())+band)*math.Pi/180))
	for i := range l.k.Aircraft {
		a := &l.k.Aircraft[i]
		switch {
		case a.Unclear:
			return "second opinion: an aircraft contradicts itself"
		case !a.Located && r.Unlocated == closures.UnlocatedShutter:
			return "second opinion: an aircraft gives no position"
		case !a.Seen.Located || a.Seen.OnGround:
			continue
		}
		far := farthest + max(0, float64(r.SpeedMax)*(l.at.Sub(a.Seen.Said)+l.guard).Seconds())
		north := math.Abs((a.Seen.Position.Lat - site.Lat).Degrees())
		if north*degree > far {
			continue
		}
		if east := math.Abs((a.Seen.Position.Lon - site.Lon).Degrees()); north <= band && east <= 180 && east*wide > far {
			continue
		}
		p, v, ok := l.flying(&a.Seen)
		if !ok {
			continue
		}
		for _, u := range [...]time.Duration{0, l.guard / 2, l.guard} {
			at := p.Add(v.Mul((l.at.Sub(a.Seen.Said) + u).Seconds()))
			if l.kept(at, beam, a.Seen.AltitudeFrom == closures.NoAltitude) {
				return "second opinion: an aircraft is in the keep-out"
			}
		}
	}
	return ""
}

// farthest bounds how far from the site a keep-out reaches: its ceiling along
// the lowest beam, and what its width adds.
func (l *look) farthest() float64 {
	r := &l.rules.Aircraft
	low := max(l.beam.Limits.ElevationMin.Radians()-r.KeepOutHalfAngle.Radians(), 1*degree)
	return float64(r.KeepOutCeiling-l.rules.Site.Position.Height)/math.Sin(low) + float64(r.KeepOutRadius) + 10e3
}

// flying places a report in the site's frame by the ellipsoid's two radii of
// curvature at the middle latitude, the convergence of the meridians and the
// drop below the horizon: within 30 m over 60 km, which is less than an
// aircraft's own extent in the decision. ok is false for what claims to be
// faster than the rules allow, whose middle is no place where it must be.
func (l *look) flying(s *closures.AircraftSeen) (p, v r3.Vector, ok bool) {
	site := &l.rules.Site.Position
	const a, e2 = 6378137.0, 0.00669437999014
	lat, lon := s.Position.Lat.Radians()-site.Lat.Radians(), math.Remainder(s.Position.Lon.Radians()-site.Lon.Radians(), 2*math.Pi)
	middle := site.Lat.Radians() + lat/2
	sin, cos := math.Sincos(middle)
	w := 1 - e2*sin*sin
	prime := a / math.Sqrt(w)
	meridian := prime * (1 - e2) / w
	height := float64(s.Position.Height)
	switch s.AltitudeFrom {
	case closures.AboveEllipsoid:
	case closures.AboveMeanSeaLevel, closures.PressureAltitude:
		height += float64(l.rules.Site.Geoid)
	default:
		height = float64(site.Height)
	}
	north, east := (meridian+height)*lat, (prime+height)*cos*lon
	turn := lon * sin / 2 // the middle's meridian leans toward the site's
	sinT, cosT := math.Sincos(turn)
	radius := prime + height
	flat := math.Hypot(east, north)
	p = r3.Vector{X: east*cosT + north*-sinT, Y: north*cosT + east*sinT, Z: height - float64(site.Height) - flat*flat/(2*radius)}
	speed, track := float64(s.Speed), s.Track.Radians()
	if finite(speed, track) {
		if speed > float64(l.rules.Aircraft.SpeedMax) {
			return p, v, false
		}
		sinK, cosK := math.Sincos(track)
		v.X, v.Y = speed*sinK, speed*cosK
	}
	if climb := float64(s.Climb); finite(climb) && s.AltitudeFrom != closures.NoAltitude {
		if math.Abs(climb) > float64(l.rules.Aircraft.ClimbMax) {
			return p, v, false
		}
		v.Z = climb
	}
	return p, v, finite(p.X, p.Y, p.Z)
}

// kept reports whether a place lies in the cone or the cylinder about the beam
// from one of its launches, under the ceiling. One of unknown altitude is taken
// at the height at which the beam is above its place on the ground.
func (l *look) kept(at, beam r3.Vector, anyHeight bool) bool {
	r := &l.rules.Aircraft
	ceiling := float64(r.KeepOutCeiling - l.rules.Site.Position.Height)
	for _, launch := range l.beam.Launches {
		q := at.Sub(launch.Offset)
		if anyHeight {
			flat := math.Hypot(beam.X, beam.Y)
			q.Z = beam.Z * math.Hypot(q.X, q.Y) / max(flat, 1e-6)
		}
		if q.Z+launch.Offset.Z > ceiling-edge || q.Z <= 0 {
			continue
		}
		s := q.Dot(beam)
		off := math.Sqrt(max(0, q.Norm2()-s*s))
		if s > edge && (off <= float64(r.KeepOutRadius) || off <= s*math.Tan(r.KeepOutHalfAngle.Radians())) {
			return true
		}
	}
	return false
}

// edge is how near, in metres, to the ends of a keep-out this package is not
// asked.
const edge = 50
