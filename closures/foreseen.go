package closures

import (
	"slices"
	"time"

	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Foreseen is all that a foreseeable check may see. It is immutable: a State
// hands out copies whose slices it never changes.
type Foreseen struct {
	Rules     *Rules
	Lists     []Listed
	Holds     []HoldPlaced
	Pointings []Pointing
	Air       sky.Refraction
}

// Listed is a list that closes, and whether it also opens. A list that waits
// for confirmation closes at once and opens nothing; what it would replace
// stays.
type Listed struct {
	*List
	Waiting bool
}

// Pointing is where a neighbour telescope is known to point.
type Pointing struct {
	Telescope TelescopeID
	Aim       *Aim
	Seen      AimSeen
	Heard     time.Time
	AimBegan  time.Time // when this aim was first heard, by this clock

	// Of a plan only. A decision knows present pointings alone.
	Scheduled bool      // a timetable says so, rather than the telescope
	During    span.Span // when the pointing counts; zero: at any time
}

// Prepared brings an aim to what the checks use: airless, and fixed to the
// stars where it tracks but was stated by azimuth and elevation without rates.
// ok is false when it cannot be, as for want of its night.
func (f *Foreseen) Prepared(a *Aim, nights []*sky.Night) (used *Aim, ok bool) {
	if a == nil {
		return nil, false
	}
	return prepared(a, nightAt(nights, a.Reference), f.Air)
}

// PreparedAt is Prepared for an aim that a neighbour telescope states: an
// azimuth and elevation are those at its place.
func (f *Foreseen) PreparedAt(n *NeighbourRules, a *Aim, nights []*sky.Night) (used *Aim, ok bool) {
	return f.Prepared(f.Rules.fromTheirs(n, a), nights)
}

// ForeseeableCheck answers over a span for an aim. The planner and the
// decision ask the same checks. Look writes the check's answer and findings
// on the sheet; what it does not finish stays Unknown.
type ForeseeableCheck interface {
	Code() Code
	Look(*Foreseen, *Question, *Sheet)
}

// LiveCheck answers for now; only a decision asks it.
type LiveCheck interface {
	Code() Code
	Now(*Scene, *Sheet)
}

// foreseeable returns the checks that plan and decision share. One table, so
// that none is left out of either.
func foreseeable() [6]ForeseeableCheck {
	return [...]ForeseeableCheck{listedClosure{}, notCovered{}, fieldCrossing{}, held{}, elevationLimit{}, daylight{}}
}

// ForeseeableCodes is the set of codes that Look answers.
func ForeseeableCodes() Codes {
	var s Codes
	for _, c := range foreseeable() {
		s = s.With(c.Code())
	}
	return s
}

// Look asks every foreseeable check. The findings are on the sheet, each
// check's in order of time.
func (f *Foreseen) Look(q *Question, sh *Sheet) {
	for _, c := range foreseeable() {
		c.Look(f, q, sh)
	}
}

// Closed returns the union of what the foreseeable checks found on the sheet,
// each finding begun earlier by the margin time and widened both ways by the
// clock's error, and which of them answered at all. Where one did not, all of
// over is closed.
func (f *Foreseen) Closed(q *Question, sh *Sheet, clockError time.Duration) span.Set {
	return f.AppendClosed(nil, q, sh, clockError)
}

// AppendClosed is Closed in the memory of dst, which it writes over.
func (f *Foreseen) AppendClosed(dst span.Set, q *Question, sh *Sheet, clockError time.Duration) span.Set {
	margin := f.Rules.MarginTime(q.Beam)
	spans := dst[:0]
	for _, check := range foreseeable() {
		a := &sh.Answers[check.Code()]
		if a.Verdict == Unknown && a.N == 0 {
			return append(dst[:0], q.Over)
		}
		for i := range sh.Found[a.First : a.First+a.N] {
			spans = append(spans, sh.Found[a.First+i].Over.Widen(margin+clockError, clockError).Intersect(q.Over))
		}
	}
	return span.Tidy(spans)
}

// inForce reports whether a list for beam b opens at an instant.
func (l *Listed) opens(b BeamID) bool { return !l.Waiting && l.For(b) }

// held is the check of holds: people's own closures.
type held struct{}

func (held) Code() Code { return CodeHold }

func (held) Look(f *Foreseen, q *Question, sh *Sheet) {
	first := sh.begin()
	for i := range f.Holds {
		h := &f.Holds[i]
		if h.Beam != EveryBeam && h.Beam != q.Beam.ID {
			continue
		}
		when := h.Span().Intersect(q.Over)
		if when.Empty() {
			continue
		}
		found := Finding{Code: CodeHold, Source: Source(h.By), Verdict: Violated, Ref: string(h.ID), Detail: "a person holds the beam"}
		if h.Authority {
			found.Detail = "an authority's order holds the beam"
		}
		if h.Region == nil {
			found.Over = h.Span()
			sh.add(found)
			continue
		}
		sh.scratch[0] = q.touches(f, h.Region, when, sh.scratch[0])
		for _, s := range sh.scratch[0] {
			found.Over = s
			sh.add(found)
		}
	}
	sh.sortFrom(first)
	sh.finish(CodeHold, first, Margin{})
}

// sortFrom puts the findings from first on in order of time.
func (s *Sheet) sortFrom(first int) {
	slices.SortStableFunc(s.Found[first:], func(a, b Finding) int { return a.Over.From.Compare(b.Over.From) })
}
