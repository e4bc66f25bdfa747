package plan

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
)

// Target is one line of a table of targets.
type Target struct {
	Name     string
	Aim      *closures.Aim
	Length   time.Duration // how long it wants the beam; zero: not said
	Priority float64       // higher goes first; zero: not said
}

// Bounds of a table.
const (
	MaxTargets = 200_000
	maxName    = 128
)

// RowError is one line of a table that cannot be used.
type RowError struct {
	Line  int
	Text  string
	Cause string
	Mend  string
}

// Refusal is every such line; a table with one is refused whole.
type Refusal struct {
	Rows  []RowError
	Total int
}

// Error names the first line and how many there are.
func (r *Refusal) Error() string {
	if len(r.Rows) == 0 {
		return "targets: refused"
	}
	f := r.Rows[0]
	return fmt.Sprintf("targets: line %d: %s (%s); %d bad in all", f.Line, f.Cause, f.Mend, r.Total)
}

const maxRows = 1000 // bad lines kept in detail

func (r *Refusal) add(line int, text, cause, mend string) {
	r.Total++
	if len(r.Rows) < maxRows {
		if len(text) > 80 {
			text = text[:80]
		}
		r.Rows = append(r.Rows, RowError{Line: line, Text: strings.ToValidUTF8(text, "?"), Cause: cause, Mend: mend})
	}
}

// columns of a table, the first three required.
var columns = [...]string{"name", "ra_deg", "dec_deg", "pm_ra_mas_yr", "pm_dec_mas_yr", "length_s", "priority"}

// ReadTargets reads a table of targets: CSV with the columns
// name,ra_deg,dec_deg[,pm_ra_mas_yr,pm_dec_mas_yr,length_s,priority] under a
// header row, or a JSON array of objects with these members. Positions are ICRS
// at J2000.0; pm_ra_mas_yr is the change of right ascension times the cosine of
// the declination. A table with one bad line is refused whole; the error is
// then a *Refusal.
func ReadTargets(r io.Reader) ([]Target, error) {
	in := bufio.NewReader(r)
	for {
		c, err := in.Peek(1)
		if err != nil {
			return nil, &Refusal{Rows: []RowError{{Line: 1, Cause: "the table is empty", Mend: "give a header row and targets"}}, Total: 1}
		}
		if c[0] == '[' {
			return readJSON(in)
		}
		if c[0] != ' ' && c[0] != '\n' && c[0] != '\r' && c[0] != '\t' {
			return readCSV(in)
		}
		in.ReadByte()
	}
}

// row gathers one target's cells and what is wrong with them.
type row struct {
	line int
	text string
	bad  *Refusal
	err  bool
}

func (r *row) refuse(cause, mend string) {
	r.bad.add(r.line, r.text, cause, mend)
	r.err = true
}

// number reads one cell within bounds.
func (r *row) number(name, cell string, lo, hi float64) float64 {
	v, err := wire.ParseNumber(cell)
	switch {
	case err != nil:
		r.refuse(name+" is not a number", "write a plain decimal number")
	case !(v >= lo && v <= hi):
		r.refuse(fmt.Sprintf("%s is outside %g to %g", name, lo, hi), "correct it")
	default:
		return v
	}
	return 0
}

// target makes a target of the cells, in the order of columns; an empty
// optional cell is not said.
func (r *row) target(cells [len(columns)]string) Target {
	t := Target{Name: cells[0]}
	if t.Name == "" || len(t.Name) > maxName || strings.ContainsFunc(t.Name, func(c rune) bool { return c < ' ' || c == 0x7f || c == '\uFFFD' }) {
		r.refuse("the name is not usable", "give 1 to 128 characters without control characters")
	}
	ra, dec := r.number("ra_deg", cells[1], 0, 360), r.number("dec_deg", cells[2], -90, 90)
	a := &closures.Aim{Frame: closures.ICRS, Direction: geometry.FromEquator(s1.Angle(ra)*s1.Degree, s1.Angle(dec)*s1.Degree), Motion: closures.Tracking}
	const masYear = math.Pi / 180 / 3600 / 1000
	if cells[3] != "" {
		a.PMRA = r.number("pm_ra_mas_yr", cells[3], -20000, 20000) * masYear
	}
	if cells[4] != "" {
		a.PMDec = r.number("pm_dec_mas_yr", cells[4], -20000, 20000) * masYear
	}
	if cells[5] != "" {
		t.Length = time.Duration(r.number("length_s", cells[5], 0, 14*86400) * float64(time.Second))
	}
	if cells[6] != "" {
		t.Priority = r.number("priority", cells[6], -1e6, 1e6)
	}
	t.Aim = a
	return t
}

func readCSV(in io.Reader) ([]Target, error) {
	c := csv.NewReader(in)
	c.FieldsPerRecord = -1
	c.ReuseRecord = true
	bad := &Refusal{}
	header, err := c.Read()
	if err != nil {
		bad.add(1, "", "the header row cannot be read", "start with "+strings.Join(columns[:3], ","))
		return nil, bad
	}
	header = slices.Clone(header) // the reader uses its memory again
	place := make([]int, len(header))
	for i, name := range header {
		place[i] = slices.Index(columns[:], name)
		if place[i] < 0 || slices.Contains(header[:i], name) {
			bad.add(1, strings.Join(header, ","), fmt.Sprintf("column %d is unknown or named twice", i+1), "use "+strings.Join(columns[:], ","))
		}
	}
	for _, name := range columns[:3] {
		if !slices.Contains(header, name) {
			bad.add(1, strings.Join(header, ","), "column "+name+" is missing", "start with "+strings.Join(columns[:3], ","))
		}
	}
	if bad.Total > 0 {
		return nil, bad
	}
	var out []Target
	names := map[string]int{}
	for {
		rec, err := c.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		line, _ := c.FieldPos(0)
		if err != nil {
			var p *csv.ParseError
			if !errors.As(err, &p) {
				return nil, fmt.Errorf("targets: %w", err)
			}
			bad.add(p.Line, "", "the line is no CSV", "quote names that hold commas or quotes")
			break // what follows cannot be told apart
		}
		r := row{line: line, text: strings.Join(rec, ","), bad: bad}
		if len(rec) != len(header) {
			r.refuse(fmt.Sprintf("the line has %d cells, not %d", len(rec), len(header)), "give every column, empty where not said")
			continue
		}
		var cells [len(columns)]string
		for i, v := range rec {
			cells[place[i]] = strings.Clone(v)
		}
		out = r.keep(out, r.target(cells), names)
	}
	return finish(out, bad)
}

// keep adds a target unless its name is taken.
func (r *row) keep(out []Target, t Target, names map[string]int) []Target {
	if first, twice := names[t.Name]; twice {
		r.refuse(fmt.Sprintf("the name stands already on line %d", first), "name each target once")
	}
	names[t.Name] = r.line
	if len(out) == MaxTargets {
		if len(names) == MaxTargets+1 {
			r.refuse("the table is too long", fmt.Sprintf("give at most %d targets at a time", MaxTargets))
		}
		return out
	}
	return append(out, t)
}

func finish(out []Target, bad *Refusal) ([]Target, error) {
	if bad.Total > 0 {
		return nil, bad
	}
	if len(out) == 0 {
		bad.add(1, "", "the table has no targets", "give at least one")
		return nil, bad
	}
	return out, nil
}

// jsonTarget is one object; numbers are kept as written so that the one
// grammar of numbers rules.
type jsonTarget struct {
	Name     string   `json:"name"`
	RA       *float64 `json:"ra_deg"`
	Dec      *float64 `json:"dec_deg"`
	PMRA     *float64 `json:"pm_ra_mas_yr"`
	PMDec    *float64 `json:"pm_dec_mas_yr"`
	Length   *float64 `json:"length_s"`
	Priority *float64 `json:"priority"`
}

func readJSON(in io.Reader) ([]Target, error) {
	const most = 64 << 20
	data, err := io.ReadAll(io.LimitReader(in, most+1))
	if err != nil {
		return nil, fmt.Errorf("targets: %w", err)
	}
	bad := &Refusal{}
	if len(data) > most {
		bad.add(1, "", "the table is longer than 64 MiB", "use CSV or split it")
		return nil, bad
	}
	var list []jsonTarget
	if err := wire.Strict(data, &list); err != nil {
		bad.add(1, "", "the JSON cannot be read: "+err.Error(), "give an array of objects with "+strings.Join(columns[:], ", "))
		return nil, bad
	}
	var out []Target
	names := map[string]int{}
	lines := objectLines(data, len(list))
	for i, o := range list {
		r := row{line: lines[i], text: o.Name, bad: bad}
		cells := [len(columns)]string{o.Name}
		for k, v := range []*float64{o.RA, o.Dec, o.PMRA, o.PMDec, o.Length, o.Priority} {
			if v != nil {
				cells[k+1] = fmt.Sprint(*v)
			}
		}
		out = r.keep(out, r.target(cells), names)
	}
	return finish(out, bad)
}

// objectLines returns the line on which each object of an array of flat
// objects starts. The data has been read already, so its strings are closed.
func objectLines(data []byte, n int) []int {
	out := make([]int, 0, n)
	line, quoted := 1, false
	for i := 0; i < len(data) && len(out) < n; i++ {
		switch c := data[i]; {
		case c == '\n':
			line++
		case quoted && c == '\\':
			i++
		case c == '"':
			quoted = !quoted
		case c == '{' && !quoted:
			out = append(out, line)
		}
	}
	for len(out) < n {
		out = append(out, bytes.Count(data, []byte("\n"))+1)
	}
	return out
}
