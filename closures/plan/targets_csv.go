package plan

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"beamward/closures/wire"
)

// csvTable reads the rows of a CSV table.
type csvTable struct {
	*table
	columns []column
	blank   int  // lines before the header
	open    *row // the ephemeris that is being read
}

// readCSV reads what follows a number of blank lines.
func readCSV(in io.Reader, rest *io.LimitedReader, blank int) ([]Target, error) {
	c := csv.NewReader(in)
	c.FieldsPerRecord = -1
	c.ReuseRecord = true
	t := &csvTable{table: newTable(), blank: blank}
	if err := t.header(c); err != nil {
		return nil, err
	}
	for t.bad.Total <= 10*maxRows {
		rec, err := c.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if p := (*csv.ParseError)(nil); errors.As(err, &p) {
			t.bad.add(blank+p.StartLine, "", "the line is no CSV", "quote names that hold commas or quotes, and double the quotes within")
			continue
		} else if err != nil {
			return nil, fmt.Errorf("targets: %w", err)
		}
		line, _ := c.FieldPos(0)
		t.read(blank+line, rec)
	}
	if rest.N <= 0 {
		return nil, tooLong()
	}
	t.close()
	return t.finish()
}

// header learns which column is which.
func (t *csvTable) header(c *csv.Reader) error {
	rec, err := c.Read()
	line := t.blank + 1
	if err != nil {
		return refusal(line, "the header row cannot be read", "start with name,ra_deg,dec_deg")
	}
	known := strings.Join(columnNames[:], ",")
	for i, name := range rec {
		at := slices.Index(columnNames[:], name)
		if at < 0 || slices.Contains(t.columns, column(at)) {
			t.bad.add(line, strings.Join(rec, ","), fmt.Sprintf("column %d is unknown or named twice", i+1), "separate columns by commas and use "+known)
			continue
		}
		t.columns = append(t.columns, column(at))
	}
	has := func(c column) bool { return slices.Contains(t.columns, c) }
	if t.bad.Total == 0 && !(has(cName) && (has(cRA) && has(cDec) || has(cAz) && has(cEl))) {
		t.bad.add(line, strings.Join(rec, ","), "a column is missing", "give name, and ra_deg and dec_deg or az_deg and el_deg")
	}
	if t.bad.Total > 0 {
		return &t.bad
	}
	return nil
}

// read takes in one row.
func (t *csvTable) read(line int, rec []string) {
	r := &row{line: line, text: strings.Join(rec, ","), bad: &t.bad}
	if len(rec) != len(t.columns) {
		r.refuse(fmt.Sprintf("the line has %d cells, not %d", len(rec), len(t.columns)), "give every column, empty where not said")
		return
	}
	for i, cell := range rec {
		r.cell(t.columns[i], cell)
	}
	if t.open != nil && !(r.said[cPointAt] && r.name == t.open.name) {
		t.close()
	}
	if !r.said[cPointAt] {
		if o := r.target(); !r.refused {
			t.keep(r, o)
		}
		return
	}
	t.point(r)
}

// cell takes in one cell; an empty one is not said.
func (r *row) cell(c column, s string) {
	switch {
	case c == cName:
		r.name = strings.Clone(s)
	case s == "":
	case c < numNumbers:
		v, err := wire.ParseNumber(s)
		if err != nil {
			r.refuse(columnNames[c]+" is not a number", "write a plain decimal number")
			return
		}
		r.set(c, v)
	case c == cRefracted:
		r.setRefracted(s)
	default:
		r.setTime(c, s)
	}
}

// point takes in a row of an ephemeris: its first opens it.
func (t *csvTable) point(r *row) {
	switch {
	case !r.said[cRA] || !r.said[cDec]:
		r.refuse("a point needs ra_deg and dec_deg", "give both")
	case t.open != nil && r.any(cLength, cPriority, cMinSpan, cReacquire):
		r.refuse("a later point says more than its place", "say the rest on the target's first row")
	case r.any(cPMRA, cPMDec, cRateRA, cRateDec, cRateAt, cAz, cEl, cRefracted):
		r.refuse("a point has a motion or a direction besides", "give point_at, ra_deg and dec_deg")
	}
	if t.open == nil {
		t.open = r
	}
	if !r.refused {
		t.open.point(r, r.pointAt, r.number[cRA], r.number[cDec])
	}
	t.open.refused = t.open.refused || r.refused
}

// close ends the ephemeris that is being read.
func (t *csvTable) close() {
	o := t.open
	if o == nil {
		return
	}
	t.open = nil
	o.said[cRA], o.said[cDec] = false, false // of the first point
	if o.refused {
		t.names[o.name] = o.line
		return
	}
	if len(o.points) < 2 {
		o.refuse("the ephemeris has one point", "give two points or more, on rows that follow one another")
		return
	}
	if target := o.target(); !o.refused {
		t.keep(o, target)
	}
}
