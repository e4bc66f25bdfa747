package closures

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Question is what a foreseeable check is asked: may this beam point along
// this aim over this span of time?
type Question struct {
	Beam     *BeamRules
	Aim      *Aim
	Over     span.Span
	Nights   []*sky.Night  // that cover Over, in order; what none covers is unknown
	Edge     time.Duration // how finely edges are placed
	Slack    time.Duration // edges lie outward of where they could be at this much of the rate
	Now      time.Time     // of a decision; zero in a plan, which leaves out who is silent
	AimBegan time.Time     // when the aim began, for who yields; zero: it is the later one
	Hits     *Hits         // regions near a fixed aim, made once; nil: looked up
	Shared   *Shared       // what many aims of a plan have in common; nil: worked out
}

// The placing of edges. A plan's closures hold those of a decision for the
// same aim: an edge found with EdgeDecide lies within EdgeDecide of an instant
// whose margin is at most rate x EdgeDecide, so twice that would do where the
// rate is one number. Where each margin states its own, a later one may be
// larger than the one leapt with; PlanSlack leaves room for ten times as much.
const (
	EdgeDecide = time.Millisecond
	EdgePlan   = 50 * time.Millisecond
	PlanSlack  = 20 * EdgeDecide
)

// err returns the hard bound of the aim's error: what it states and what
// the beam's rules add.
func (q *Question) err() s1.Angle { return q.Aim.Error + q.Beam.Aim.Error }

// extent returns the error and the asterism: how far from the aim's direction
// light may be.
func (q *Question) extent() s1.Angle { return q.err() + q.Beam.Asterism }

// search returns when margin may be used up within over, with every part of
// it that no night covers or the aim does not reach. The margin is given the
// night that holds the instant.
func (q *Question) search(dst span.Set, rate float64, over span.Span, margin func(n *sky.Night, at time.Time) float64) span.Set {
	less := rate * q.Slack.Seconds()
	return q.searchRated(dst, over, q.Aim.reach(over), func(n *sky.Night, at time.Time) (float64, float64) { return margin(n, at) - less, rate })
}

// searchRated is search for a margin that states its rate with each value, and
// from which the slack has been taken. It is known within there alone: a step
// may be longer than what lies beyond, which would go unseen.
func (q *Question) searchRated(dst span.Set, over, there span.Span, margin func(n *sky.Night, at time.Time) (m, rate float64)) span.Set {
	dst = dst[:0]
	there = there.Intersect(over)
	if there.Empty() {
		return appendSpan(dst, over)
	}
	dst = appendSpan(dst, span.Span{From: over.From, Until: there.From})
	at := there.From
	for at.Before(there.Until) {
		n := nightAt(q.Nights, at)
		if n == nil {
			next := there.Until
			for _, o := range q.Nights {
				if from := BinOf(o).From; from.After(at) && from.Before(next) {
					next = from
				}
			}
			dst = appendSpan(dst, span.Span{From: at, Until: next})
			at = next
			continue
		}
		part := span.Span{From: at, Until: there.Until}.Intersect(BinOf(n))
		dst = span.AppendBelowRated(dst, func(t time.Time) (float64, float64) { return margin(n, t) }, part, q.Edge)
		at = part.Until
	}
	return appendSpan(dst, span.Span{From: there.Until, Until: over.Until})
}

// reach returns the part of a span in which the aim says where it is: all but
// for a table's ends. Both of its ends belong to it.
func (a *Aim) reach(over span.Span) span.Span {
	if a == nil || a.Frame != Table {
		return over
	}
	if len(a.Points) < 2 {
		return span.Span{}
	}
	return over.Intersect(span.Span{From: a.Points[0].At, Until: a.Points[len(a.Points)-1].At.Add(1)})
}

// appendSpan adds s, which does not begin before the set ends.
func appendSpan(dst span.Set, s span.Span) span.Set {
	if s.Empty() {
		return dst
	}
	if n := len(dst); n > 0 && !dst[n-1].Until.Before(s.From) {
		if s.Until.After(dst[n-1].Until) {
			dst[n-1].Until = s.Until
		}
		return dst
	}
	return append(dst, s)
}

// BinOf returns the 12 h bin that a night was prepared for.
func BinOf(n *sky.Night) span.Span {
	c := n.Covers()
	return sky.Bin(c.From.Add(c.Until.Sub(c.From) / 2))
}

// nightAt returns the night whose bin holds at, or nil.
func nightAt(nights []*sky.Night, at time.Time) *sky.Night {
	for _, n := range nights {
		if n != nil && BinOf(n).Contains(at) {
			return n
		}
	}
	return nil
}

// inSky returns the aim's ICRS direction, within err, turning no faster than
// rate.
func (q *Question) inSky() (direction func(n *sky.Night, at time.Time) r3.Vector, rate float64) {
	own := q.Aim.ownRate()
	switch q.Aim.Frame {
	case ICRS, Table:
		return func(_ *sky.Night, at time.Time) r3.Vector { return q.Aim.own(at) }, own
	case OfDate:
		return func(n *sky.Night, at time.Time) r3.Vector { return n.ICRS(n.OfDate(q.Aim.own(at), at), at) }, own + dateRate
	default:
		return func(n *sky.Night, at time.Time) r3.Vector { return n.ICRS(q.Aim.own(at), at) }, own + sky.SkyRate
	}
}

// dateRate bounds how fast the frame of date turns against ICRS: precession,
// nutation and the change of aberration together stay under 2 arcsec a day
// (precession 0.14, aberration 0.36, nutation 0.2; common practice, no source).
const dateRate = 2 * float64(geometry.Arcsecond) / 86400

// overhead returns the aim's airless direction in the local frame (X east,
// Y north, Z up), turning no faster than rate. An aim as seen through the air
// was brought to airless when it was taken in.
func (q *Question) overhead() (direction func(n *sky.Night, at time.Time) r3.Vector, rate float64) {
	own := q.Aim.ownRate()
	switch q.Aim.Frame {
	case ICRS, Table:
		return func(n *sky.Night, at time.Time) r3.Vector { return n.Horizon(q.Aim.own(at), at) }, own + sky.SkyRate
	case OfDate:
		return func(n *sky.Night, at time.Time) r3.Vector { return n.OfDate(q.Aim.own(at), at) }, own + sky.SkyRate
	default:
		return func(_ *sky.Night, at time.Time) r3.Vector { return q.Aim.own(at) }, own
	}
}

// At returns the aim's airless direction in the local frame (X east, Y north,
// Z up) at an instant that night n holds, and the hard bound of its error. ok
// is false where the aim does not reach or a number is not finite.
func (a *Aim) At(n *sky.Night, at time.Time) (dir r3.Vector, err s1.Angle, ok bool) {
	if n == nil || !a.Valid() {
		return r3.Vector{}, 0, false
	}
	q := Question{Aim: a}
	f, _ := q.overhead()
	dir, err = f(n, at), a.Error
	if a.Frame != Horizon {
		err += n.Error()
	}
	return dir, err, geometry.FiniteVector(dir) && unit(dir)
}

// InSky is At for the ICRS direction.
func (a *Aim) InSky(n *sky.Night, at time.Time) (dir r3.Vector, err s1.Angle, ok bool) {
	if n == nil || !a.Valid() {
		return r3.Vector{}, 0, false
	}
	q := Question{Aim: a}
	f, _ := q.inSky()
	dir, err = f(n, at), a.Error
	if a.Frame == Horizon || a.Frame == OfDate {
		err += n.Error()
	}
	return dir, err, geometry.FiniteVector(dir) && unit(dir)
}

// ownRate bounds how fast the aim turns in its own frame.
func (a *Aim) ownRate() float64 {
	rate := a.drift().Rate() + a.motion().Rate()
	if a.Frame != Table {
		return rate
	}
	for i := 1; i < len(a.Points); i++ {
		p, o := a.Points[i-1], a.Points[i]
		if r := geometry.Separation(p.Direction, o.Direction).Radians() / o.At.Sub(p.At).Seconds(); r > rate {
			rate = r
		}
	}
	// Straight chords are walked at an even pace, so the angle goes faster in
	// the middle of a segment than on the average: by 1/cos² of half of it.
	return rate * 2
}

// own returns the aim's direction in its own frame at an instant; NaN outside
// a table.
func (a *Aim) own(at time.Time) r3.Vector {
	if a.Frame == Table {
		i, ok := a.segment(at)
		if !ok {
			return r3.Vector{X: math.NaN(), Y: math.NaN(), Z: math.NaN()}
		}
		p, o := a.Points[i], a.Points[i+1]
		f := at.Sub(p.At).Seconds() / o.At.Sub(p.At).Seconds()
		return p.Direction.Mul(1 - f).Add(o.Direction.Mul(f)).Normalize()
	}
	v := a.Direction
	if a.PMRA != 0 || a.PMDec != 0 {
		v = a.motion().At(v, at)
	}
	if a.RateRA != 0 || a.RateDec != 0 {
		v = a.drift().At(v, at)
	}
	return v
}

// drift is the aim's steady motion. Right ascension runs from X toward Y, but
// azimuth from Y (north) toward X (east): the other way round.
func (a *Aim) drift() sky.Drift {
	d := sky.Drift{RA: a.RateRA, Dec: a.RateDec, From: a.Reference}
	if a.Frame == Horizon {
		d.RA = -d.RA
	}
	return d
}

func (a *Aim) motion() sky.ProperMotion { return sky.ProperMotion{RA: a.PMRA, Dec: a.PMDec} }

// InSkyAt is InSky's direction alone; NaN where the aim does not reach.
func (a *Aim) InSkyAt(n *sky.Night, at time.Time) r3.Vector {
	q := Question{Aim: a}
	f, _ := q.inSky()
	return f(n, at)
}
