package listfile

import (
	"bytes"
	"fmt"
	"io"
	"strings"

	"beamward/closures"
)

// Read reads one closure list by the layout. The error is a *Refusal, or the
// reader's own; what holds for the native formats holds here too.
func (l *Layout) Read(r io.Reader, limits Limits) (*closures.ListText, Report, error) {
	return l.read(r, limits, nil)
}

// Load is Read, and then makes the list ready for use.
func (l *Layout) Load(r io.Reader, limits Limits) (*closures.List, Report, error) {
	t, report, err := l.Read(r, limits)
	if err != nil {
		return nil, report, err
	}
	list, err := closures.Index(t)
	return list, report, Explained(t, err)
}

func (l *Layout) read(r io.Reader, limits Limits, observe func(Taken)) (*closures.ListText, Report, error) {
	report := Report{Format: Text, Layout: l.name}
	limits = limits.filled()
	limit := min(limits.Bytes, layoutBytes)
	all, err := io.ReadAll(io.LimitReader(r, limit+1))
	report.Bytes = int64(len(all))
	if err != nil {
		return nil, report, fmt.Errorf("read closure list: %w", err)
	}
	d := newDraft(limits)
	switch {
	case int64(len(all)) > limit:
		d.stop(place{}, "a text for a layout is at most 16 MiB", "split it")
	case len(all) == 0:
		d.stop(place{line: 1}, "the text is empty", "ask for the list again")
	}
	if d.any() {
		return nil, report, d.refusal()
	}
	lines, ok := d.textLines(l.decode(all))
	report.Lines = len(lines)
	if !ok {
		return nil, report, d.refusal()
	}
	d.dropRepeats = l.dropRepeats
	g := newReading(l, d, lines)
	g.observe = observe
	g.all()
	t, err := d.finish()
	return t, report, err
}

// decode makes UTF-8 of a text and takes off what printers leave: a byte order
// mark, and form feeds at the beginning of lines.
func (l *Layout) decode(all []byte) []byte {
	if l.latin {
		runes := make([]rune, len(all))
		for i, c := range all {
			runes[i] = rune(c)
		}
		all = []byte(string(runes))
	}
	all = bytes.TrimPrefix(all, []byte("\uFEFF"))
	all = bytes.TrimPrefix(all, []byte("\f"))
	return bytes.ReplaceAll(all, []byte("\n\f"), []byte("\n"))
}

// reading is one text being read by a layout. It has one owner.
type reading struct {
	l       *Layout
	d       *draft
	lines   [][]byte
	section string
	region  string // carried down; empty: none
	date    written
	first   written // the first whole date, for what the head says by time of day
	forward int     // days passed since the date, where starts never go back
	last    int64   // the start before, for that
	taken   []int   // lines each rule has taken
	work    int64   // that may still be done
	regions map[string]*described
	tracks  []*described
	observe func(Taken)
	said    []string // of the present line, when observed
}

// described is a region as its first line described it.
type described struct {
	line  int
	shape string
	track *regionText
}

// topSection is where a text begins.
const topSection = "top"

func newReading(l *Layout, d *draft, lines [][]byte) *reading {
	g := &reading{l: l, d: d, lines: lines, section: topSection, work: maxWork, taken: make([]int, len(l.rules)), regions: map[string]*described{}}
	d.line = func(n int) []byte {
		if n < 1 || n > len(lines) {
			return nil
		}
		return lines[n-1]
	}
	return g
}

// all reads every line, and then what only the whole text tells.
func (g *reading) all() {
	for n := 0; n < len(g.lines) && !g.d.full; {
		text, count := g.join(n)
		if len(text) > layoutLine {
			g.d.stop(place{n + 1, text}, "the line is too long; nothing after it was read", fmt.Sprintf("lines have at most %d bytes, joined", layoutLine))
			break
		}
		g.line(n+1, count, text)
		n += count
	}
	if g.d.full {
		return
	}
	for i := range g.l.rules {
		if r := &g.l.rules[i]; r.need != needAny && g.taken[i] == 0 {
			g.d.addf(place{}, "ask for the list again: it may be cut short", "the text has no line for the layout's rule on line %d, which it needs", r.at.line)
		}
	}
	g.fixedHead()
	for _, one := range g.tracks {
		g.d.region(one.track)
	}
	if len(g.tracks) > 0 {
		g.d.reorder()
	}
	g.d.head.regionsSet, g.d.head.windowsSet = true, true
}

// line reads one line, joined of count.
func (g *reading) line(n, count int, text []byte) {
	at := place{n, text}
	before := g.d.total
	g.said = g.said[:0]
	i, m := g.rule(text)
	took := Taken{Line: n, Count: count, Text: string(text)}
	switch {
	case g.d.full:
		return
	case m == nil:
		g.d.add(at, "no rule of the layout takes the line", "give the layout a rule for it, or ask for the list again")
		g.d.lost = true
		took.As = "nothing"
	default:
		r := &g.l.rules[i]
		took.As, took.Rule = r.kind.String(), r.at.line
		g.taken[i]++
		if r.need == needOnce && g.taken[i] > 1 {
			g.d.addf(at, "ask for the list again: two may have been joined", "the line stands a second time, and the layout wants it once")
		}
		if r.kind == isIgnore {
			g.alone(i, at)
		} else {
			g.apply(r, m, at)
		}
	}
	if g.observe != nil {
		took.Says, took.Section = strings.Join(g.said, " "), g.section
		took.Bad = g.d.total > before
		g.observe(took)
	}
}

// apply reads a line that a rule has taken.
func (g *reading) apply(r *rule, m []int, at place) {
	if r.enter != "" {
		g.section, g.region = r.enter, ""
		g.say("enters", r.enter)
	}
	all := g.values(nil, r.match.values, m, at)
	for i := range r.fixed {
		all = append(all, found{&r.fixed[i], r.fixed[i].text, at})
	}
	if date := pick(all, "date"); date != nil && !g.carry(date) {
		g.d.lost = true
		return
	}
	switch r.kind {
	case isHead:
		g.headLine(r, all)
	case isRegion:
		if id, ok := g.describe(r, all, at); ok {
			g.region = id
			g.forward, g.last = 0, 0
		}
	case isPoint:
		g.pointLine(all, at)
	case isWindow:
		g.windowLine(r, all, at)
	}
}
