package encounter

import (
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Dome holds every place where a keep-out could be, however the beam is aimed
// above a lowest elevation: an upright cylinder about the launch. It serves to
// leave far aircraft alone for a while. The zero value reaches everywhere.
type Dome struct {
	launch r3.Vector
	radius float64
	ready  bool
}

// Dome returns the dome of k for a beam whose axis is never aimed below the
// elevation lowest; k.Axis does not count, and k.AxisError and AxisRate over
// the guard widen it. Unless lowest exceeds the half-angle and those errors,
// or with a number that is not finite or below zero, it reaches everywhere.
func (k *KeepOut) Dome(lowest s1.Angle, guard time.Duration) Dome {
	radius, extent := float64(k.Radius), float64(k.Extent)
	turn := k.AxisError.Radians() + k.AxisRate.Radians()*seconds(guard)
	wide := k.HalfAngle.Radians() + turn
	height := float64(k.Ceiling) - k.Launch.Z
	far := shadow(radius, extent, height, lowest.Radians(), turn, wide)
	if !geometry.FiniteVector(k.Launch) || !geometry.Finite(far, height) || !(lowest.Radians() <= math.Pi/2) ||
		!(radius >= 0 && extent >= 0 && height > 0 && guard >= 0) ||
		!(k.AxisError >= 0 && k.AxisRate >= 0 && k.HalfAngle >= 0 && wide <= widest) {
		return Dome{}
	}
	return Dome{launch: k.Launch, radius: far, ready: true}
}

// Quiet returns an instant up to which r, by the bound on speed alone, cannot
// touch the keep-out, whatever the aim: for a volume whose instant is at most a
// second before the report's, and whose guard ends by then, Touch answers
// clear. Where that cannot be said (a reach or a dome that is not valid, a
// report that contradicts the bound on speed, an aircraft near), it is the zero
// time.
//
// It serves to order tracks, so that those far away cost nothing until then. It
// stays true for as long as the report counts; a new report needs a new answer.
func (d *Dome) Quiet(r *Reach) time.Time {
	if !d.ready || !r.valid || r.fast || !(r.vmax > 0) {
		return time.Time{}
	}
	gap := math.Hypot(r.p.X-d.launch.X, r.p.Y-d.launch.Y) - d.radius
	// The limits that hold until it is flown through at the greatest speed
	// hold until the touch, which comes before.
	l := r.limits(max(0, gap)/r.vmax, quietColumn)
	// A touch needs |x - p| <= eh + v τ, where τ <= u - At + λ, and two seconds
	// more for a report stamped one second ahead.
	t := (gap-l.eh-2*grain)/l.v - r.lambda - 2
	if !(t > 0) {
		return time.Time{}
	}
	return r.at.Add(toDuration(min(t, quietLongest)))
}

const (
	// quietColumn bounds how far above or below its stated position an
	// aircraft of unknown altitude is while in a keep-out, in metres.
	quietColumn = 100e3
	// quietLongest is as far ahead as Quiet looks, in seconds.
	quietLongest = 3600
)
