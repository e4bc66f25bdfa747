package closures

import (
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
)

// beam is what is known of one beam.
type beam struct {
	rules *BeamRules
	aims  []aimKnown // the newest of each sender, in order of its name
	hits  *Hits
	hits0 float64 // the errors the hits were made with, rad

	shutter      ShutterSeen
	shutterHeard time.Time
	laser        LaserSeen
	laserHeard   time.Time

	latch          latch
	open           bool
	withdrawn      time.Time     // when it last went from open to shuttered
	sawClosed      bool          // the shutter was seen closed since then
	longestShutter time.Duration // the longest measured shutter time over the rules'
	wasStarted     bool          // everything required has been heard since the start

	moved string // of this step: why the aim is not believed
	fault string // of this step
}

// aimKnown is the newest aim of one sender, brought to what the checks use.
type aimKnown struct {
	seen  AimSeen
	aim   *Aim // airless; tracking aims fixed to the stars
	heard time.Time
	began time.Time // when it began to point there
}

// present returns the newest accepted aim, or nil.
func (b *beam) present() *aimKnown {
	var newest *aimKnown
	for i := range b.aims {
		if newest == nil || b.aims[i].seen.Said.After(newest.seen.Said) {
			newest = &b.aims[i]
		}
	}
	return newest
}

// fresh reports whether the aim may still be believed.
func (a *aimKnown) fresh(at time.Time, r *AimRules) bool {
	return a != nil && age(at, a.seen.Said, a.heard) <= r.StaleAfter
}

// prepared brings an aim to what the checks use: airless, and fixed to the
// stars when it tracks but was stated by azimuth and elevation without rates.
// ok is false when it cannot be.
func prepared(a *Aim, n *sky.Night, air sky.Refraction) (*Aim, bool) {
	if !a.Valid() {
		return nil, false
	}
	if a.Frame != Horizon {
		return a, true
	}
	p := *a
	if p.Refracted {
		d, e := air.Unrefract(p.Direction)
		p.Direction, p.Error, p.Refracted = d, p.Error+e, false
	}
	if p.Motion == Tracking && p.RateRA == 0 && p.RateDec == 0 {
		if n == nil {
			return nil, false
		}
		p.Direction, p.Error, p.Frame = n.ICRS(p.Direction, p.Reference), p.Error+n.Error(), ICRS
	}
	if !geometry.FiniteVector(p.Direction) || !unit(p.Direction) || !(p.Error <= 10*s1.Degree) {
		return nil, false
	}
	return &p, true
}

// apart returns by how much two aims disagree at an instant beyond their
// errors, positive when they do; NaN when that cannot be told.
func apart(a, o *Aim, extra s1.Angle, n *sky.Night, at time.Time) float64 {
	d1, e1, ok1 := a.At(n, at)
	d2, e2, ok2 := o.At(n, at)
	if !ok1 || !ok2 {
		return UnknownMargin().Value
	}
	return (geometry.Separation(d1, d2) - e1 - e2 - extra).Radians()
}
