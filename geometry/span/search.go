package span

import (
	"math"
	"time"
)

// Below returns every instant of over at which margin may be zero or less.
//
// The margin is signed, positive when clear; rate bounds how fast it can
// change, in the margin's unit a second, everywhere in over. From an instant t
// with margin m nothing can happen before t + |m|/rate, so the search leaps
// there: far from an edge the steps are long, and they shorten toward it.
//
// What is promised, where the bound holds:
//   - No instant of over whose margin is zero or less is missed.
//   - Each instant returned lies within the tolerance after one whose margin
//     is at most rate x tolerance, which may count as used up: so a margin that
//     only grazes zero ends the search too. An edge that the margin crosses at
//     an eighth of its rate or more is placed within the tolerance, before or
//     at a start and after or at an end; one crossed at 1/k of the rate within
//     k+1 tolerances.
//
// What fails, fails toward the whole: an infinite or NaN margin counts as used
// up, back to the last good evaluation and on until the next; so does the step
// before a margin that breaks the bound. A rate that is NaN, infinite or
// negative, a tolerance that is not positive, or a span of over 292 years
// returns all of over. A rate of zero says that the margin is constant. A
// failure that lies wholly between two evaluations cannot be seen: keep over
// to where the margin is known.
func Below(margin func(at time.Time) float64, rate float64, over Span, tolerance time.Duration) Set {
	return AppendBelow(nil, margin, rate, over, tolerance)
}

// BelowRated is Below for a margin that states with each value a bound on its
// rate for the coming step: it must hold from the instant asked about for
// |m|/rate, and for at least the tolerance.
func BelowRated(margin func(at time.Time) (m, rate float64), over Span, tolerance time.Duration) Set {
	return AppendBelowRated(nil, margin, over, tolerance)
}

// AppendBelow adds what Below finds to the set dst and returns it; it allocates
// only when dst is too short.
func AppendBelow(dst Set, margin func(at time.Time) float64, rate float64, over Span, tolerance time.Duration) Set {
	return AppendBelowRated(dst, func(at time.Time) (float64, float64) { return margin(at), rate }, over, tolerance)
}

// AppendBelowRated adds what BelowRated finds to the set dst and returns it; it
// allocates only when dst is too short.
func AppendBelowRated(dst Set, margin func(at time.Time) (m, rate float64), over Span, tolerance time.Duration) Set {
	before := len(dst)
	dst = search(dst, margin, over, tolerance)
	if before > 0 && before < len(dst) && !dst[before-1].Until.Before(dst[before].From) {
		return Tidy(dst)
	}
	return dst
}

const (
	// finer is how much finer than the tolerance the search steps near an
	// edge. An edge crossed at 1/k of the rate is placed to (k+1)/finer of the
	// tolerance, which keeps it within the tolerance up to k = 8.
	finer = 10
	// patience is how many short steps in a row the search makes before it
	// doubles the least one, up to the tolerance: what bounds a graze. Both
	// edges of a short dip at an eighth of the rate take about 80.
	patience = 100
	// blindParts is into how many parts at most a span is cut where the margin
	// is unknown and so gives no length of step.
	blindParts = 256
	// slack is the part of a margin by which rounding may seem to break its
	// bound over one step.
	slack = 1e-9
)

func search(dst Set, margin func(at time.Time) (m, rate float64), over Span, tolerance time.Duration) Set {
	length := over.Length()
	if length == 0 {
		return dst
	}
	if tolerance <= 0 || length == math.MaxInt64 {
		return append(dst, over)
	}
	var (
		found     = Set(dst[len(dst):])
		fine      = max(tolerance/finer, 1)
		least     = fine              // the least step now
		short     = 0                 // short steps in a row
		since     = time.Duration(-1) // where the present hit began; -1 outside one
		lastClear = -1.0              // the last margin evaluated; -1 where it was no clear one
		blind     = false             // the last evaluation was of no use
		step      = time.Duration(0)
	)
	for t := time.Duration(0); t < length; t += step {
		m, reach, known := sound(margin(over.From.Add(t)))
		clear := m > 0 && reach > least
		switch {
		case !clear && since < 0 && lastClear >= 0 && m < -slack*lastClear:
			since = t - step // the bound of that step was false
		case !clear && since < 0:
			since = t
		case clear && blind:
			t, m, reach = regain(margin, over.From, t-step, t, tolerance)
			fallthrough
		case clear && since >= 0:
			found = found.put(Span{over.From.Add(since), over.From.Add(t)})
			since, least, short = -1, fine, 0
		}
		switch {
		case clear:
			step, lastClear = reach, m
		case known:
			step, lastClear = max(reach, least), -1
		default:
			step, lastClear = max(tolerance, length/blindParts), -1
			if left := length - 1 - t; left > 0 {
				step = min(step, left) // look at the last instant before giving it up
			}
		}
		blind = !known
		if step = min(step, length-t); step > tolerance {
			least, short = fine, 0
		} else if short++; short == patience {
			least, short = min(2*least, tolerance), 0
		}
	}
	if since >= 0 {
		found = found.put(Span{over.From.Add(since), over.Until})
	}
	return append(dst, found...)
}

// sound returns the margin m and the time in which it cannot reach zero. Where
// m or its rate is of no use, known is false and m is the worst there is.
func sound(m, rate float64) (worst float64, reach time.Duration, known bool) {
	if math.IsNaN(m) || math.IsInf(m, 0) || !(rate >= 0) || math.IsInf(rate, 1) {
		return math.Inf(-1), 0, false
	}
	nanoseconds := math.Abs(m) / rate * 1e9
	if rate == 0 || nanoseconds >= 1<<62 {
		return m, math.MaxInt64, true
	}
	return m, time.Duration(nanoseconds), true
}

// regain returns an instant after the unknown one lo, no later than the clear
// one hi, that is clear and has one that is not within tolerance before it.
func regain(margin func(at time.Time) (m, rate float64), from time.Time, lo, hi, tolerance time.Duration) (t time.Duration, m float64, reach time.Duration) {
	m, reach, _ = sound(margin(from.Add(hi)))
	for hi-lo > tolerance {
		mid := lo + (hi-lo)/2
		if o, r, _ := sound(margin(from.Add(mid))); o > 0 && r > tolerance {
			hi, m, reach = mid, o, r
		} else {
			lo = mid
		}
	}
	return hi, m, reach
}
