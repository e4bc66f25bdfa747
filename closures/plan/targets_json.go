package plan

import (
	"errors"
	"fmt"
	"io"
	"strings"
	"time"

	"beamward/closures/wire"
)

// jsonTarget is one object.
type jsonTarget struct {
	Name      string      `json:"name"`
	RA        *float64    `json:"ra_deg"`
	Dec       *float64    `json:"dec_deg"`
	PMRA      *float64    `json:"pm_ra_mas_yr"`
	PMDec     *float64    `json:"pm_dec_mas_yr"`
	RateRA    *float64    `json:"rate_ra_arcsec_s"`
	RateDec   *float64    `json:"rate_dec_arcsec_s"`
	RateAt    *time.Time  `json:"rate_at"`
	Az        *float64    `json:"az_deg"`
	El        *float64    `json:"el_deg"`
	Refracted *bool       `json:"refracted"`
	Table     []jsonPoint `json:"table"`
	Length    *float64    `json:"length_s"`
	Priority  *float64    `json:"priority"`
	MinSpan   *float64    `json:"min_span_s"`
	Reacquire *float64    `json:"reacquire_s"`
}

type jsonPoint struct {
	At  *time.Time `json:"at"`
	RA  *float64   `json:"ra_deg"`
	Dec *float64   `json:"dec_deg"`
}

// readJSON reads an array that starts on a line.
func readJSON(in io.Reader, rest *io.LimitedReader, line int) ([]Target, error) {
	data, err := io.ReadAll(in)
	switch {
	case err != nil:
		return nil, fmt.Errorf("targets: %w", err)
	case rest.N <= 0:
		return nil, tooLong()
	}
	t := newTable()
	for o := range elements(data, line) {
		if o.cause != "" {
			t.bad.add(o.line, string(o.text), o.cause, "give one array of objects")
			break
		}
		t.object(o)
		if t.bad.Total > 10*maxRows {
			break
		}
	}
	return t.finish()
}

// object takes in one element of the array.
func (t *table) object(o element) {
	r := &row{line: o.line, text: string(o.text[:min(80, len(o.text))]), bad: &t.bad}
	var j jsonTarget
	if err := wire.Strict(o.text, &j); err != nil {
		if s := (*wire.StrictError)(nil); errors.As(err, &s) {
			at := o.line + s.Line - 1
			t.bad.add(at, r.text, "the object cannot be read: "+strings.TrimPrefix(s.Pointer+": ", ": ")+s.Cause, "give name, ra_deg, dec_deg and what else a target has")
			return
		}
		r.refuse("the object cannot be read", "give an object with name, ra_deg and dec_deg")
		return
	}
	r.name, r.text = j.Name, j.Name
	for c, v := range [numNumbers]*float64{
		cRA: j.RA, cDec: j.Dec, cPMRA: j.PMRA, cPMDec: j.PMDec, cRateRA: j.RateRA, cRateDec: j.RateDec, cAz: j.Az, cEl: j.El,
		cLength: j.Length, cPriority: j.Priority, cMinSpan: j.MinSpan, cReacquire: j.Reacquire,
	} {
		if v != nil {
			r.set(column(c), *v)
		}
	}
	if j.RateAt != nil {
		r.said[cRateAt], r.rateAt = true, *j.RateAt
	}
	if j.Refracted != nil {
		r.said[cRefracted], r.refracted = true, *j.Refracted
	}
	if j.Table != nil && len(j.Table) < 2 {
		r.refuse("the ephemeris has fewer than two points", "give two points or more")
	}
	for i := range j.Table {
		p := &j.Table[i]
		if p.At == nil || p.RA == nil || p.Dec == nil || !(*p.RA >= 0 && *p.RA <= 360 && *p.Dec >= -90 && *p.Dec <= 90) {
			r.refuse(fmt.Sprintf("point %d of the ephemeris is not whole", i+1), "give at, ra_deg from 0 to 360 and dec_deg from -90 to 90")
			break
		}
		if r.point(r, *p.At, *p.RA, *p.Dec); r.refused {
			break
		}
	}
	if r.refused {
		t.names[r.name] = r.line
		return
	}
	if o := r.target(); !r.refused {
		t.keep(r, o)
	}
}

// element is one element of an array as written, and the line it starts on. One
// with a cause says why nothing more can be told apart.
type element struct {
	text  []byte
	line  int
	cause string
}

// elements tells the elements of one array apart, which is all that data holds.
// What is inside them is for others to judge.
func elements(data []byte, line int) func(yield func(element) bool) {
	return func(yield func(element) bool) {
		i := 1 // behind the bracket
		skip := func() byte {
			for ; i < len(data); i++ {
				switch data[i] {
				case '\n':
					line++
				case ' ', '\t', '\r':
				default:
					return data[i]
				}
			}
			return 0
		}
		fail := func(cause string) { yield(element{line: line, cause: cause}) }
		for first := true; ; first = false {
			c := skip()
			if c == ']' && first {
				break
			}
			start, from, depth, quoted := i, line, 0, false
		one:
			for ; i < len(data); i++ {
				switch c := data[i]; {
				case c == '\n':
					line++
				case quoted && c == '\\':
					i++
				case c == '"':
					quoted = !quoted
				case quoted:
				case c == '{' || c == '[':
					depth++
				case c == ',' && depth <= 0, c == ']' && depth <= 0:
					break one
				case c == '}' || c == ']':
					depth--
				}
			}
			if i >= len(data) {
				fail("the array is not closed")
				return
			}
			if !yield(element{text: data[start:i], line: from}) {
				return
			}
			if data[i] == ']' {
				break
			}
			i++
		}
		i++
		if skip() != 0 {
			fail("something follows the array")
		}
	}
}
