package plan

import (
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// Entry is one line of an ordered plan: the target has the beam from Start on
// for Length. The time to acquire it lies before Start.
type Entry struct {
	Target Target
	Start  time.Time
	Length time.Duration
}

// over is the time that the entry takes, acquisition included.
func (e *Entry) over() span.Span {
	return span.Span{From: e.Start.Add(-e.Target.Use.Reacquire), Until: e.Start.Add(e.Length)}
}

// Why says what stands against an entry.
type Why uint8

// What can stand against an entry.
const (
	Closed   Why = iota // something foreseeable closes it
	Outside             // it leaves the span that was planned
	TooShort            // the allowed span that holds it is shorter than its target wants
	Overlaps            // an entry ahead of it in the plan has the beam
	Disorder            // it starts before the entry ahead of it does
)

var whyWords = [...]string{"closed", "outside-the-plan", "span-too-short", "overlaps", "out-of-order"}

// String returns the word for it.
func (w Why) String() string {
	if int(w) < len(whyWords) {
		return whyWords[w]
	}
	return "unknown"
}

// Conflict is one thing against an entry.
type Conflict struct {
	Why     Why
	Over    span.Span        // the part of the entry that it hits
	Finding closures.Finding // of Closed: the closure
	With    int              // of Overlaps and Disorder: the index of the other entry
}

// Checked is what was found about one entry.
type Checked struct {
	Entry     Entry
	Conflicts []Conflict // in order of time; none: it stands
	// Earlier and Later are the nearest starts that clear every conflict while
	// all other entries stay where they are; zero where there is none. The entry
	// may leave its place in the order for it.
	Earlier, Later time.Time
	// Delayed is the earliest start, not before the one asked for, if every
	// entry that must gives way to later and the order is kept; zero where there
	// is none.
	Delayed  time.Time
	Cautions []closures.Caution
}

// MaxEntries is how many entries a sequence may have.
const MaxEntries = 5000

// Sequence checks an ordered plan: every entry, with all that stands against it
// and the starts that would clear it. The error is a *closures.Error. LeftOut of
// Allowed holds for it too.
func (p *Planner) Sequence(entries []Entry, scratch *Scratch) ([]Checked, error) {
	if len(entries) > MaxEntries {
		return nil, closures.Errorf(closures.Invalid, "split the plan", "sequence: it has more than %d entries", MaxEntries)
	}
	out := make([]Checked, len(entries))
	busy := make([]span.Span, len(entries))
	use := make([]span.Set, len(entries))
	planned := map[*closures.Aim]Allowed{}
	for i := range entries {
		e := &entries[i]
		if !(e.Length > 0 && e.Length <= MaxLength) {
			return nil, closures.Errorf(closures.Invalid, "give a length over 0, at most 14 days", "sequence: the length of entry %d (%.64q) is out of bounds", i+1, e.Target.Name)
		}
		if err := e.Target.Use.check(e.Target.Name); err != nil {
			return nil, err
		}
		target, ok := planned[e.Target.Aim]
		if !ok {
			var err error
			if target, err = p.One(e.Target.Aim, scratch); err != nil {
				return nil, err
			}
			planned[e.Target.Aim] = target
		}
		busy[i] = e.over()
		use[i] = e.Target.Use.holding(target.Spans)
		out[i] = Checked{Entry: *e, Conflicts: p.against(&target, e, use[i]), Cautions: target.Cautions}
	}
	p.between(out, busy)
	p.clear(out, busy, use)
	return out, nil
}

// against returns what is against one entry by itself.
func (p *Planner) against(t *Allowed, e *Entry, use span.Set) []Conflict {
	over := e.over()
	var out []Conflict
	for _, s := range span.Make(p.over).Complement(over) {
		out = append(out, Conflict{Why: Outside, Over: s})
	}
	for _, f := range t.Blocked {
		if part := f.Over.Intersect(over); !part.Empty() {
			out = append(out, Conflict{Why: Closed, Over: part, Finding: f})
		}
	}
	if len(out) == 0 && !use.Covers(over) {
		out = append(out, Conflict{Why: TooShort, Over: over})
	}
	slices.SortStableFunc(out, func(a, b Conflict) int { return a.Over.From.Compare(b.Over.From) })
	return out
}

// between finds the entries that are in each other's way.
func (p *Planner) between(out []Checked, busy []span.Span) {
	for i := range out {
		c := &out[i]
		for j := range i {
			if part := busy[i].Intersect(busy[j]); !part.Empty() {
				c.Conflicts = append(c.Conflicts, Conflict{Why: Overlaps, Over: part, With: j})
			}
		}
		if i > 0 && c.Entry.Start.Before(out[i-1].Entry.Start) {
			c.Conflicts = append(c.Conflicts, Conflict{Why: Disorder, Over: busy[i], With: i - 1})
		}
	}
}

// clear finds the starts that clear the conflicts.
func (p *Planner) clear(out []Checked, busy []span.Span, use []span.Set) {
	free := p.over.From // from when on the beam is free, if those ahead give way
	for i := range out {
		c := &out[i]
		e := &c.Entry
		if len(c.Conflicts) > 0 {
			others := slices.Concat(busy[:i], busy[i+1:])
			left := use[i].Subtract(span.Tidy(others))
			c.Earlier, c.Later = nearest(left, e)
		}
		from := e.Start.Add(-e.Target.Use.Reacquire)
		if from.Before(free) {
			from = free
		}
		if at, ok := firstFrom(use[i], from, e.over().Length()); ok {
			c.Delayed = at.Add(e.Target.Use.Reacquire)
			free = c.Delayed.Add(e.Length)
		}
	}
}

// nearest returns the nearest starts, not later and not earlier than the
// entry's, at which all of it lies in one span of a set.
func nearest(free span.Set, e *Entry) (earlier, later time.Time) {
	length, ahead := e.over().Length(), e.Target.Use.Reacquire
	want := e.over().From
	for _, s := range free {
		last := s.Until.Add(-length)
		if last.Before(s.From) {
			continue
		}
		if !s.From.After(want) {
			at := last
			if at.After(want) {
				at = want
			}
			earlier = at.Add(ahead)
		}
		if later.IsZero() && !last.Before(want) {
			at := s.From
			if at.Before(want) {
				at = want
			}
			later = at.Add(ahead)
		}
	}
	return earlier, later
}

// firstFrom returns the first instant not before from at which a length fits
// into a span of the set.
func firstFrom(s span.Set, from time.Time, length time.Duration) (time.Time, bool) {
	for _, o := range s[s.At(from):] {
		at := o.From
		if at.Before(from) {
			at = from
		}
		if !at.Add(length).After(o.Until) {
			return at, true
		}
	}
	return time.Time{}, false
}

// Changed returns the indexes of the entries that stood before and do not now,
// or do now and did not, of one sequence checked twice.
func Changed(before, after []Checked) []int {
	var out []int
	for i := range min(len(before), len(after)) {
		if (len(before[i].Conflicts) == 0) != (len(after[i].Conflicts) == 0) {
			out = append(out, i)
		}
	}
	return out
}
