package api

import (
	"fmt"
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// changeDoc is what a list changes against those that it replaces, region by
// region, for people to look at. It is no proof: which class a list has is
// told by the core alone, which also minds how regions lie to each other.
type changeDoc struct {
	Replaced    []closures.ListID `json:"replaced" doc:"lists in force that it would put out of force"`
	CoverAdded  []spanDoc         `json:"coverage_added" doc:"time for which the authority has no other list in force"`
	CoverLost   []spanDoc         `json:"coverage_lost"`
	OpenedS     float64           `json:"opened_s" doc:"of all regions, each on its own"`
	ClosedS     float64           `json:"closed_s"`
	Opened      []regionSpan      `json:"opened" doc:"time that is open in it and closed in what it replaces; the first 200"`
	Closed      []regionSpan      `json:"closed" doc:"time that is closed in it and not in what it replaces; the first 200"`
	UnlistedWas string            `json:"unlisted_sky_was" doc:"open or closed in what it replaces; empty where it replaces nothing"`
}

type regionSpan struct {
	Region string    `json:"region"`
	From   time.Time `json:"from"`
	Until  time.Time `json:"until"`
}

const changesShown = 200

// changeOf compares a list with what it replaces.
func changeOf(v *View, l *closures.List) changeDoc {
	out := changeDoc{Replaced: []closures.ListID{}, Opened: []regionSpan{}, Closed: []regionSpan{}}
	t := l.Text()
	was := map[string]span.Set{} // closed time of each region of what is replaced, by shape and id
	names := map[string]string{}
	var covered, kept []span.Span
	for i := range v.Book {
		e := &v.Book[i]
		if e.Status != closures.ListInForce || e.List.Authority() != t.Authority || e.List.ID() == t.ID {
			continue
		}
		old := e.List.Text()
		if !slices.Contains(t.Replaces, old.ID) {
			kept = append(kept, old.Covers)
			continue
		}
		out.Replaced = append(out.Replaced, old.ID)
		covered = append(covered, old.Covers)
		out.UnlistedWas = unlistedWord(old.UnlistedOpen && out.UnlistedWas != "closed")
		closed := closedTimes(old)
		for r := range old.Regions {
			key := regionKey(&old.Regions[r])
			was[key], names[key] = was[key].Union(closed[r]), old.Regions[r].ID
		}
	}
	now := []span.Span{t.Covers}
	out.CoverAdded = spansOf(span.Make(now...).Subtract(span.Make(covered...)).Subtract(span.Make(kept...)))
	out.CoverLost = spansOf(span.Make(covered...).Subtract(span.Make(now...)).Subtract(span.Make(kept...)))
	closed := closedTimes(t)
	for r := range t.Regions {
		key := regionKey(&t.Regions[r])
		out.add(t.Regions[r].ID, closed[r], was[key])
		delete(was, key)
	}
	gone := make([]string, 0, len(was))
	for key := range was {
		gone = append(gone, key)
	}
	slices.Sort(gone)
	for _, key := range gone {
		out.add(names[key], nil, was[key])
	}
	return out
}

func (d *changeDoc) add(region string, now, was span.Set) {
	list := func(into []regionSpan, total *float64, set span.Set) []regionSpan {
		*total += set.Total().Seconds()
		for _, s := range set {
			if len(into) == changesShown {
				break
			}
			into = append(into, regionSpan{region, s.From.UTC(), s.Until.UTC()})
		}
		return into
	}
	d.Opened = list(d.Opened, &d.OpenedS, was.Subtract(now))
	d.Closed = list(d.Closed, &d.ClosedS, now.Subtract(was))
}

func unlistedWord(open bool) string {
	if open {
		return "open"
	}
	return "closed"
}

// regionKey tells regions of the same shape and place apart from others. Angles
// are kept to 1e-12 degree by the readers, so the same text gives the same key.
func regionKey(r *closures.Region) string {
	k := *r
	k.Line, k.Throughout = 0, 0
	return fmtRegion(&k)
}

// closedTimes returns when each region of a list is closed by its own windows,
// within the coverage and before any lead or tail.
func closedTimes(t *closures.ListText) []span.Set {
	closed, open := make([][]span.Span, len(t.Regions)), make([][]span.Span, len(t.Regions))
	for i := range t.Windows {
		w := &t.Windows[i]
		if w.Open {
			open[w.Region] = append(open[w.Region], w.Span())
		} else {
			closed[w.Region] = append(closed[w.Region], w.Span())
		}
	}
	out := make([]span.Set, len(t.Regions))
	for i := range t.Regions {
		switch {
		case t.Regions[i].Throughout == closures.ThroughoutOpen:
		case t.Regions[i].Throughout == closures.ThroughoutClosed:
			out[i] = span.Make(t.Covers)
		case len(open[i]) > 0 || len(closed[i]) == 0:
			out[i] = span.Make(open[i]...).Complement(t.Covers).Union(span.Make(closed[i]...)).Within(t.Covers)
		default:
			out[i] = span.Make(closed[i]...).Within(t.Covers)
		}
	}
	return out
}

func fmtRegion(r *closures.Region) string { return fmt.Sprintf("%+v", *r) }
