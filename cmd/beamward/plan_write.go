package main

import (
	"encoding/json"
	"fmt"
	"strings"
	"time"

	"beamward/geometry/span"
	"beamward/service/client"
	"beamward/service/render"
)

// planWriter writes a plan target by target. Errors of writing are the
// console's to keep.
type planWriter interface {
	begin(head *client.Plan)
	target(t *client.Target)
	end() error
}

func planWriterFor(out *console, format, site string) planWriter {
	switch format {
	case "json":
		return &planJSON{out: out}
	case "csv":
		return &planCSV{out: out, table: render.NewTable(out)}
	case "ics":
		return &planCalendar{out: out, site: site}
	}
	return &planTable{out: out}
}

// planTable is for reading: every span to the second, what is allowed rounded
// inward and what closes outward.
type planTable struct {
	out      *console
	beam     string
	rows     [][]string
	cautions []string
	left     []string
}

func (w *planTable) begin(head *client.Plan) {
	w.beam, w.left = string(head.Beam), head.LeftOut
	w.out.printf("plan for beam %s from %s to %s, %s\n", head.Beam, clockTime(head.From), clockTime(head.Until), head.Notice)
	w.out.printf("rules %s\nlists %s\n\n", head.RulesDigest, head.ListsDigest)
	w.rows = [][]string{{"TARGET", "STATE", "FROM", "UNTIL", "LENGTH", "WHY"}}
}

func (w *planTable) target(t *client.Target) {
	if t.Error != "" {
		w.rows = append(w.rows, []string{printable(t.Name), "closed", "", "", "", t.Error})
	}
	for _, it := range itemsOf(w.beam, t) {
		from, until, ok := wholeSeconds(&it)
		if !ok {
			continue
		}
		state, why := "closed", strings.Join(nonEmpty(it.Code, it.Source, it.List, it.Region, it.Ref), " ")
		if it.Open {
			state, why = "open", tooShort(t, &it)
		}
		w.rows = append(w.rows, []string{printable(t.Name), state, clockTime(from), clockTime(until), until.Sub(from).String(), printable(why)})
	}
	for _, c := range t.Cautions {
		line := fmt.Sprintf("%s: %s: %s", c.Code, c.Source, c.Detail)
		known := false
		for _, o := range w.cautions {
			known = known || o == line
		}
		if !known {
			w.cautions = append(w.cautions, line)
		}
	}
}

func (w *planTable) end() error {
	if err := w.out.table(w.rows); err != nil {
		return err
	}
	w.out.printf("\n")
	for _, c := range w.cautions {
		w.out.printf("Caution: %s\n", c)
	}
	w.out.printf("Left out, since no plan can foresee it: %s\n", strings.Join(w.left, ", "))
	return nil
}

// tooShort says so where nothing of an allowed span serves the target.
func tooShort(t *client.Target, it *render.Item) string {
	for _, s := range t.Usable {
		if s.From.Before(it.Span.Until) && it.Span.From.Before(s.Until) {
			return ""
		}
	}
	return "too short for the target"
}

// wholeSeconds rounds a span: a closure outward, an allowed one inward.
func wholeSeconds(it *render.Item) (from, until time.Time, ok bool) {
	from, until = it.Span.From.UTC().Truncate(time.Second), it.Span.Until.UTC().Truncate(time.Second)
	if it.Open && from.Before(it.Span.From) {
		from = from.Add(time.Second)
	}
	if !it.Open && until.Before(it.Span.Until) {
		until = until.Add(time.Second)
	}
	return from, until, from.Before(until)
}

func nonEmpty(words ...string) []string {
	var out []string
	for _, w := range words {
		if w != "" {
			out = append(out, w)
		}
	}
	return out
}

// planJSON writes one document as it comes.
type planJSON struct {
	out  *console
	many bool
}

func (w *planJSON) begin(head *client.Plan) {
	b, _ := json.Marshal(head) // it has no values that JSON cannot say
	w.out.printf("%s,\"targets\":[", b[:len(b)-1])
}

func (w *planJSON) target(t *client.Target) {
	b, _ := json.Marshal(t)
	if w.many {
		w.out.printf(",")
	}
	w.many = true
	w.out.printf("\n%s", b)
}

func (w *planJSON) end() error {
	w.out.printf("]}\n")
	return nil
}

// planCSV and planCalendar are for other programs.
type planCSV struct {
	out   *console
	table *render.Table
	beam  string
	err   error
}

func (w *planCSV) begin(head *client.Plan) {
	w.beam = string(head.Beam)
	w.out.printf("# %s\n", render.Notice)
	w.err = w.table.Header()
}

func (w *planCSV) target(t *client.Target) {
	for _, it := range itemsOf(w.beam, t) {
		if w.err == nil {
			w.err = w.table.Row(&it)
		}
	}
}

func (w *planCSV) end() error {
	if w.err != nil {
		return w.err
	}
	return w.table.Flush()
}

type planCalendar struct {
	out   *console
	site  string
	beam  string
	items []render.Item
}

func (w *planCalendar) begin(head *client.Plan) { w.beam = string(head.Beam) }

func (w *planCalendar) target(t *client.Target) { w.items = append(w.items, itemsOf(w.beam, t)...) }

func (w *planCalendar) end() error {
	c := render.Calendar{Name: w.site, At: time.Now().UTC()}
	return c.Write(w.out, w.items)
}

// itemsOf returns a target's spans, allowed and closed, in order of time.
func itemsOf(beam string, t *client.Target) []render.Item {
	var items []render.Item
	for _, s := range t.Allowed {
		items = append(items, render.Item{Beam: beam, Target: t.Name, Open: true, Span: span.Span{From: s.From, Until: s.Until}})
	}
	for _, c := range t.Blocked {
		it := render.Item{Beam: beam, Target: t.Name, Code: c.Code, Source: c.Source, List: c.List, Region: c.Region, Ref: c.Ref, Detail: c.Detail}
		if c.From != nil {
			it.Span.From = *c.From
		}
		if c.Until != nil {
			it.Span.Until = *c.Until
		}
		items = append(items, it)
	}
	render.Sort(items)
	return items
}
