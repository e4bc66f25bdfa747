package listfile

import (
	"bytes"

	"beamward/closures"
)

// definition is how a region's first row described it.
type definition struct {
	line  int
	text  string // the shape columns
	track *regionText
	bad   bool // it was refused
}

// split parts a row into its fields; ok is false when it was refused.
func (c *csvReader) split(line []byte) (ok bool) {
	n, rest := 0, line
	c.spare = c.spare[:0]
	for {
		var field []byte
		more := false
		if len(rest) > 0 && rest[0] == '"' {
			if field, rest, more, ok = c.unquote(rest); !ok {
				c.d.add(c.at, "a quoted field does not end as it must", `double each quote inside a quoted field, and end it with one before the comma`)
				return false
			}
		} else if i := bytes.IndexByte(rest, ','); i >= 0 {
			field, rest, more = rest[:i], rest[i+1:], true
		} else {
			field = rest
		}
		if n < columns {
			c.field[n] = field
		}
		n++
		if !more {
			break
		}
	}
	if n != columns {
		c.d.addf(c.at, "write the 14 fields of the header row", "the row has %d fields", n)
		return false
	}
	return true
}

// unquote reads a field in quotes, in which two stand for one.
func (c *csvReader) unquote(text []byte) (field, rest []byte, more, ok bool) {
	start := len(c.spare)
	for i := 1; i < len(text); i++ {
		if text[i] != '"' {
			c.spare = append(c.spare, text[i])
			continue
		}
		if i+1 < len(text) && text[i+1] == '"' {
			c.spare = append(c.spare, '"')
			i++
			continue
		}
		field = c.spare[start:len(c.spare):len(c.spare)]
		if i+1 == len(text) {
			return field, nil, false, true
		}
		return field, text[i+2:], true, text[i+1] == ','
	}
	return nil, nil, false, false
}

func (c *csvReader) cell(col int) cell {
	if len(c.field[col]) == 0 {
		return cell{}
	}
	return cell{kind: bare, text: c.field[col], at: c.at}
}

// empty reports a fault when a column that must be empty is not.
func (c *csvReader) empty(why string, cols ...int) bool {
	for _, col := range cols {
		if len(c.field[col]) > 0 {
			c.d.addf(c.at, "leave the column empty", "%s %s has no meaning %s", headerNames[col], quoted(c.field[col]), why)
			return false
		}
	}
	return true
}

// row reads one row: what it says of its region, then its window or point. ok
// is false when it could not be told what the row is.
func (c *csvReader) row() (ok bool) {
	id, ok := c.d.name(c.cell(colRegion), c.at, "region")
	if !ok {
		return false
	}
	name := c.d.intern(id)
	for int(name) >= len(c.defined) {
		c.defined = append(c.defined, definition{})
	}
	point := string(c.field[colWindow]) == "point"
	def := &c.defined[name]
	fresh := def.line == 0
	if fresh {
		*def = definition{line: c.at.line}
		if !c.define(def, name, id, point) {
			c.d.byName[name] = named{region: badRegion, used: true}
			def.bad = true
			return false
		}
	} else if !c.repeats(def, point) {
		return false
	}
	switch string(c.field[colWindow]) {
	case "":
		if c.empty("in a row without a window", colFrom, colUntil, colRef) && !fresh {
			c.d.add(c.at, "the row says nothing that an earlier one does not", "take it out, or give it a window")
		}
	case "point":
		return c.point(def)
	default:
		w := windowText{at: c.at, region: c.cell(colRegion), from: c.cell(colFrom), until: c.cell(colUntil), ref: c.cell(colRef)}
		switch string(c.field[colWindow]) {
		case "open":
			w.open, w.state = true, true
		case "closed":
			w.state = true
		default:
			c.d.addf(c.at, "write closed, open or point", "window %s is not one", quoted(c.field[colWindow]))
			w.bad = true
		}
		c.d.window(&w)
	}
	return true
}

// shapeText appends the columns that describe the region: those of a track
// without the place of its point.
func (c *csvReader) shapeText(dst []byte, point bool) []byte {
	for col := colShape; col <= colThroughout; col++ {
		if !(point && (col == colRA || col == colDec)) {
			dst = append(dst, c.field[col]...)
		}
		dst = append(dst, ',')
	}
	return dst
}

const emptyShape = ",,,,,,,,,"

// repeats holds a later row of a region against the first.
func (c *csvReader) repeats(def *definition, point bool) bool {
	var buf [256]byte
	text := c.shapeText(buf[:0], point)
	if def.text == emptyShape && string(text) == emptyShape {
		c.undefined()
		return false
	}
	if string(text) == emptyShape || string(text) == def.text {
		return true
	}
	c.d.addf(c.at, "leave the shape columns empty, or repeat them exactly", "the row describes its region otherwise than line %d", def.line)
	return false
}

func (c *csvReader) undefined() {
	c.d.addf(c.at, "give the shape in the first row that names a region", "the region %s is not defined", quoted(c.field[colRegion]))
}

// define reads the shape columns of a region's first row.
func (c *csvReader) define(def *definition, name int32, id []byte, point bool) bool {
	def.text = string(c.shapeText(nil, point))
	if def.text == emptyShape {
		c.undefined()
		return false
	}
	r := &regionText{at: c.at, id: cell{kind: bare, text: id, at: c.at}, throughout: c.cell(colThroughout)}
	const why = "with this shape"
	box := []int{colAzFrom, colAzTo, colElFrom, colElTo}
	var ok bool
	switch shape := string(c.field[colShape]); shape {
	case "icrs":
		r.shape = closures.ICRSCone
		r.ra, r.dec, r.radius = c.cell(colRA), c.cell(colDec), c.cell(colRadius)
		ok = c.empty(why, box...)
	case "horizon", "horizon_observed":
		r.shape = closures.HorizonBox
		r.azFrom, r.azTo, r.elFrom, r.elTo = c.cell(colAzFrom), c.cell(colAzTo), c.cell(colElFrom), c.cell(colElTo)
		if shape == "horizon_observed" {
			r.observed = cell{kind: bare, text: []byte("true"), at: c.at}
		}
		ok = c.empty(why, colRA, colDec, colRadius)
	case "track":
		r.shape = closures.TrackCone
		r.radius = c.cell(colRadius)
		ok = c.empty(why, box...) && (point || c.empty("but in a row with window point", colRA, colDec))
		if ok {
			c.delay(def, name, r)
			return true
		}
	case "whole_sky":
		r.shape = closures.WholeSky
		ok = c.empty(why, colRA, colDec, colRadius) && c.empty(why, box...)
	case "":
		c.d.add(c.at, "the region has no shape", "write icrs, horizon, horizon_observed, track or whole_sky")
	default:
		c.d.addf(c.at, "write icrs, horizon, horizon_observed, track or whole_sky", "shape %s is not known", quoted(c.field[colShape]))
	}
	if ok && point {
		c.d.add(c.at, "only a track has points", "write closed or open")
		ok = false
	}
	if !ok {
		return false
	}
	c.d.region(r)
	return c.d.byName[name].region >= 0
}

// delay keeps a track until all rows with its points are read.
func (c *csvReader) delay(def *definition, name int32, r *regionText) {
	r.at.text = append([]byte(nil), c.at.text...)
	r.id, r.radius, r.throughout = r.id.own(), r.radius.own(), r.throughout.own()
	def.track = r
	c.tracks = append(c.tracks, name)
}

// point adds a point to the row's track; ok is false when the row's region is
// none, so that the row may have been meant for a window.
func (c *csvReader) point(def *definition) (ok bool) {
	if def.bad {
		return false
	}
	if def.track == nil {
		c.d.add(c.at, "only a track has points", "write closed or open")
		return false
	}
	if !c.empty("in a point", colUntil, colRef) {
		def.track.bad = true
		return true
	}
	p := pointText{at: c.at, when: c.cell(colFrom), ra: c.cell(colRA), dec: c.cell(colDec)}
	if def.track.points, ok = c.d.point(def.track.points, &p); !ok {
		def.track.bad = true
	}
	return true
}
