package plan

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"strings"
	"time"

	"beamward/closures"
)

// Target is one line of a table of targets.
type Target struct {
	Name     string
	Aim      *closures.Aim
	Length   time.Duration // how long it wants the beam; zero: not said
	Priority float64       // higher is worth more; zero: not said, which counts as 1
	Use      Use
}

// Use says what of its allowed time serves a target. The zero value: all.
type Use struct {
	MinSpan   time.Duration // shorter spans, less the time to acquire, do not serve
	Reacquire time.Duration // from the beam's return to when it serves: the star must be found again
}

// Bounds of a table.
const (
	MaxTargets  = 200_000
	MaxPoints   = 10_000    // of one ephemeris
	maxPoints   = 1_000_000 // of all
	maxName     = 128
	maxText     = 64 << 20 // bytes
	maxLength   = 14 * 24 * time.Hour
	maxPriority = 1e6
)

// ReadTargets reads a table of targets: CSV under a header row, or a JSON array
// of objects with the same names. Each target has a name and one of
//
//   - ra_deg and dec_deg, ICRS: at J2000.0, or with pm_ra_mas_yr and
//     pm_dec_mas_yr moving from there on, or with rate_ra_arcsec_s and
//     rate_dec_arcsec_s there at the instant rate_at;
//   - az_deg and el_deg, with refracted: true when as seen through the air,
//     false when airless;
//   - an ephemeris. In CSV it is rows of the same name that follow one another,
//     each with point_at, ra_deg and dec_deg; in JSON a member table, an array of
//     {at, ra_deg, dec_deg}. The target is nowhere outside its points.
//
// A proper motion or a rate in right ascension is that on the sky, times the
// cosine of the declination. Besides, each may have length_s, priority (0 to
// 1,000,000), min_span_s and reacquire_s; of an ephemeris in CSV they stand on
// its first row. An empty cell is not said.
//
// A table with one bad row is refused whole, every bad row reported: the error
// is then a *Refusal. Other errors are those of r.
func ReadTargets(r io.Reader) ([]Target, error) {
	rest := &io.LimitedReader{R: r, N: maxText + 1}
	in := bufio.NewReader(rest)
	if mark, _ := in.Peek(3); bytes.Equal(mark, []byte("\xef\xbb\xbf")) { // spreadsheets write it
		in.Discard(3)
	}
	line := 1
	for {
		c, err := in.Peek(1)
		switch {
		case err == io.EOF:
			return nil, refusal(1, "the table is empty", "give a header row and targets")
		case err != nil:
			return nil, fmt.Errorf("targets: %w", err)
		case c[0] == '[':
			return readJSON(in, rest, line)
		case c[0] == '\n':
			line++
		case c[0] != ' ' && c[0] != '\r' && c[0] != '\t':
			return readCSV(in, rest, line-1)
		}
		in.Discard(1)
	}
}

// table gathers targets and what is wrong with them.
type table struct {
	out    []Target
	names  map[string]int // to the line it stands on
	points int
	bad    Refusal
}

func newTable() *table { return &table{names: map[string]int{}} }

// keep adds a target unless its name is taken or the table is too long.
func (t *table) keep(r *row, o Target) {
	if first, twice := t.names[o.Name]; twice {
		r.refuse(fmt.Sprintf("the name stands already on line %d", first), "name each target once")
		return
	}
	t.names[o.Name] = r.line
	if t.points += len(o.Aim.Points); t.points > maxPoints {
		r.refuse("the table has too many points", fmt.Sprintf("give at most %d points in all", maxPoints))
		return
	}
	if len(t.out) == MaxTargets {
		if len(t.names) == MaxTargets+1 {
			r.refuse("the table is too long", fmt.Sprintf("give at most %d targets at a time", MaxTargets))
		}
		return
	}
	t.out = append(t.out, o)
}

// finish returns the targets, or the refusal.
func (t *table) finish() ([]Target, error) {
	if t.bad.Total > 0 {
		return nil, &t.bad
	}
	if len(t.out) == 0 {
		return nil, refusal(1, "the table has no targets", "give at least one")
	}
	return t.out, nil
}

// RowError is one line of a table that cannot be used.
type RowError struct {
	Line  int
	Text  string // input: only ever shown as text
	Cause string
	Mend  string
}

// Refusal is every such line; a table with one is refused whole.
type Refusal struct {
	Rows  []RowError // the first 1,000
	Total int
}

const maxRows = 1000

func refusal(line int, cause, mend string) *Refusal {
	return &Refusal{Rows: []RowError{{Line: line, Cause: cause, Mend: mend}}, Total: 1}
}

func tooLong() *Refusal { return refusal(1, "the table is longer than 64 MiB", "split it") }

// Error names the first line and how many there are.
func (r *Refusal) Error() string {
	if len(r.Rows) == 0 {
		return "targets: refused"
	}
	f := r.Rows[0]
	return fmt.Sprintf("targets: line %d: %s (%s); %d bad in all", f.Line, f.Cause, f.Mend, r.Total)
}

func (r *Refusal) add(line int, text, cause, mend string) {
	r.Total++
	if len(r.Rows) < maxRows {
		if len(text) > 80 {
			text = text[:80]
		}
		r.Rows = append(r.Rows, RowError{Line: line, Text: strings.ToValidUTF8(text, "?"), Cause: cause, Mend: mend})
	}
}
