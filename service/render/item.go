package render

import (
	"cmp"
	"slices"
	"strings"
	"time"

	"beamward/geometry/span"
)

// Notice stands in everything that this package writes.
const Notice = "for information, not for control"

// Item is one span of time for which a beam is to be shuttered, or may be open.
type Item struct {
	Beam   string // empty: every beam
	Target string // of a plan; else empty
	Open   bool   // a span that is allowed; else a closure
	Code   string // the reason's; empty for an allowed span
	Source string
	List   string
	Region string
	Ref    string
	Detail string
	Span   span.Span
}

// Sort puts items in the order in which they are written: by start, then end,
// then what they are.
func Sort(items []Item) {
	slices.SortStableFunc(items, func(a, b Item) int {
		return cmp.Or(a.Span.From.Compare(b.Span.From), a.Span.Until.Compare(b.Span.Until), cmp.Compare(a.Code, b.Code), cmp.Compare(a.Source, b.Source),
			cmp.Compare(a.List, b.List), cmp.Compare(a.Region, b.Region), cmp.Compare(a.Ref, b.Ref), cmp.Compare(a.Beam, b.Beam), cmp.Compare(a.Target, b.Target))
	})
}

// seconds rounds a span to whole seconds: a closure outward, an allowed span
// inward. ok is false where nothing is left.
func (it *Item) seconds() (from, until time.Time, ok bool) {
	from, until = it.Span.From.UTC(), it.Span.Until.UTC()
	down, up := from.Truncate(time.Second), until.Truncate(time.Second)
	if it.Open {
		if down.Before(from) {
			down = down.Add(time.Second)
		}
		return down, up, down.Before(up)
	}
	if up.Before(until) {
		up = up.Add(time.Second)
	}
	return down, up, down.Before(up)
}

// plain makes a text that stands on one line: control characters become blanks.
func plain(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r >= 0x80 && r < 0xa0 || r == '\u2028' || r == '\u2029' {
			return ' '
		}
		return r
	}, strings.ToValidUTF8(s, "?"))
}
