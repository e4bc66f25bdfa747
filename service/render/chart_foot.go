package render

import (
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"beamward/closures"
)

// reasons are those that block any of the rows, in the codes' order.
func (d *drawing) reasons() []closures.Code {
	var have closures.Codes
	for i := range d.rows {
		for j := range d.rows[i].Blocked {
			if c := d.rows[i].Blocked[j].Code; c < closures.NumCodes {
				have = have.With(c)
			}
		}
	}
	var out []closures.Code
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		if have.Has(c) {
			out = append(out, c)
		}
	}
	return out
}

const (
	keyHeight  = 24.0
	noteHeight = 16.0
	noteWide   = 220 // characters
)

func (d *drawing) footHeight(reasons []closures.Code, notes []string) float64 {
	return 34 + keyHeight*float64(len(d.keys(reasons))) + noteHeight*float64(len(wrapped(notes))) + 12
}

// key is one entry of the legend.
type key struct {
	word   string
	class  string
	code   closures.Code
	mark   bool // it is a reason: with its pattern and mark
	sun    bool
	letter string // in the swatch
}

// keys are the legend's entries, in lines.
func (d *drawing) keys(reasons []closures.Code) [][]key {
	all := []key{{word: "allowed", class: "allowed"}}
	for _, c := range reasons {
		all = append(all, key{word: c.String(), code: c, mark: true})
	}
	if slices.ContainsFunc(d.rows, func(r ChartRow) bool { return len(r.Placed) > 0 }) {
		all = append(all, key{word: "place in the sequence", class: "placed"})
	}
	var lines [][]key
	x := chartWidth
	seen := map[string]bool{}
	for _, b := range d.chart.Sun {
		if seen[b.Word] {
			continue
		}
		seen[b.Word] = true
		all = append(all, key{word: "Sun: " + b.Word, class: fmt.Sprint("sun", min(4, max(0, b.Dark)), " edge"), letter: d.letter(b.Word), sun: true})
	}
	for _, k := range all {
		if x+k.width() > chartWidth-16 || k.sun && len(lines) == 1 {
			lines, x = append(lines, nil), 16
		}
		lines[len(lines)-1] = append(lines[len(lines)-1], k)
		x += k.width()
	}
	return lines
}

func (k key) width() float64 {
	w := 34 + 8 + 7*float64(len(k.word)) + 22
	if k.mark {
		w += 16
	}
	return w
}

// foot writes the legend and the notes.
func (d *drawing) foot(reasons []closures.Code, notes []string) {
	y := rowTop + d.plotHeight + 34
	for _, line := range d.keys(reasons) {
		x := 16.0
		for _, k := range line {
			if k.mark {
				d.pattern(k.code, x, y, 34, 15)
			} else {
				d.rect(k.class, x, y, 34, 15)
			}
			if k.letter != "" {
				d.text("tiny", x+17, y+11, "middle", k.letter)
			}
			at := x + 34 + 8
			if k.mark {
				d.shape(k.code, at+4, y+7.5)
				at += 14
			}
			d.text("small", at, y+12, "start", k.word)
			x += k.width()
		}
		y += keyHeight
	}
	for _, n := range wrapped(notes) {
		d.text("tiny", 16, y+11, "start", n)
		y += noteHeight
	}
}

// letter is the first letter of a band's word, large, where no brighter band has
// it; else nothing.
func (d *drawing) letter(word string) string {
	first := func(s string) string {
		r, _ := utf8.DecodeRuneInString(s)
		return strings.ToUpper(string(r))
	}
	dark := 0
	for _, b := range d.chart.Sun {
		if b.Word == word {
			dark = b.Dark
		}
	}
	for _, b := range d.chart.Sun {
		if b.Word != word && b.Dark < dark && first(b.Word) == first(word) {
			return ""
		}
	}
	return first(word)
}

// wrapped breaks notes into lines.
func wrapped(notes []string) []string {
	var out []string
	for _, n := range notes {
		line := ""
		for _, word := range strings.Fields(n) {
			if line != "" && utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > noteWide {
				out, line = append(out, line), "  "
			} else if line != "" {
				line += " "
			}
			line += word
		}
		if line != "" {
			out = append(out, line)
		}
	}
	return out
}
