package listfile

import (
	"bytes"
	"fmt"
	"io"

	"beamward/closures"
)

// Read reads one closure list. With Auto the format is told from the text; see
// FormatOf for telling it from a name. The report says what was read, also of
// a refused list. The error is a *Refusal, or the reader's own.
//
// A list that is returned has been checked whole, apart from what only those
// know who hold other lists: whether the authority is known, and whether what
// it replaces exists and is older.
func Read(r io.Reader, format Format, limits Limits) (*closures.ListText, Report, error) {
	d := newDraft(limits.filled())
	head := make([]byte, 512)
	n, err := io.ReadFull(r, head)
	if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
		return nil, Report{Format: format}, fmt.Errorf("read closure list: %w", err)
	}
	head = head[:n]
	report := Report{Format: format}
	if format == Auto {
		report.Format = sniff(head)
	}
	if n == 0 {
		d.stop(place{line: 1}, "the text is empty", "write a closure list")
		return nil, report, d.refusal()
	}
	if bytes.HasPrefix(head, []byte("\xEF\xBB\xBF")) {
		d.stop(place{1, head[:min(n, 40)]}, "the text begins with a byte order mark", "save it as UTF-8 without a byte order mark")
		return nil, report, d.refusal()
	}
	whole := io.MultiReader(bytes.NewReader(head), r)
	switch report.Format {
	case YAML:
		err = readYAML(d, whole, &report)
	case JSON:
		err = readJSON(d, whole, &report)
	case CSV:
		err = readCSV(d, whole, &report)
	default:
		err = fmt.Errorf("no such format: %d", report.Format)
	}
	if err != nil {
		return nil, report, fmt.Errorf("read closure list: %w", err)
	}
	t, err := d.finish()
	return t, report, err
}

// Load is Read, and then makes the list ready for use.
func Load(r io.Reader, format Format, limits Limits) (*closures.List, Report, error) {
	t, report, err := Read(r, format, limits)
	if err != nil {
		return nil, report, err
	}
	l, err := closures.Index(t)
	return l, report, Explained(t, err)
}
