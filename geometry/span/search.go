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
//     is at most rate x tolerance, which may count as used up. An edge that the
//     margin crosses at an eighth of its rate or more is placed within the
//     tolerance, at a start or before it, at an end or after it; one crossed at
//     1/k of the rate, or out of a graze, within k+1 tolerances.
//   - A graze, where the margin stays within rate x tolerance of zero for more
//     than 50 tolerances, is followed with ever longer steps, so that any ends.
//     An opening in it that is shorter than 1/500 of it may be lost.
//
// An edge takes some 15 to 40 evaluations, more the slower it is crossed: give
// the tightest rate there is. A margin that stays just above rate x tolerance
// is the worst, with one evaluation a tolerance.
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
	// patience is into how many steps at least a graze, a run of steps that are
	// not leaps, is cut; as it lasts they lengthen. Up to 51 tolerances of it are
	// followed at the finest, and 12 hours at 0.1 s cost some 5,000 steps.
	patience = 512
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
	// Instants are counted from over.From.
	var (
		found     = Set(dst[len(dst):])
		fine      = max(tolerance/finer, 1)
		least     = fine // a margin that allows no more time than this is a hit
		step      time.Duration
		graze     time.Duration       // when the last leap or hit ended
		since     = time.Duration(-1) // when the present hit began; -1 outside one
		lastClear = -1.0              // the last margin evaluated; -1 where that was a hit
		guessed   bool                // the last step was longer than the margin allowed
	)
	for t := time.Duration(0); t < length; t += step {
		m, reach := sound(margin(over.From.Add(t)))
		grown := (t - graze) / patience
		if since < 0 { // a hit ends at the least that it began with
			least = min(max(grown, fine), tolerance)
		}
		clear := m > 0 && reach > least
		switch {
		case clear && since >= 0:
			if guessed {
				t, m, reach = firstClear(margin, over.From, t-step, t, least, fine)
			}
			found = found.put(Span{over.From.Add(since), over.From.Add(t)})
			since, graze = -1, t
		case !clear && since < 0:
			since = t
			if m < -slack*lastClear && lastClear >= 0 {
				since -= step // that step's bound was false
			}
		}
		if clear {
			step, guessed, lastClear = reach, false, m
		} else {
			step, guessed, lastClear = max(reach, fine), false, -1
			if grown > step {
				// All of a step is closed when its start is, so a longer one is safe;
				// but look at the last instant before giving it up.
				step, guessed = min(grown, max(length-1-t, 1)), true
			}
		}
		if step = min(step, length-t); step > tolerance && !guessed {
			graze = t + step
		}
	}
	if since >= 0 {
		found = found.put(Span{over.From.Add(since), over.Until})
	}
	return append(dst, found...)
}

// sound returns the margin m and the time in which it cannot reach zero. Where
// m or its rate is of no use, it returns the worst there is.
func sound(m, rate float64) (float64, time.Duration) {
	if math.IsNaN(m) || math.IsInf(m, 0) || !(rate >= 0) || math.IsInf(rate, 1) {
		return math.Inf(-1), 0
	}
	nanoseconds := math.Abs(m) / rate * 1e9
	if rate == 0 || nanoseconds >= 1<<62 {
		return m, math.MaxInt64
	}
	return m, time.Duration(nanoseconds)
}

// firstClear returns an instant after lo, which is not clear, and no later than
// hi, which is, that is clear and follows one that is not by no more than fine;
// and its margin and reach.
func firstClear(margin func(at time.Time) (m, rate float64), from time.Time, lo, hi, least, fine time.Duration) (t time.Duration, m float64, reach time.Duration) {
	m, reach = sound(margin(from.Add(hi)))
	for hi-lo > fine {
		mid := lo + (hi-lo)/2
		if o, r := sound(margin(from.Add(mid))); o > 0 && r > least {
			hi, m, reach = mid, o, r
		} else {
			lo = mid
		}
	}
	return hi, m, reach
}
