package replay

import (
	"math"

	"beamward/closures"
	"beamward/geometry/sky"
)

// Margins so small that another build may round them to the other side.
const (
	asGoodAsRad = 1e-9 // rad: 0.2 milliarcseconds
	asGoodAsM   = 1e-6 // m
)

// byEdge is what a foreseeable margin may be besides, rad: its closures begin
// and end where a search placed them, in steps of EdgeDecide, and rounding can
// take or leave one step.
var byEdge = sky.SkyRate * closures.EdgeDecide.Seconds()

// hinge is the code and the margin that a decision hung on.
type hinge struct {
	Code   closures.Code
	Margin closures.Margin
}

// latch are the codes that follow from what was closed before.
const latch closures.Codes = 1<<closures.CodeReopening | 1<<closures.CodeRearm

// hangsOn finds why two builds may decide differently: each code that one of
// them has and the other has not hangs on a margin that is as good as zero,
// but for what the latch made of that. Nil where one does not. The sheet is
// the replay's.
func hangsOn(recorded, mine *closures.Decision, sheet *closures.Sheet) *hinge {
	var why *hinge
	apart := (recorded.Codes ^ mine.Codes) &^ latch
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		if !apart.Has(c) {
			continue
		}
		m, zero := least(c, recorded, mine, sheet)
		if !zero {
			return nil
		}
		if why == nil {
			why = &hinge{c, m}
		}
	}
	return why
}

// latched reports whether two decisions differ in what the latch adds alone.
func latched(recorded, mine *closures.Decision) bool {
	return (recorded.Codes^mine.Codes)&^latch == 0
}

// least is the smallest margin that either decision states for a code, and
// whether it is as good as zero.
func least(c closures.Code, recorded, mine *closures.Decision, sheet *closures.Sheet) (closures.Margin, bool) {
	edge := 0.0
	if closures.ForeseeableCodes().Has(c) {
		edge = byEdge
	}
	found, any := closures.Margin{}, false
	take := func(m closures.Margin) {
		if (m.Unit == closures.Radian || m.Unit == closures.Metre) && !math.IsNaN(m.Value) && (!any || math.Abs(m.Value) < math.Abs(found.Value)) {
			found, any = m, true
		}
	}
	take(sheet.Answers[c].Least)
	for _, d := range [...]*closures.Decision{recorded, mine} {
		for i := range d.Reasons {
			if f := &d.Reasons[i]; f.Code == c && f.Margin != (closures.Margin{Unit: f.Margin.Unit}) {
				take(f.Margin)
			}
		}
	}
	switch {
	case any && found.Unit == closures.Radian && math.Abs(found.Value) <= asGoodAsRad+edge:
		return found, true
	case any && found.Unit == closures.Metre && math.Abs(found.Value) <= asGoodAsM:
		return found, true
	case edge > 0:
		return atEdge(c, recorded, mine)
	}
	return found, false
}

// atEdge reports whether both decisions know of one closure with edges that
// agree to the width of the search, which one counts as present and the other
// as yet to come.
func atEdge(c closures.Code, recorded, mine *closures.Decision) (closures.Margin, bool) {
	for _, pair := range [...][2]*closures.Decision{{recorded, mine}, {mine, recorded}} {
		for i := range pair[0].Reasons {
			f := &pair[0].Reasons[i]
			if f.Code != c {
				continue
			}
			for j := range pair[1].Coming {
				g := &pair[1].Coming[j]
				off := f.Over.From.Sub(g.Over.From)
				if g.Code == c && g.Source == f.Source && g.Region == f.Region && off.Abs() <= 2*closures.EdgeDecide {
					return closures.Margin{Value: off.Seconds(), Unit: closures.Second}, true
				}
			}
		}
	}
	return closures.Margin{}, false
}
