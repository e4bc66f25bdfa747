package asterix

import (
	"math"
	"strings"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/encounter"

	"github.com/golang/geo/s1"
)

const (
	mostAhead   = 500 * time.Millisecond
	late        = time.Minute
	velocityFor = 10.0 // seconds for which a velocity helps
	heightFor   = 10.0 // seconds for which a height does
	metreDegree = 111700.0
)

// Errors of a pressure altitude as a height: 100 m and 8 % of it, as the rules
// take them (closures). They are stated here where age adds to them.
const (
	pressureBase  = 100.0
	pressureShare = 0.08
)

func degrees(x float64) s1.Angle { return s1.Angle(x) * s1.Degree }

// report makes a report of a record.
func (d *Decoder) report(r *Record, received time.Time) (seen closures.AircraftSeen, ok bool) {
	name, ok := d.name(r)
	if !ok {
		d.counts.Nameless++
		return seen, false
	}
	if sign := strings.Trim(r.Callsign, " #"); sign != "" && d.signs[name] != sign && len(d.signs) < mostNames {
		d.signs[name] = sign
	}
	seen = closures.AircraftSeen{Source: d.options.Source, Aircraft: name, OnGround: r.Ground, Drill: r.Simulated || r.Test}
	seen.Position.Lat, seen.Position.Lon, seen.Position.Height = degrees(nan), degrees(nan), geometry.Length(nan)
	seen.Speed, seen.Track, seen.Climb = geometry.Speed(nan), degrees(nan), geometry.Speed(nan)
	seen.Error, seen.VerticalError = geometry.Length(nan), geometry.Length(nan)
	seen.VelocityError, seen.VerticalVelError = geometry.Speed(nan), geometry.Speed(nan)
	placed := math.Abs(r.LatDeg) <= 90 && math.Abs(r.LonDeg) <= 180
	if !placed && !math.IsNaN(r.LatDeg) {
		d.counts.BadValue++
	}
	at := r.positionAt()
	switch {
	case !math.IsNaN(at):
		seen.Said = place(at, received)
	case placed:
		d.counts.NoTime++ // how old the position is cannot be told
		return closures.AircraftSeen{}, false
	default:
		seen.Said = received.UTC()
	}
	switch age := received.Sub(seen.Said); {
	case age < -mostAhead:
		d.counts.Ahead++
		return closures.AircraftSeen{}, false
	case age > late:
		d.counts.Late++
	}
	if seen.Drill {
		d.counts.Drills++
	}
	if !placed {
		d.counts.Unlocated++
		return seen, true
	}
	d.counts.Located++
	seen.Located = true
	seen.Position.Lat, seen.Position.Lon = degrees(r.LatDeg), degrees(r.LonDeg)
	// A step of the time is 1/128 s.
	seen.Error = r.horizontal(d.options.PositionError) + geometry.Length(r.StepDeg*metreDegree+float64(d.options.Motion.Speed)/128)
	d.height(r, &seen)
	d.velocity(r, &seen, at)
	return seen, true
}

// positionAt is the time of day at which the position was true, as well as
// that is stated: when it applied, when it was received, when the report was
// sent; NaN: none is. What lies between is the source's latency.
func (r *Record) positionAt() float64 {
	for _, t := range [...]float64{r.PositionAt, r.PositionReceivedAt, r.SentAt} {
		if !math.IsNaN(t) {
			return t
		}
	}
	return nan
}

// height adds the height: the geometric one where its quality and its age are
// stated, else that by pressure, else the geometric one for what it is worth.
func (d *Decoder) height(r *Record, seen *closures.AircraftSeen) {
	if !math.IsNaN(r.GeometricFt) && !(r.GeometricFt >= -1500 && r.GeometricFt <= 150000) {
		d.counts.BadValue++
		r.GeometricFt = nan
	}
	if !math.IsNaN(r.FlightLevel) && !(r.FlightLevel >= -15 && r.FlightLevel <= 1500) {
		d.counts.BadValue++
		r.FlightLevel = nan
	}
	climb := float64(d.options.Motion.Climb)
	r95, age := r.vertical(d.gva), r.Ages[ageGeometric]
	geometric, pressure := !math.IsNaN(r.GeometricFt) && r95 != unknown, !math.IsNaN(r.FlightLevel)
	switch {
	case geometric && (age <= heightFor || math.IsNaN(age) && !pressure):
		if math.IsNaN(age) {
			age = heightFor
		}
		seen.AltitudeFrom, seen.Position.Height = closures.AboveEllipsoid, geometry.Length(r.GeometricFt*foot)
		seen.VerticalError = encounter.HardVertical(geometry.Length(r95)) + geometry.Length(6.25*foot+(age+0.1)*climb)
		if r.Version < 2 { // older ones may send heights above mean sea level (from memory)
			seen.VerticalError += geometry.Length(math.Abs(float64(d.options.Geoid)))
		}
	case pressure:
		seen.AltitudeFrom, seen.Position.Height = closures.PressureAltitude, geometry.Length(100*r.FlightLevel*foot)
		age := r.Ages[ageFlightLevel]
		switch {
		case age > heightFor:
			seen.AltitudeFrom, seen.Position.Height = closures.NoAltitude, geometry.Length(nan)
		case age > 0: // else it came with the position
			seen.VerticalError = geometry.Length(pressureBase + pressureShare*math.Abs(float64(seen.Position.Height)) + (age+0.1)*climb)
		}
	}
}

// velocity adds the velocity, with the motion between it and the position. One
// whose age is not stated is left out.
func (d *Decoder) velocity(r *Record, seen *closures.AircraftSeen, at float64) {
	motion := &d.options.Motion
	nacv := [2]float64{}
	if r.HasQuality {
		nacv = speeds[r.NACv&7]
	}
	if age := r.since(ageVector, at); age <= velocityFor && !math.IsNaN(r.SpeedKt) {
		e := d.options.VelocityError
		if nacv[0] > 0 {
			e = encounter.HardSpeed(geometry.Speed(nacv[0]))
		}
		v := r.SpeedKt * knot
		// Half a step of the track turns the velocity by 4.8e-5 rad.
		seen.Speed, seen.Track = geometry.Speed(v), degrees(r.TrackDeg)
		seen.VelocityError = e + geometry.Speed(0.22*knot+1e-4*v+age*float64(motion.HorizontalAcceleration))
	}
	if seen.AltitudeFrom == closures.NoAltitude {
		return
	}
	rate, age, e := r.GeoFpm, r.since(ageGeoRate, at), d.options.ClimbError
	if nacv[1] > 0 && !math.IsNaN(rate) && age <= velocityFor {
		e = encounter.HardClimb(geometry.Speed(nacv[1]))
	} else if !(age <= velocityFor) || math.IsNaN(rate) {
		rate, age = r.BaroFpm, r.since(ageBaroRate, at)
	}
	if age <= velocityFor && !math.IsNaN(rate) {
		seen.Climb = geometry.Speed(rate * fpm)
		seen.VerticalVelError = e + geometry.Speed(6.25*fpm+age*float64(motion.VerticalAcceleration))
	}
}

// since is how many seconds lie between the position and a velocity; NaN: that
// is not stated. An age is one at the sending of the report.
func (r *Record) since(age int, at float64) float64 {
	velocity := r.VelocityAt
	if math.IsNaN(velocity) {
		velocity = r.VelocityReceivedAt
	}
	byTime := apart(velocity, at)
	byAge := r.Ages[age] + 0.1 + apart(r.SentAt, at)
	switch {
	case math.IsNaN(byTime):
		return byAge
	case math.IsNaN(byAge):
		return byTime
	}
	return max(byTime, byAge)
}
