package render

import (
	"fmt"
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// row draws one target: its name, its bar, and how much of the span is allowed.
func (d *drawing) row(i int, r *ChartRow) {
	top := rowTop + rowHeight*float64(i)
	bar := top + markHeight
	d.raw("<g>")
	d.title(r.Name)
	if i > 0 {
		d.line("rule", 16, top, chartWidth-16, top)
	}
	d.text("name", 16, bar+12.5, "start", shortened(r.Name, 21))
	d.rect("track", plotLeft, bar, plotWidth, barHeight)

	sets := byCode(r.Blocked, d.chart.Over)
	pieces := segments(sets, d.chart.Over)
	for _, s := range r.Allowed {
		d.allowed(s, r.Placed, bar)
	}
	for i := range pieces { // over the allowed: where both meet a pixel, it is blocked
		d.segment(&pieces[i], bar)
	}
	for _, c := range sets {
		for _, s := range c.set {
			d.word(c.code, s, pieces, bar)
		}
	}
	for _, c := range sets {
		for _, s := range c.set {
			d.mark(c.code, s, bar)
		}
	}
	for _, p := range r.Placed {
		d.placed(p, bar)
	}
	total := r.Allowed.Total()
	d.text("small", chartWidth-sharesWidth+sharesGap, bar+12.5, "start", fmt.Sprintf("%.0f %%", 100*float64(total)/float64(d.chart.Over.Length())))
	d.text("small", chartWidth-16, bar+12.5, "end", lasting(r.Allowed.Longest().Length()))
	d.raw("</g>\n")
}

// allowed draws an allowed span, with how long it lasts where there is room
// beside the places in it.
func (d *drawing) allowed(s span.Span, places []Place, bar float64) {
	x0, x1 := d.x(s.From), d.x(s.Until)
	d.raw("<g>")
	d.title("allowed " + between(s) + ", " + lasting(s.Length()))
	d.rect("allowed", x0, bar, x1-x0, barHeight)
	var taken []span.Span
	for _, p := range places {
		taken = append(taken, p.Over)
	}
	free := span.Make(s).Subtract(span.Make(taken...)).Longest()
	x0, x1 = d.x(free.From), d.x(free.Until)
	if word := lasting(s.Length()); x1-x0 > 6.6*float64(len(word))+8 {
		d.text("tiny onallowed", (x0+x1)/2, bar+11.5, "middle", word)
	}
	d.raw("</g>")
}

// placed frames a place in a sequence.
func (d *drawing) placed(p Place, bar float64) {
	x0, x1 := d.x(p.Over.From), d.x(p.Over.Until)
	d.raw("<g>")
	d.title(p.Word + " " + between(p.Over))
	d.rect("placed", x0+1, bar-1, max(x1-x0-2, 1), barHeight+2)
	if x1-x0 > 6.6*float64(len(p.Word))+8 {
		d.text("tiny strong", (x0+x1)/2, bar+11.5, "middle", p.Word)
	}
	d.raw("</g>")
}

// segment draws a blocked piece: one stripe for each of its reasons, so that
// none hides another.
func (d *drawing) segment(s *segment, bar float64) {
	x0, x1 := d.x(s.over.From), d.x(s.over.Until)
	each := barHeight / float64(len(s.codes))
	d.raw("<g>")
	d.title(words(s.codes) + " " + between(s.over))
	for i, c := range s.codes {
		d.pattern(c, x0, bar+each*float64(i), max(x1-x0, 1), each)
	}
	d.raw("</g>")
}

// word names a closure once, in its longest piece that has no other reason.
func (d *drawing) word(c closures.Code, s span.Span, pieces []segment, bar float64) {
	var longest span.Span
	for i := range pieces {
		if p := &pieces[i]; len(p.codes) == 1 && p.codes[0] == c && s.Covers(p.over) && p.over.Length() > longest.Length() {
			longest = p.over
		}
	}
	x0, x1 := d.x(longest.From), d.x(longest.Until)
	word := c.String()
	size := 6.2 * float64(len(word))
	if longest.Empty() || x1-x0 < size+10 {
		return
	}
	middle := (x0 + x1) / 2
	d.rect("plate", middle-size/2-3, bar+1.5, size+6, barHeight-3)
	d.text("tiny", middle, bar+11.5, "middle", word)
}

// mark puts a reason's own shape above a closure that is too short for its
// pattern to be seen.
func (d *drawing) mark(c closures.Code, s span.Span, bar float64) {
	x0, x1 := d.x(s.From), d.x(s.Until)
	if x1-x0 > 9 {
		return
	}
	d.raw("<g>")
	d.title(c.String() + " " + between(s))
	d.shape(c, min(max((x0+x1)/2, plotLeft+4), plotLeft+plotWidth-4), bar-4)
	d.raw("</g>")
}

// codeSet is when one reason blocks.
type codeSet struct {
	code closures.Code
	set  span.Set
}

// byCode joins findings of one code.
func byCode(found []closures.Finding, over span.Span) []codeSet {
	var out []codeSet
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		var spans []span.Span
		for i := range found {
			if found[i].Code == c {
				if s := found[i].Over.Intersect(over); !s.Empty() {
					spans = append(spans, s)
				}
			}
		}
		if len(spans) > 0 {
			out = append(out, codeSet{c, span.Tidy(spans)})
		}
	}
	return out
}

// segment is a piece of time with the same reasons throughout.
type segment struct {
	over  span.Span
	codes []closures.Code
}

// segments cuts time where a reason begins or ends.
func segments(sets []codeSet, over span.Span) []segment {
	var cuts []time.Time
	for _, c := range sets {
		for _, s := range c.set {
			cuts = append(cuts, s.From, s.Until)
		}
	}
	slices.SortFunc(cuts, time.Time.Compare)
	cuts = slices.CompactFunc(cuts, time.Time.Equal)
	var out []segment
	for i := 0; i+1 < len(cuts); i++ {
		s := segment{over: span.Span{From: cuts[i], Until: cuts[i+1]}}
		for _, c := range sets {
			if c.set.Contains(cuts[i]) {
				s.codes = append(s.codes, c.code)
			}
		}
		if len(s.codes) > 0 {
			out = append(out, s)
		}
	}
	return out
}

func words(codes []closures.Code) string {
	out := ""
	for i, c := range codes {
		if i > 0 {
			out += ", "
		}
		out += c.String()
	}
	return out
}

// between writes a span for people, in universal time.
func between(s span.Span) string {
	return s.From.UTC().Format("15:04:05") + " to " + s.Until.UTC().Format("15:04:05") + " UTC"
}

// lasting writes a length for people, rounded down.
func lasting(d time.Duration) string {
	switch {
	case d <= 0:
		return "none"
	case d < time.Minute:
		return fmt.Sprintf("%d s", int(d.Seconds()))
	case d < time.Hour:
		return fmt.Sprintf("%d min", int(d.Minutes()))
	}
	return fmt.Sprintf("%d h %02d", int(d.Hours()), int(d.Minutes())%60)
}

// shortened cuts a name to a number of characters.
func shortened(s string, most int) string {
	r := []rune(s)
	if len(r) <= most {
		return s
	}
	return string(r[:most-1]) + "…"
}
