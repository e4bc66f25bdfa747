package span

import "time"

// Span is the time from From, included, until Until, excluded. A span whose
// Until is not after its From is empty, and so is the zero Span.
type Span struct{ From, Until time.Time }

// Empty reports whether s holds no instant.
func (s Span) Empty() bool { return !s.From.Before(s.Until) }

// Length returns how long s lasts, zero when it is empty, at most the longest
// time.Duration (292 years).
func (s Span) Length() time.Duration {
	if s.Empty() {
		return 0
	}
	return s.Until.Sub(s.From)
}

// Contains reports whether s holds the instant at.
func (s Span) Contains(at time.Time) bool { return !at.Before(s.From) && at.Before(s.Until) }

// Covers reports whether s holds every instant of o. An empty o is covered.
func (s Span) Covers(o Span) bool {
	return o.Empty() || !o.From.Before(s.From) && !o.Until.After(s.Until)
}

// Overlaps reports whether s and o share an instant.
func (s Span) Overlaps(o Span) bool { return !s.Intersect(o).Empty() }

// Intersect returns the instants that s and o share; the zero Span when there
// are none.
func (s Span) Intersect(o Span) Span {
	if o.From.After(s.From) {
		s.From = o.From
	}
	if o.Until.Before(s.Until) {
		s.Until = o.Until
	}
	if s.Empty() {
		return Span{}
	}
	return s
}

// Widen returns s from lead before its From until tail after its Until. It
// never shrinks: a negative lead or tail counts as zero. An empty span stays
// empty, so a reader of closures must refuse empty ones rather than widen them.
func (s Span) Widen(lead, tail time.Duration) Span {
	if s.Empty() {
		return Span{}
	}
	return Span{s.From.Add(-max(lead, 0)), s.Until.Add(max(tail, 0))}
}

// Narrow returns s from lead after its From until tail before its Until, the
// zero Span when nothing is left. It never grows: a negative lead or tail
// counts as zero.
func (s Span) Narrow(lead, tail time.Duration) Span {
	s = Span{s.From.Add(max(lead, 0)), s.Until.Add(-max(tail, 0))}
	if s.Empty() {
		return Span{}
	}
	return s
}
