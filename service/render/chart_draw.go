package render

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"strconv"

	"beamward/closures"
)

// drawing gathers the SVG of one chart.
type drawing struct {
	chart      *Chart
	rows       []ChartRow
	plotHeight float64
	out        bytes.Buffer
}

func (d *drawing) raw(s string) { d.out.WriteString(s) }

// escape writes input as text on one line.
func (d *drawing) escape(s string) { xml.EscapeText(&d.out, []byte(plain(s))) }

// open begins the document, with the style that it needs.
func (d *drawing) open(height float64) {
	fmt.Fprintf(&d.out, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %.0f %.0f" width="%.0f" height="%.0f" role="img" font-family="system-ui, 'DejaVu Sans', sans-serif">`, chartWidth, height, chartWidth, height)
	d.raw("\n")
	d.title(d.chart.Title)
	d.raw("<style>" + chartStyle + "</style>\n")
	d.rect("page", 0, 0, chartWidth, height)
}

func (d *drawing) title(s string) {
	d.raw("<title>")
	d.escape(s)
	d.raw("</title>")
}

func (d *drawing) rect(class string, x, y, w, h float64) {
	d.raw(`<rect class="` + class + `" x="` + num(x) + `" y="` + num(y) + `" width="` + num(w) + `" height="` + num(h) + `"` + attributes(class) + "/>")
}

func (d *drawing) line(class string, x0, y0, x1, y1 float64) {
	d.raw(`<line class="` + class + `" x1="` + num(x0) + `" y1="` + num(y0) + `" x2="` + num(x1) + `" y2="` + num(y1) + `"` + attributes(class) + "/>")
}

func (d *drawing) text(class string, x, y float64, anchor, s string) {
	d.raw(`<text class="` + class + `" x="` + num(x) + `" y="` + num(y) + `" text-anchor="` + anchor + `"` + attributes(class) + ">")
	d.escape(s)
	d.raw("</text>")
}

// shape draws a reason's own mark about a point.
func (d *drawing) shape(c closures.Code, x, y float64) {
	p := func(dx, dy float64) string { return num(x+dx) + " " + num(y+dy) }
	path := "M" + p(-3, -3) + "L" + p(3, -3) + "L" + p(3, 3) + "L" + p(-3, 3) + "Z" // a square
	switch c {
	case closures.CodeListedClosure: // points down
		path = "M" + p(-3.4, -3) + "L" + p(3.4, -3) + "L" + p(0, 3.4) + "Z"
	case closures.CodeFieldCrossing: // a cross
		path = "M" + p(-3, -3) + "L" + p(3, 3) + "M" + p(3, -3) + "L" + p(-3, 3)
	case closures.CodeElevationLimit: // points up
		path = "M" + p(-3.4, 3) + "L" + p(3.4, 3) + "L" + p(0, -3.4) + "Z"
	case closures.CodeNotCovered: // an open square
		path = "M" + p(-3, -3) + "L" + p(3, -3) + "L" + p(3, 3) + "L" + p(-3, 3) + "Z"
	case closures.CodeDaylight: // a diamond
		path = "M" + p(0, -3.6) + "L" + p(3.6, 0) + "L" + p(0, 3.6) + "L" + p(-3.6, 0) + "Z"
	}
	class := "mark mark-" + classOf(c)
	d.raw(`<path class="` + class + `" d="` + path + `"` + attributes(class) + "/>")
}

// num writes a coordinate to a hundredth of a pixel.
func num(v float64) string {
	s := strconv.FormatFloat(v, 'f', 2, 64)
	for s[len(s)-1] == '0' {
		s = s[:len(s)-1]
	}
	if s[len(s)-1] == '.' {
		s = s[:len(s)-1]
	}
	return s
}
