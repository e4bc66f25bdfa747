package span

import (
	"math"
	"slices"
	"sort"
	"time"
)

// Set is a set of instants: spans in order of time, none empty, none touching
// or overlapping another. The zero Set is empty. Make builds one from any
// spans; a literal must keep the order itself, which Valid tells.
type Set []Span

// Make returns the set of the instants that any of the spans holds. The
// spans are copied.
func Make(spans ...Span) Set { return Tidy(slices.Clone(spans)) }

// Tidy makes a set of any spans in their own memory, which it reorders.
func Tidy(spans []Span) Set {
	slices.SortFunc(spans, func(a, b Span) int { return a.From.Compare(b.From) })
	set := Set(spans[:0])
	for _, s := range spans {
		set = set.put(s)
	}
	return set
}

// put adds s, which must not begin before the last span of the set does, at
// the set's end.
func (s Set) put(o Span) Set {
	if o.Empty() {
		return s
	}
	if n := len(s); n > 0 && !s[n-1].Until.Before(o.From) {
		if o.Until.After(s[n-1].Until) {
			s[n-1].Until = o.Until
		}
		return s
	}
	return append(s, o)
}

// Valid reports whether s keeps the order that every operation relies on.
func (s Set) Valid() bool {
	for i, o := range s {
		if o.Empty() || i > 0 && !s[i-1].Until.Before(o.From) {
			return false
		}
	}
	return true
}

// Equal reports whether s and o hold the same instants.
func (s Set) Equal(o Set) bool {
	return slices.EqualFunc(s, o, func(a, b Span) bool {
		return a.From.Equal(b.From) && a.Until.Equal(b.Until)
	})
}

// At returns the index of the first span that ends after the instant at: the
// one that holds it, or else the next one; len(s) when there is none.
func (s Set) At(at time.Time) int {
	return sort.Search(len(s), func(i int) bool { return s[i].Until.After(at) })
}

// Next returns the span that holds the instant at, or else the first one after
// it; ok is false when none is left.
func (s Set) Next(at time.Time) (next Span, ok bool) {
	if i := s.At(at); i < len(s) {
		return s[i], true
	}
	return Span{}, false
}

// Contains reports whether s holds the instant at.
func (s Set) Contains(at time.Time) bool {
	next, ok := s.Next(at)
	return ok && next.Contains(at)
}

// Covers reports whether s holds every instant of o. An empty o is covered.
func (s Set) Covers(o Span) bool {
	next, _ := s.Next(o.From)
	return next.Covers(o)
}

// Overlaps reports whether s and o share an instant.
func (s Set) Overlaps(o Span) bool {
	next, _ := s.Next(o.From)
	return next.Overlaps(o)
}

// Total returns how long the spans last together, at most the longest
// time.Duration.
func (s Set) Total() time.Duration {
	var sum time.Duration
	for _, o := range s {
		if sum += o.Length(); sum < 0 {
			return math.MaxInt64
		}
	}
	return sum
}

// Longest returns the longest span, the earliest of equals; the zero Span of
// an empty set.
func (s Set) Longest() Span {
	var longest Span
	for _, o := range s {
		if o.Length() > longest.Length() {
			longest = o
		}
	}
	return longest
}

// Hull returns the span from the first instant of s to its last; the zero
// Span of an empty set.
func (s Set) Hull() Span {
	if len(s) == 0 {
		return Span{}
	}
	return Span{s[0].From, s[len(s)-1].Until}
}
