package render

import (
	"encoding/csv"
	"fmt"
	"io"
	"strings"
	"time"
)

// CSV writes items, one a line under a header row, after a first line that
// says what the table is not for. Times have milliseconds: those of a closure
// are rounded outward to them, those of an allowed span inward.
func CSV(w io.Writer, items []Item) error {
	if _, err := io.WriteString(w, "# "+Notice+"\n"); err != nil {
		return fmt.Errorf("writing a table: %w", err)
	}
	t := NewTable(w)
	if err := t.Header(); err != nil {
		return err
	}
	for i := range items {
		if err := t.Row(&items[i]); err != nil {
			return err
		}
	}
	return t.Flush()
}

// Table writes rows as they come.
type Table struct{ out *csv.Writer }

// NewTable makes a table without any rows yet.
func NewTable(w io.Writer) *Table { return &Table{csv.NewWriter(w)} }

// Header writes the row of names.
func (t *Table) Header() error {
	return t.write([]string{"beam", "target", "state", "from", "until", "code", "source", "list", "region", "ref", "detail"})
}

// Row writes one item.
func (t *Table) Row(it *Item) error {
	state := "closed"
	if it.Open {
		state = "open"
	}
	from, until := it.Span.From.UTC().Truncate(time.Millisecond), it.Span.Until.UTC().Truncate(time.Millisecond)
	if it.Open && from.Before(it.Span.From) {
		from = from.Add(time.Millisecond)
	}
	if !it.Open && until.Before(it.Span.Until) {
		until = until.Add(time.Millisecond)
	}
	beam := it.Beam
	if beam == "" {
		beam = "*"
	}
	return t.write([]string{
		beam, cell(it.Target), state, stamp(from), stamp(until), it.Code, cell(it.Source), cell(it.List), cell(it.Region), cell(it.Ref), cell(it.Detail),
	})
}

func (t *Table) write(row []string) error {
	if err := t.out.Write(row); err != nil {
		return fmt.Errorf("writing a table: %w", err)
	}
	return nil
}

// Flush sends on what has gathered.
func (t *Table) Flush() error {
	t.out.Flush()
	if err := t.out.Error(); err != nil {
		return fmt.Errorf("writing a table: %w", err)
	}
	return nil
}

func stamp(t time.Time) string { return t.Format("2006-01-02T15:04:05.000Z") }

// cell makes a text safe for a spreadsheet, which would take one that begins
// like a formula for a formula.
func cell(s string) string {
	s = plain(s)
	if s != "" && strings.ContainsRune("=+-@", rune(s[0])) {
		return "'" + s
	}
	return s
}
