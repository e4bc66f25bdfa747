package render

import (
	"math"
	"strings"

	"beamward/closures"
)

// pattern fills a rectangle with a reason's pattern, told apart without colour:
// crossed lines, dots, falling lines, upright bars, rising lines, level lines, a
// grid. The lines are drawn one by one rather than as an SVG pattern, which
// printers turn into a picture each and which some viewers leave out. They lie
// on one grid for the whole chart, so that neighbouring pieces join.
func (d *drawing) pattern(c closures.Code, x, y, w, h float64) {
	class := classOf(c)
	if w < 3 { // too narrow for any: the colour of its lines
		d.raw(`<path class="l-` + class + `" d="M` + num(x+w/2) + " " + num(y) + "V" + num(y+h) + `"` + attributes("l-"+class) + "/>")
		return
	}
	d.rect("b-"+class, x, y, w, h)
	p := strokes{x0: x, y0: y, x1: x + w, y1: y + h}
	switch c {
	case closures.CodeListedClosure:
		p.slanting(6, 1)
		p.slanting(6, -1)
	case closures.CodeNotCovered:
		p.dots(6)
	case closures.CodeFieldCrossing:
		p.slanting(8, -1)
	case closures.CodeHold:
		p.upright(5)
	case closures.CodeElevationLimit:
		p.slanting(11, 1)
	case closures.CodeDaylight:
		p.level(5)
	default:
		p.upright(7)
		p.level(7)
	}
	d.raw(`<path class="l-` + class + `" d="` + p.path.String() + `"` + attributes("l-"+class) + "/>")
}

// strokes gathers lines cut to a rectangle.
type strokes struct {
	x0, y0, x1, y1 float64
	path           strings.Builder
}

func (s *strokes) line(x0, y0, x1, y1 float64) {
	s.path.WriteString("M" + num(x0) + " " + num(y0) + "L" + num(x1) + " " + num(y1))
}

// slanting adds the lines x + slope y = k step: rising to the right for 1,
// falling for -1.
func (s *strokes) slanting(step, slope float64) {
	top, bottom := slope*s.y0, slope*s.y1
	low, high := s.x0+min(top, bottom), s.x1+max(top, bottom)
	for k := math.Ceil(low / step); k*step < high; k++ {
		c := k * step
		xa, xb := c-top, c-bottom // where it meets the upper and the lower edge
		ya, yb := s.y0, s.y1
		cut := func(x, y float64) (float64, float64) {
			if at := min(max(x, s.x0), s.x1); at != x {
				return at, (c - at) / slope
			}
			return x, y
		}
		xa, ya = cut(xa, ya)
		xb, yb = cut(xb, yb)
		if math.Abs(xa-xb) > 0.2 {
			s.line(xa, ya, xb, yb)
		}
	}
}

func (s *strokes) upright(step float64) {
	for x := math.Ceil((s.x0+1)/step) * step; x <= s.x1-1; x += step {
		s.line(x, s.y0, x, s.y1)
	}
}

// level adds lines at even distances, at least one.
func (s *strokes) level(step float64) {
	n := max(1, math.Round((s.y1-s.y0)/step))
	for i := range int(n) {
		y := s.y0 + (s.y1-s.y0)*(float64(i)+0.5)/n
		s.line(s.x0, y, s.x1, y)
	}
}

// dots adds points in rows at even distances, at least one row.
func (s *strokes) dots(step float64) {
	n := max(1, math.Round((s.y1-s.y0)/step))
	for i := range int(n) {
		y := s.y0 + (s.y1-s.y0)*(float64(i)+0.5)/n
		for x := math.Ceil((s.x0+1.2)/step) * step; x <= s.x1-1.2; x += step {
			s.path.WriteString("M" + num(x) + " " + num(y) + "h0")
		}
	}
}
