package api

import (
	"bytes"
	"fmt"
	"net/http"
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
