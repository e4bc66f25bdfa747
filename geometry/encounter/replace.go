package encounter

import "math"

// Replaces reports whether the report may take the place of the older one that
// old was made of: it is no older, its position lies inside old's reach at its
// own instant, and its velocity differs from the older one by no more than the
// errors of both and the acceleration allow. Where the answer is no, both
// count, until a later report agrees with each.
//
// The theorem needs no such rule: any report that satisfies (R) gives a reach
// that holds the aircraft. The rule guards against a report that does not, such
// as a garbled position or a second aircraft under the same address. It asks
// about the reported values themselves, without adding the new report's own
// position error, which would admit the more, the worse a report is.
//
// A report that knows less than the older one (no altitude, no velocity) is
// asked about what it knows; its own reach is the larger one. Not a number,
// anywhere, answers no; and nothing replaces by a reach that is everywhere.
func Replaces(old *Reach, next *Report) bool {
	if !old.valid || next.At.Before(old.at) {
		return false
	}
	as := Of(next, &Motion{})
	if !as.valid {
		return false
	}
	t := seconds(next.At.Sub(old.at))
	tau := t + old.lag(t)
	column := 0.0
	if !old.altitude {
		column = math.Abs(next.Position.Z - old.p.Z)
	}
	l := old.limits(tau, column)
	d := next.Position.Sub(old.p)
	inside := true
	if old.course {
		inside = inside && math.Hypot(d.X-old.v.X*t, d.Y-old.v.Y*t) <= l.eh+old.speed*old.lambda+l.evh*tau+l.ah*tau*tau/2
		if next.CourseKnown {
			// Both true instants are uncertain: they lie at most this far apart.
			apart := tau + as.lambda
			inside = inside && math.Hypot(as.v.X-old.v.X, as.v.Y-old.v.Y) <= l.evh+as.evh+l.ah*apart
		}
	}
	if !old.fast {
		inside = inside && math.Hypot(d.X, d.Y) <= l.eh+l.v*tau
	}
	if old.altitude && next.AltitudeKnown {
		if old.climb {
			inside = inside && math.Abs(d.Z-old.v.Z*t) <= l.ez+math.Abs(old.v.Z)*old.lambda+l.evz*tau+l.az*tau*tau/2
		}
		if !old.steep {
			inside = inside && math.Abs(d.Z) <= l.ez+l.c*tau
		}
	}
	if old.climb && next.ClimbKnown {
		inside = inside && math.Abs(as.v.Z-old.v.Z) <= l.evz+as.evz+l.az*(tau+as.lambda)
	}
	return inside
}
