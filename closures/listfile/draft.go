package listfile

import (
	"math"

	"beamward/closures"
)

// draft is a list while it is read. The readers of the formats hand it heads,
// regions and windows as cells; it checks each, reports what is wrong with its
// line, and goes on, so that every bad line is found in one reading.
type draft struct {
	faults
	limits  Limits
	smaller string // the mend for a list that is too large
	head    headText
	text    closures.ListText // what is good so far; Window.Region indexes names until finish
	settled bool              // the head was checked, and windows can be held against the coverage

	names       map[string]int32
	byName      []named
	seen        int  // windows, good or bad
	lost        bool // some line could not be told for what it was, so that nothing follows from what is missing
	dropRepeats bool // a window that stands twice is kept once, rather than refused
	points      int
	line        func(n int) []byte // the text of a line read earlier, where it is still at hand
}

// named is what is known of one region's name.
type named struct {
	region int32 // index into text.Regions, or noRegion
	used   bool  // some window names it, good or bad
}

const (
	noRegion  int32 = -1
	badRegion int32 = -2 // it was defined, and refused
)

func newDraft(limits Limits) *draft {
	return &draft{limits: limits, names: make(map[string]int32), smaller: "split the list"}
}

// intern returns the index of a region's name.
func (d *draft) intern(id []byte) int32 {
	if i, ok := d.names[string(id)]; ok {
		return i
	}
	i := int32(len(d.byName))
	d.names[string(id)] = i
	d.byName = append(d.byName, named{region: noRegion})
	return i
}

// windowText is a window before it is checked.
type windowText struct {
	at          place
	region      cell
	open        bool
	state       bool // open says something
	bad         bool // its reader refused it already
	from, until cell
	ref         cell
}

// window checks a window and keeps it. A closed window is mapped outward, an
// open one inward.
func (d *draft) window(w *windowText) {
	if d.full {
		return
	}
	d.seen++
	if d.seen > d.limits.Windows || len(d.text.Windows) == math.MaxInt32 {
		d.stop(w.at, "the list has too many windows", d.smaller)
		return
	}
	before := d.total
	id, ok := d.name(w.region, w.at, "region")
	index := noRegion
	if ok {
		index = d.intern(id)
		d.byName[index].used = true
	}
	if !w.state && !w.bad {
		d.add(w.at, "the window is neither closed nor open", "give closed or open")
	}
	from, ok1 := d.time(w.from, w.at, "from")
	until, ok2 := d.time(w.until, w.at, "until")
	ref, _ := d.reference(w.ref)
	if w.bad || !(ok && ok1 && ok2) || d.total > before {
		return
	}
	one := closures.Window{Region: index, Open: w.open, From: from.early, Until: until.late, Ref: ref}
	if w.open {
		one.From, one.Until = from.late, until.early
	}
	switch {
	case !from.before(until):
		d.add(w.at, "the window is empty: from is not before until", "correct the times")
	case one.From >= one.Until:
		d.add(w.at, "the open window is empty: it lies inside a leap second", "take it out")
	case d.settled && d.outside(&one):
		d.add(w.at, outsideCause, outsideMend)
	default:
		d.text.Windows = append(d.text.Windows, one)
		d.text.Lines = append(d.text.Lines, w.at.line)
	}
}

const (
	outsideCause = "the window lies outside covers"
	outsideMend  = "correct the window or covers"
)

// outside reports whether a window shares no instant with the coverage.
func (d *draft) outside(w *closures.Window) bool {
	c := d.text.Covers
	return !c.Empty() && (w.Until <= c.From.UnixNano() || w.From >= c.Until.UnixNano())
}
