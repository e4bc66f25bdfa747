package api

import (
	"bufio"
	"encoding/json"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/service/render"
)

// planWriter writes a plan as it is made.
type planWriter struct {
	c     *call
	media string
	out   *bufio.Writer
	table *render.Table
	items []render.Item // of a calendar, which is written at its end
	count int
}

func (w *planWriter) begin(head *PlanHead) {
	w.c.w.Header().Set("Content-Type", w.media)
	w.alive()
	data, err := json.Marshal(head)
	if err != nil {
		panic(err) // it has no values that JSON cannot say
	}
	switch w.media {
	case ndjson:
		w.out.Write(append(data, '\n'))
	case csvType:
		w.out.WriteString("# " + render.Notice + "\n")
		w.table = render.NewTable(w.out)
		_ = w.table.Header()
	case jsonType:
		w.out.Write(append(data[:len(data)-1], `,"targets":[`...))
	}
}

// alive gives the client another while to take what follows.
func (w *planWriter) alive() { w.c.longer(w.c.api.limits.Stall) }

func (w *planWriter) target(t *plan.Target, p *planned) error {
	if w.count++; w.count%64 == 0 {
		w.alive()
		if err := w.c.r.Context().Err(); err != nil {
			return err
		}
	}
	if w.media == csvType || w.media == calendar {
		return w.rows(t.Name, p)
	}
	data, err := json.Marshal(targetOf(t.Name, p))
	if err != nil {
		return err
	}
	if w.media == ndjson {
		data = append(data, '\n')
	} else if w.count > 1 {
		w.out.WriteByte(',')
	}
	_, err = w.out.Write(data)
	return err
}

func (w *planWriter) rows(name string, p *planned) error {
	items := make([]render.Item, 0, len(p.Spans)+len(p.Blocked))
	if p.err == nil {
		for _, s := range p.Spans {
			items = append(items, render.Item{Beam: w.c.query.Get("beam"), Target: name, Open: true, Span: s})
		}
		for i := range p.Blocked {
			it := itemOf(closures.BeamID(w.c.query.Get("beam")), &p.Blocked[i])
			it.Target = name
			items = append(items, it)
		}
		render.Sort(items)
	}
	if w.media == calendar {
		w.items = append(w.items, items...)
		return nil
	}
	for i := range items {
		if err := w.table.Row(&items[i]); err != nil {
			return err
		}
	}
	return nil
}

func (w *planWriter) end(n int) error {
	w.alive()
	switch w.media {
	case ndjson:
		data, err := json.Marshal(struct {
			Done    bool `json:"done"`
			Targets int  `json:"targets"`
		}{true, n})
		if err != nil {
			return err
		}
		w.out.Write(append(data, '\n'))
	case csvType:
		if err := w.table.Flush(); err != nil {
			return err
		}
	case calendar:
		v, _ := w.c.view()
		cal := render.Calendar{Name: v.Rules.Site.Name, At: w.c.wall()}
		if err := cal.Write(w.out, w.items); err != nil {
			return err
		}
	default:
		w.out.WriteString("]}")
	}
	return w.out.Flush()
}
