package api

import (
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
	"beamward/service/render"
)

// widest is the margin time of the beams, the longest of them, and the clock's
// error.
func widest(v *View, beams []closures.BeamID) (margin, clockError time.Duration) {
	for _, id := range beams {
		if r := v.Rules.Beam(id); r != nil {
			margin = max(margin, v.Rules.MarginTime(r))
		}
	}
	return margin, v.Rules.PlanClockError()
}

// heldOver returns the holds of the beams over a span.
func heldOver(v *View, beams []closures.BeamID, over span.Span) []render.Item {
	var items []render.Item
	for i := range v.Holds {
		h := &v.Holds[i]
		if h.Beam != closures.EveryBeam && !slices.Contains(beams, h.Beam) {
			continue
		}
		margin, clockError := widest(v, beams)
		it := render.Item{Code: closures.CodeHold.String(), Source: h.By, Ref: string(h.ID), Detail: h.Reason, Span: h.Span().Widen(margin+clockError, clockError).Intersect(over)}
		if h.Beam != closures.EveryBeam {
			it.Beam = string(h.Beam)
		}
		if h.Region != nil {
			it.Region = h.Region.Shape.String()
		}
		if !it.Span.Empty() {
			items = append(items, it)
		}
	}
	return items
}

// listedOver adds what one list closes over a span, region by region.
func listedOver(v *View, l *closures.Listed, beams []closures.BeamID, over span.Span, items []render.Item) []render.Item {
	t := l.Text()
	a := v.Rules.Authority(t.Authority)
	var its []closures.BeamID
	for _, b := range beams {
		if l.For(b) {
			its = append(its, b)
		}
	}
	if a == nil || len(its) == 0 {
		return items
	}
	margin, clockError := widest(v, its)
	lead, tail := a.Lead+margin+clockError, a.Tail+clockError
	near := over.Widen(tail, lead)
	if t.Covers.Intersect(near).Empty() && !windowsReach(t, near) {
		return items
	}
	names := []string{""}
	if len(t.Beams) > 0 || len(its) < len(v.Rules.Beams) {
		names = names[:0]
		for _, b := range its {
			names = append(names, string(b))
		}
	}
	add := func(region, ref, detail string, s span.Span) {
		if s = s.Widen(lead, tail).Intersect(over); s.Empty() {
			return
		}
		for _, name := range names {
			items = append(items, render.Item{Beam: name, Code: closures.CodeListedClosure.String(), Source: string(t.Authority), List: string(t.ID), Region: region, Ref: ref, Detail: detail, Span: s})
		}
	}
	if !t.UnlistedOpen {
		add("", "", "the sky outside the list's regions is closed", t.Covers)
	}
	opens := make([]bool, len(t.Regions))
	for i := range t.Windows {
		w := &t.Windows[i]
		opens[w.Region] = opens[w.Region] || w.Open
	}
	for i := range t.Windows {
		w := &t.Windows[i]
		if !w.Open && w.Span().Overlaps(near) {
			add(t.Regions[w.Region].ID, w.Ref, "the region is closed", w.Span())
		}
		if len(items) > itemsMost {
			return items
		}
	}
	// A region with open windows is closed outside them.
	gaps := closedOutside(t, opens)
	for r := range t.Regions {
		switch {
		case t.Regions[r].Throughout == closures.ThroughoutClosed:
			add(t.Regions[r].ID, "", "the region is closed throughout", t.Covers)
		case opens[r]:
			for _, s := range gaps[int32(r)] {
				add(t.Regions[r].ID, "", "the region is closed outside its open windows", s)
			}
		}
	}
	return items
}

func windowsReach(t *closures.ListText, near span.Span) bool {
	for i := range t.Windows {
		if t.Windows[i].Span().Overlaps(near) {
			return true
		}
	}
	return false
}

// closedOutside returns the gaps between the open windows of the regions that
// have some.
func closedOutside(t *closures.ListText, opens []bool) map[int32]span.Set {
	open := map[int32][]span.Span{}
	for i := range t.Windows {
		if w := &t.Windows[i]; w.Open && opens[w.Region] {
			open[w.Region] = append(open[w.Region], w.Span())
		}
	}
	out := make(map[int32]span.Set, len(open))
	for r, spans := range open {
		out[r] = span.Make(spans...).Complement(t.Covers)
	}
	return out
}
