package api

import (
	"net/http"
	"runtime"
	"sync"
	"time"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/closures/wire"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/render"
)

// closureDoc is one closure that can be foreseen: when the beam is to be
// shuttered, begun earlier by the margin time and widened by the clock's error.
type closureDoc struct {
	Beam   string     `json:"beam,omitempty" doc:"absent: every beam"`
	Code   string     `json:"code"`
	Source string     `json:"source"`
	From   *time.Time `json:"from"`
	Until  *time.Time `json:"until" doc:"null: no end in sight"`
	List   string     `json:"list,omitempty"`
	Region string     `json:"region,omitempty"`
	Ref    string     `json:"ref,omitempty"`
	Detail string     `json:"detail"`
}

// itemOf makes a line of a table of a finding.
func itemOf(beam closures.BeamID, f *closures.Finding) render.Item {
	return render.Item{Beam: string(beam), Code: f.Code.String(), Source: string(f.Source), List: string(f.List), Region: f.Region, Ref: f.Ref, Detail: f.Detail, Span: f.Over}
}

func closureOf(it *render.Item) closureDoc {
	return closureDoc{
		Beam: it.Beam, Code: it.Code, Source: it.Source, From: wire.Instant(it.Span.From), Until: wire.Instant(it.Span.Until), List: it.List, Region: it.Region, Ref: it.Ref, Detail: it.Detail,
	}
}

// prepare makes a planner for a beam over a span. Its nights are made anew but
// for those that the view has.
func (c *call) prepare(v *View, beam closures.BeamID, over span.Span) (*plan.Planner, error) {
	if v.Foreseen == nil {
		return nil, refuse(http.StatusServiceUnavailable, "nothing is known yet", "try again in a moment").after(time.Second)
	}
	if over.Empty() || over.Length() > plan.MaxLength {
		// Before the nights are made, which takes its time.
		return nil, badQuery("until", "the span is empty or too long", "give until after from, at most 14 days")
	}
	nights, err := c.api.nights(v.Rules, over)
	if err != nil {
		return nil, err
	}
	return plan.Prepare(v.Foreseen, beam, over, nights)
}

func (a *API) nights(r *closures.Rules, over span.Span) ([]*sky.Night, error) {
	if a.options.Nights != nil {
		return a.options.Nights(r, over)
	}
	return plan.Nights(r, over)
}

// over reads from and until; by default from now for so long.
func (c *call) over(length time.Duration) (span.Span, error) {
	from, err := c.instant("from", c.wall().UTC())
	if err != nil {
		return span.Span{}, err
	}
	until, err := c.instant("until", from.Add(length))
	if err != nil {
		return span.Span{}, err
	}
	if s := (span.Span{From: from, Until: until}); !s.Empty() && s.Length() <= plan.MaxLength {
		return s, nil
	}
	return span.Span{}, badQuery("until", "the span is empty or too long", "give until after from, at most 14 days")
}

// planned is what one target can have, or why it was not planned.
type planned struct {
	plan.Planned
	err error
}

// each plans the targets a batch at a time, on as many processors as there
// are, and gives them in order.
func each(p *plan.Planner, targets []plan.Target, take func(i int, out *planned) error) error {
	const batch = 256
	workers := runtime.GOMAXPROCS(0)
	scratch := make([]plan.Scratch, workers)
	out := make([]planned, batch)
	for from := 0; from < len(targets); from += batch {
		part := targets[from:min(from+batch, len(targets))]
		var wait sync.WaitGroup
		for w := range workers {
			wait.Go(func() {
				for i := w; i < len(part); i += workers {
					out[i].Planned, out[i].err = p.Target(&part[i], &scratch[w])
				}
			})
		}
		wait.Wait()
		for i := range part {
			if err := take(from+i, &out[i]); err != nil {
				return err
			}
		}
	}
	return nil
}
