package render

import (
	"fmt"
	"io"
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// Chart is a plan to be drawn: what each target can have over a night.
type Chart struct {
	Title string
	Over  span.Span
	Zone  *time.Location // of the lower axis; nil: there is none
	Sun   []Band         // in order of time
	Rows  []ChartRow
	Notes []string // below it: cautions, what was left out
}

// Band is a span of the night with its word, drawn behind the rows.
type Band struct {
	Over span.Span
	Word string
	Dark int // 0 day to 4 night
}

// ChartRow is one target.
type ChartRow struct {
	Name    string
	Allowed span.Set
	Blocked []closures.Finding
	Placed  []Place // its places in a sequence
}

// Place is a span that a target is given, with a short word such as its number
// in the order.
type Place struct {
	Over span.Span
	Word string
}

// MaxChartRows is how many targets one chart shows; it says how many more there
// are.
const MaxChartRows = 400

// The measures of a chart, in px.
const (
	chartWidth  = 1280.0
	namesWidth  = 190.0
	sharesWidth = 158.0
	plotLeft    = namesWidth
	plotWidth   = chartWidth - namesWidth - sharesWidth
	headHeight  = 92.0
	markHeight  = 8.0
	barHeight   = 16.0
	rowHeight   = markHeight + barHeight + 6
	rowTop      = headHeight
	sharesGap   = 30.0 // half an hour's label reaches into it
)

// SVG draws the chart as one standalone SVG. What it shows is inward for what is
// allowed and outward for what is blocked, as the plan is. It keeps to the
// light or dark that the viewer asks for, and prints light.
func (c *Chart) SVG(w io.Writer) error {
	if c.Over.Empty() {
		return fmt.Errorf("drawing the chart: the span is empty")
	}
	rows := c.Rows[:min(len(c.Rows), MaxChartRows)]
	notes := append([]string{Notice + "; times are cut inward for what is allowed and outward for what is blocked"}, c.Notes...)
	if more := len(c.Rows) - len(rows); more > 0 {
		notes = slices.Insert(notes, 0, fmt.Sprintf("and %d more targets, which are not drawn", more))
	}
	d := &drawing{chart: c, rows: rows, plotHeight: max(rowHeight*float64(len(rows)), 40)}
	reasons := d.reasons()
	foot := d.footHeight(reasons, notes)
	height := rowTop + d.plotHeight + foot

	d.open(height)
	d.head()
	d.bands()
	d.hours()
	for i := range rows {
		d.row(i, &rows[i])
	}
	d.foot(reasons, notes)
	d.raw("</svg>\n")
	_, err := w.Write(d.out.Bytes())
	return err
}

// x is where an instant lies, cut to the plot.
func (d *drawing) x(at time.Time) float64 {
	f := float64(at.Sub(d.chart.Over.From)) / float64(d.chart.Over.Length())
	return plotLeft + plotWidth*min(1, max(0, f))
}

// head writes the title and the axis of universal time.
func (d *drawing) head() {
	d.text("title", 16, 26, "start", d.chart.Title)
	from, until := d.chart.Over.From.UTC(), d.chart.Over.Until.UTC()
	d.text("small", chartWidth-16, 26, "end", from.Format("2006-01-02 15:04")+" to "+until.Format("2006-01-02 15:04")+" UTC")
	d.text("small strong", 16, headHeight-9, "start", "target")
	d.text("small strong", chartWidth-sharesWidth+sharesGap, headHeight-9, "start", "allowed")
	d.text("small strong", chartWidth-16, headHeight-9, "end", "longest")
}

// bands draws the Sun's bands behind the rows, each with its word above.
func (d *drawing) bands() {
	top, bottom := rowTop, rowTop+d.plotHeight
	d.rect("plot", plotLeft, top, plotWidth, d.plotHeight)
	const strip = 15.0
	for i, b := range d.chart.Sun {
		x0, x1 := d.x(b.Over.From), d.x(b.Over.Until)
		if x1 <= x0 {
			continue
		}
		dark := min(4, max(0, b.Dark))
		d.rect(fmt.Sprint("sun", dark), x0, top, x1-x0, d.plotHeight)
		d.rect(fmt.Sprint("sun", dark, " edge"), x0, 42, x1-x0, strip)
		word := b.Word
		if x1-x0 < 6.2*float64(len(word))+6 {
			word = d.letter(word) // the legend has the whole
		}
		if x1-x0 > 8 {
			d.text("tiny", (x0+x1)/2, 42+11, "middle", word)
		}
		if i > 0 && x0 > plotLeft {
			d.line("dusk", x0, 42, x0, bottom)
		}
	}
	if len(d.chart.Sun) > 0 {
		d.text("small strong", 16, 42+11, "start", "Sun")
	}
}

// hours draws both axes and a line for every step.
func (d *drawing) hours() {
	top, bottom := rowTop, rowTop+d.plotHeight
	step := d.step()
	last := plotLeft - 100.0
	for at := d.chart.Over.From.Truncate(step); !at.After(d.chart.Over.Until); at = at.Add(step) {
		if at.Before(d.chart.Over.From) {
			continue
		}
		x := d.x(at)
		d.line("hour", x, top-4, x, bottom+4)
		if x-last < 44 {
			continue
		}
		last = x
		d.text("small", x, top-9, "middle", clock(at.UTC(), step))
		if d.chart.Zone != nil {
			d.text("small", x, bottom+16, "middle", clock(at.In(d.chart.Zone), step))
		}
	}
	d.text("tiny", plotLeft-26, top-9, "end", "UTC")
	if d.chart.Zone != nil {
		d.text("tiny", plotLeft-26, bottom+16, "end", d.chart.Zone.String())
	}
}

func clock(at time.Time, step time.Duration) string {
	if step >= 24*time.Hour {
		return at.Format("01-02")
	}
	return at.Format("15:04")
}

// step is the time between two lines: 6 to 16 of them.
func (d *drawing) step() time.Duration {
	for _, s := range []time.Duration{time.Minute, 5 * time.Minute, 10 * time.Minute, 15 * time.Minute, 30 * time.Minute, time.Hour, 2 * time.Hour, 3 * time.Hour, 6 * time.Hour, 12 * time.Hour} {
		if d.chart.Over.Length() <= 16*s {
			return s
		}
	}
	return 24 * time.Hour
}
