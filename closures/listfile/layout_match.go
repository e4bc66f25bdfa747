package listfile

import (
	"bytes"
	"strings"
)

// join returns the line at index n with the lines that belong to it, and how
// many these are.
func (g *reading) join(n int) (text []byte, count int) {
	text, count = bytes.TrimRight(g.lines[n], " \t"), 1
	for n+count < len(g.lines) && len(text) <= layoutLine {
		next := bytes.TrimRight(g.lines[n+count], " \t")
		if j := g.l.after; j != nil {
			if kept, ok := g.keep(j, text); ok {
				text = bytes.Join([][]byte{kept, next}, []byte(j.with))
				count++
				continue
			}
		}
		j := g.l.before
		if j == nil {
			break
		}
		kept, ok := g.keep(j, next)
		if !ok {
			break
		}
		text = bytes.Join([][]byte{text, kept}, []byte(j.with))
		count++
	}
	return text, count
}

// keep returns the text that a joint keeps of a line.
func (g *reading) keep(j *joint, line []byte) (kept []byte, ok bool) {
	m := g.try(&j.match, line)
	if m == nil {
		return nil, false
	}
	at := 2 * j.match.values[0].group
	if m[at] < 0 {
		return nil, true
	}
	return line[m[at]:m[at+1]], true
}

// try matches a pattern against a whole line.
func (g *reading) try(p *pattern, line []byte) []int {
	if len(line) > layoutLine || len(line) < len(p.prefix) || string(line[:len(p.prefix)]) != p.prefix || !g.spend(p, len(line)) {
		return nil
	}
	return p.re.FindSubmatchIndex(line)
}

// spend counts the work of a match, which is bounded: a text that is too long
// for the layout's expressions is refused rather than read for hours.
func (g *reading) spend(p *pattern, length int) bool {
	if g.work -= int64(length+1) * int64(p.weight); g.work >= 0 {
		return true
	}
	if !g.d.full {
		g.d.stop(place{}, "the text is too long for the layout's expressions", "simplify the layout, or split the text")
	}
	return false
}

// rule returns the first rule that takes the line, with its match.
func (g *reading) rule(text []byte) (i int, match []int) {
	for i := range g.l.rules {
		if r := &g.l.rules[i]; r.applies(g.section) {
			if m := g.try(&r.match, text); m != nil {
				return i, m
			}
		}
	}
	return 0, nil
}

// alone refuses a line that is ignored, and yet a later rule would read.
func (g *reading) alone(ignored int, at place) {
	for i := ignored + 1; i < len(g.l.rules); i++ {
		r := &g.l.rules[i]
		if r.kind != isIgnore && r.applies(g.section) && g.try(&r.match, at.text) != nil {
			g.d.addf(at, "narrow the ignore rule", "the layout ignores the line on line %d and reads it as a %s on line %d", g.l.rules[ignored].at.line, r.kind, r.at.line)
			return
		}
	}
}

// found is a value of the present line.
type found struct {
	*value
	words string
	at    place
}

// values appends what the groups of a match hold, without the blanks about it.
// A group that took no part or holds only blanks gives nothing.
func (g *reading) values(dst []found, values []value, m []int, at place) []found {
	for i := range values {
		from, until := m[2*values[i].group], m[2*values[i].group+1]
		if from < 0 {
			continue
		}
		if words := strings.Trim(string(at.text[from:until]), " \t"); words != "" {
			dst = append(dst, found{&values[i], words, at})
		}
	}
	return dst
}

func pick(all []found, name string) *found {
	for i := range all {
		if all[i].name == name {
			return &all[i]
		}
	}
	return nil
}

func (g *reading) say(name, words string) {
	if g.observe != nil {
		g.said = append(g.said, name+"="+words)
	}
}

// carry notes a date for the lines below.
func (g *reading) carry(f *found) bool {
	w, ok := g.parse(f)
	if !ok {
		return false
	}
	if w.has&hasYear != 0 {
		g.date.year = w.year
	}
	if w.has&hasAnyDay != 0 {
		g.date.month, g.date.day, g.date.doy = w.month, w.day, w.doy
		g.date.has &^= hasAnyDay
	}
	g.date.has |= w.has & (hasYear | hasAnyDay)
	g.forward, g.last = 0, 0
	if g.first.has == 0 && g.date.has&hasYear != 0 && g.date.has&hasAnyDay != 0 {
		g.first = g.date
	}
	g.say("date", f.words)
	return true
}

// parse reads a time by its forms; more than one may fit only when they agree.
func (g *reading) parse(f *found) (w written, ok bool) {
	for i := range f.times {
		one, fits := f.times[i].parse(f.words)
		switch {
		case !fits:
		case ok && one != w:
			g.d.addf(f.at, "leave one form in the layout", "%s %s fits two forms that read it differently", f.name, quoted([]byte(f.words)))
			return w, false
		default:
			w, ok = one, true
		}
	}
	if !ok {
		g.d.addf(f.at, "correct the layout, or ask for the list again", "%s %s does not fit its form", f.name, quoted([]byte(f.words)))
	}
	return w, ok
}
