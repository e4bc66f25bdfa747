package listfile

import (
	"fmt"
	"io"

	"beamward/closures"
)

// Taken is what a layout took one line for.
type Taken struct {
	Line    int    // of the first physical line
	Count   int    // physical lines joined
	Text    string // as joined
	As      string // head, region, window, point, date, mark, ignore or nothing
	Rule    int    // line of the rule in the layout; 0: none
	Section string // that it stands in
	Says    string // the values read, as name=value
	Bad     bool   // something is wrong with it
}

// Explain reads a text by the layout and says what each line was taken for,
// along with what Read returns.
func (l *Layout) Explain(r io.Reader, limits Limits) ([]Taken, *closures.ListText, Report, error) {
	var lines []Taken
	t, report, err := l.read(r, limits, func(one Taken) { lines = append(lines, one) })
	return lines, t, report, err
}

// WriteExplanation writes what each line was taken for, for reading.
func WriteExplanation(w io.Writer, lines []Taken) error {
	out := sink{w: w}
	var b []byte
	for _, one := range lines {
		mark := " "
		if one.Bad {
			mark = "!"
		}
		where := fmt.Sprint(one.Line)
		if one.Count > 1 {
			where = fmt.Sprintf("%d-%d", one.Line, one.Line+one.Count-1)
		}
		b = fmt.Appendf(b, "%s%7s  %-7s %s\n", mark, where, one.As, shown([]byte(one.Text), 100))
		if one.Says != "" {
			b = fmt.Appendf(b, "%18s%s\n", "", shown([]byte(one.Says), 400))
		}
		b = out.spill(b)
	}
	out.write(b)
	return out.err
}
