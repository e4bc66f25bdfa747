package listfile

import (
	"fmt"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"
)

// LineError is one bad line of a list.
type LineError struct {
	Line  int    `json:"line"`           // from 1; 0: the text as a whole
	Text  string `json:"text,omitempty"` // what stood there, escaped, at most 80 bytes
	Cause string `json:"cause"`          // fixed words around escaped input
	Mend  string `json:"mend,omitempty"` // what to do about it
}

// Refusal says why a list was refused: every bad line, the first KeptLines of
// them in detail.
type Refusal struct {
	Lines []LineError `json:"lines"`
	Total int         `json:"total"`
}

// KeptLines is how many bad lines a Refusal keeps in detail.
const KeptLines = 1000

// Error names the first bad line and how many there are.
func (r *Refusal) Error() string {
	if len(r.Lines) == 0 {
		return "closure list refused"
	}
	first := r.Lines[0]
	var b strings.Builder
	b.WriteString("closure list refused: ")
	if first.Line > 0 {
		fmt.Fprintf(&b, "line %d: ", first.Line)
	}
	b.WriteString(first.Cause)
	if first.Mend != "" {
		fmt.Fprintf(&b, " (%s)", first.Mend)
	}
	if r.Total > 1 {
		fmt.Fprintf(&b, "; %d bad lines in all", r.Total)
	}
	return b.String()
}

// place is where in a text something stands. The text is only borrowed.
type place struct {
	line int
	text []byte
}

// faults collects bad lines. One line with several faults counts once for
// each.
type faults struct {
	lines []LineError
	total int
	full  bool // a limit was passed or the rest cannot be read: stop
}

func (f *faults) add(at place, cause, mend string) {
	f.total++
	if len(f.lines) < KeptLines {
		f.lines = append(f.lines, LineError{Line: at.line, Text: shown(at.text, 80), Cause: cause, Mend: mend})
	}
}

// addf is add with input in the cause, already passed through quoted.
func (f *faults) addf(at place, mend, cause string, args ...any) {
	if len(f.lines) >= KeptLines {
		f.total++
		return
	}
	f.add(at, fmt.Sprintf(cause, args...), mend)
}

// stop adds the fault after which nothing more is read.
func (f *faults) stop(at place, cause, mend string) {
	f.add(at, cause, mend)
	f.full = true
}

func (f *faults) any() bool { return f.total > 0 }

// refusal returns what was collected, in order of lines.
func (f *faults) refusal() *Refusal {
	slices.SortStableFunc(f.lines, func(a, b LineError) int { return a.Line - b.Line })
	return &Refusal{Lines: f.lines, Total: f.total}
}

// quoted returns input for use inside a cause.
func quoted(text []byte) string { return `"` + shown(text, 40) + `"` }

// shown returns text with everything that is not printable escaped, cut to at
// most limit bytes.
func shown(text []byte, limit int) string {
	var b []byte
	cut := 0 // where the text can end with room for three points
	for len(text) > 0 && len(b) <= limit {
		r, n := utf8.DecodeRune(text)
		switch {
		case r == utf8.RuneError && n == 1:
			b = fmt.Appendf(b, `\x%02x`, text[0])
		case r == '\t':
			b = append(b, `\t`...)
		case r == '\\':
			b = append(b, `\\`...)
		case unicode.IsPrint(r):
			b = append(b, text[:n]...)
		default:
			b = fmt.Appendf(b, `\u{%x}`, r)
		}
		if len(b) <= limit-3 {
			cut = len(b)
		}
		text = text[n:]
	}
	if len(b) > limit {
		b = append(b[:cut], "..."...)
	}
	return string(b)
}

// badText says what in a line cannot stand in any list, or "". Lines are UTF-8
// without control characters but the tab, and without the characters that some
// readers take for the end of a line.
func badText(line []byte) (cause, mend string) {
	for i := 0; i < len(line); i++ {
		if c := line[i]; c < 0x20 && c != '\t' || c >= 0x7f {
			return badRune(line[i:])
		}
	}
	return "", ""
}

func badRune(text []byte) (cause, mend string) {
	for len(text) > 0 {
		r, n := utf8.DecodeRune(text)
		switch {
		case r == 0:
			return "a NUL byte", "send the list as plain UTF-8 text"
		case r == utf8.RuneError && n == 1:
			return "bytes that are not UTF-8", "send the list as plain UTF-8 text"
		case r == '\r':
			return "a carriage return inside a line", `end each line with \n or \r\n`
		case r == '\uFEFF':
			return "a byte order mark", "save the text as UTF-8 without a byte order mark"
		case r == '\u2028', r == '\u2029', unicode.IsControl(r) && r != '\t':
			return fmt.Sprintf("the control character U+%04X", r), "take the character out"
		}
		text = text[n:]
	}
	return "", ""
}
