package closures

import (
	"math"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// elevationLimit is the check of a beam's lowest and highest elevation, as
// seen through the air, for all light about the aim.
type elevationLimit struct{}

func (elevationLimit) Code() Code { return CodeElevationLimit }

func (elevationLimit) Look(f *Foreseen, q *Question, sh *Sheet) {
	first := sh.begin()
	lo, loErr := f.airless(q.Beam.Limits.ElevationMin)
	hi, hiErr := f.airless(q.Beam.Limits.ElevationMax)
	direction, rate := q.overhead()
	turned := q.Aim.Frame != Horizon
	turn := q.turning(f)
	rated := func(n *sky.Night, at time.Time) (float64, float64) {
		d := direction(n, at)
		el := math.Atan2(d.Z, math.Hypot(d.X, d.Y))
		pad := q.pad(n, turned) + rate*q.Slack.Seconds()
		low, high := (lo+loErr).Radians()+pad, (hi-hiErr).Radians()-pad
		// The builtin min gives NaN when either is, which is unknown.
		m := min(el-low, high-el)
		return m, turn.rate(m, rate, d, low, high)
	}
	margin := func(n *sky.Night, at time.Time) float64 {
		m, _ := rated(n, at)
		return m + rate*q.Slack.Seconds()
	}
	for _, s := range q.sky(!turned && rate == 0, rated, sh) {
		sh.add(Finding{Code: CodeElevationLimit, Verdict: Violated, Over: s, Detail: "the elevation limits of the beam"})
	}
	least := UnknownMargin()
	if n := nightAt(q.Nights, q.Over.From); n != nil {
		least = Margin{Value: margin(n, q.Over.From), Unit: Radian}
	}
	sh.unknownIf(first, least)
	sh.finish(CodeElevationLimit, first, least)
}

// airless returns the airless elevation that is seen at an observed one, and
// the bound of what the air makes uncertain.
func (f *Foreseen) airless(observed s1.Angle) (s1.Angle, s1.Angle) {
	if !(observed < 90*s1.Degree) {
		return observed, 0
	}
	return f.Air.Airless(observed)
}

// sky is searchRated over the question's own span; a margin that is fixed is
// looked at once.
func (q *Question) sky(fixed bool, margin func(n *sky.Night, at time.Time) (m, rate float64), sh *Sheet) span.Set {
	if n := nightAt(q.Nights, q.Over.From); fixed && n != nil {
		m, _ := margin(n, q.Over.From)
		return q.always(m, q.Over, sh.scratch[0][:0])
	}
	sh.scratch[0] = q.searchRated(sh.scratch[0], q.Over, q.Aim.reach(q.Over), margin)
	return sh.scratch[0]
}

// unknownIf turns the finding at the start of the span from violated to
// unknown where its margin is not a number.
func (s *Sheet) unknownIf(first int, least Margin) {
	if math.IsNaN(least.Value) && len(s.Found) > first {
		s.Found[first].Verdict = Unknown
	}
}

// daylight is the check that the Sun's centre is below the beam's limit,
// airless.
type daylight struct{}

func (daylight) Code() Code { return CodeDaylight }

func (daylight) Look(f *Foreseen, q *Question, sh *Sheet) {
	if q.Shared.daylight(q, sh) {
		return
	}
	first := sh.begin()
	limit := q.Beam.Limits.SunBelow
	if limit >= 90*s1.Degree {
		sh.finish(CodeDaylight, first, Margin{Value: (limit - 90*s1.Degree).Radians(), Unit: Radian})
		return
	}
	margin := func(n *sky.Night, at time.Time) float64 {
		d := n.Sun(at)
		return limit.Radians() - math.Atan2(d.Z, math.Hypot(d.X, d.Y)) - sky.SunError.Radians()
	}
	sun := *q
	sun.Aim = nil // the Sun is there wherever the aim is
	sh.scratch[0] = sun.search(sh.scratch[0], sky.SunRate, q.Over, margin)
	for _, s := range sh.scratch[0] {
		sh.add(Finding{Code: CodeDaylight, Verdict: Violated, Over: s, Detail: "the Sun is above the beam's limit"})
	}
	least := UnknownMargin()
	if n := nightAt(q.Nights, q.Over.From); n != nil {
		least = Margin{Value: margin(n, q.Over.From), Unit: Radian}
	}
	sh.unknownIf(first, least)
	sh.finish(CodeDaylight, first, least)
}
