package api

import (
	"bytes"
	"fmt"
	"net/http"
	"slices"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry"
	"beamward/geometry/span"
	"beamward/service/access"
	"beamward/service/render"
)

// itemsMost bounds the closures of one answer, or of all its pages.
const itemsMost = 200_000

func closureRoutes() []route {
	return []route{{method: "GET", path: "/v1/closures", id: "closures", summary: "Closures that can be foreseen: of a direction, or of all that lists, holds and limits say", action: access.See,
		query: []param{fromParam, untilParam, {"beam", "only this beam", textOf(64)}, {"ra_deg", "ICRS, with dec_deg: only what stands against this direction", numberOf(0, 360)}, {"dec_deg", "ICRS, with ra_deg", numberOf(-90, 90)},
			{"format", "instead of Accept", wordOf("json", "csv", "ics")}, limitParam, cursorParam},
		gives: []string{jsonType, csvType, calendar}, answer: closuresDoc{}, errors: []int{404, 422}, serve: (*call).closures}}
}

type closuresDoc struct {
	From     time.Time    `json:"from"`
	Until    time.Time    `json:"until"`
	Total    int          `json:"total"`
	Closures []closureDoc `json:"closures" doc:"in order of their start; each begun earlier by the margin time and widened by lead, tail and the clock's error"`
	Notice   string       `json:"notice"`
	Cursor   string       `json:"cursor" doc:"for the next page; empty: there is none. It ends when lists or holds change"`
}

func (c *call) closures() error {
	media, err := c.chosen("json", "csv", "ics")
	if err != nil {
		return err
	}
	v, _ := c.view()
	over, err := c.over(24 * time.Hour)
	if err != nil {
		return err
	}
	limit, after, err := c.page("closures "+v.Book.Digest().String(), "from", "until", "beam", "ra_deg", "dec_deg")
	if err != nil {
		return err
	}
	start := 0
	if after != "" {
		// The span of the first page goes on, whatever the time is by now.
		var from, until int64
		if _, err := fmt.Sscanf(after, "%d %d %d", &start, &from, &until); err != nil || start < 0 {
			return refuse(http.StatusBadRequest, "cursor: it is not one of this query", "start again without it")
		}
		over = span.Span{From: time.Unix(0, from).UTC(), Until: time.Unix(0, until).UTC()}
	}
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	items, err := c.items(v, over)
	if err != nil {
		return err
	}
	render.Sort(items)
	var out bytes.Buffer
	switch media {
	case csvType:
		err = render.CSV(&out, items)
	case calendar:
		cal := render.Calendar{Name: v.Rules.Site.Name, At: c.wall()}
		err = cal.Write(&out, items)
	default:
		doc := closuresDoc{From: over.From, Until: over.Until, Total: len(items), Closures: []closureDoc{}, Notice: render.Notice}
		end := min(start+limit, len(items))
		for i := min(start, end); i < end; i++ {
			doc.Closures = append(doc.Closures, closureOf(&items[i]))
		}
		if end < len(items) {
			doc.Cursor = c.cursor("closures "+v.Book.Digest().String(), fmt.Sprintf("%d %d %d", end, over.From.UnixNano(), over.Until.UnixNano()), "from", "until", "beam", "ra_deg", "dec_deg")
		}
		return c.reply(http.StatusOK, doc)
	}
	if err != nil {
		return err
	}
	c.longer(c.api.limits.LongTime)
	return c.send(http.StatusOK, media+"; charset=utf-8", out.Bytes())
}

// items collects the closures that the query asks for.
func (c *call) items(v *View, over span.Span) ([]render.Item, error) {
	var beams []closures.BeamID
	if c.has("beam") {
		beams = []closures.BeamID{closures.BeamID(c.query.Get("beam"))}
		if v.Rules.Beam(beams[0]) == nil {
			return nil, refuse(http.StatusNotFound, "no beam of this name is configured", "see /v1/beams for those that are")
		}
	} else {
		for i := range v.Rules.Beams {
			beams = append(beams, v.Rules.Beams[i].ID)
		}
	}
	if c.has("ra_deg") != c.has("dec_deg") {
		return nil, badQuery("ra_deg", "one of ra_deg and dec_deg is missing", "give both, or none")
	}
	if c.has("ra_deg") {
		ra, err := c.number("ra_deg", 0, 360, 0)
		if err != nil {
			return nil, err
		}
		dec, err := c.number("dec_deg", -90, 90, 0)
		if err != nil {
			return nil, err
		}
		aim := &closures.Aim{Frame: closures.ICRS, Direction: geometry.FromEquator(degrees(ra), degrees(dec)), Motion: closures.Tracking}
		return c.against(v, beams, aim, over, closures.AllCodes)
	}
	// What no direction changes is found for any; lists and holds say where.
	zenith := &closures.Aim{Frame: closures.Horizon, Direction: r3.Vector{Z: 1}, Motion: closures.Fixed}
	items, err := c.against(v, beams, zenith, over, closures.Codes(0).With(closures.CodeNotCovered).With(closures.CodeDaylight))
	if err != nil {
		return nil, err
	}
	items = append(items, heldOver(v, beams, over)...)
	for i := range v.Foreseen.Lists {
		if items = listedOver(v, &v.Foreseen.Lists[i], beams, over, items); len(items) > itemsMost {
			return nil, refuse(http.StatusUnprocessableEntity, "there are more than 200000 closures in the span", "ask for a shorter span, one beam, or one direction")
		}
	}
	return items, nil
}

// against asks the checks about an aim of each beam.
func (c *call) against(v *View, beams []closures.BeamID, aim *closures.Aim, over span.Span, codes closures.Codes) ([]render.Item, error) {
	var items []render.Item
	for _, beam := range beams {
		p, err := c.prepare(v, beam, over)
		if err != nil {
			return nil, err
		}
		found, err := p.One(aim, &plan.Scratch{})
		if err != nil {
			return nil, err
		}
		for i := range found.Blocked {
			if f := &found.Blocked[i]; codes.Has(f.Code) {
				items = append(items, itemOf(beam, f))
			}
		}
	}
	return items, nil
}

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
