package wire

import (
	"strconv"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"beamward/closures"
)

// Bounds of a line.
const (
	MaxFactLine = 64 << 10 // bytes, the line's end not counted
	MaxPoints   = 512      // of an aim's table
	MaxPeople   = 32       // at a watch post
	maxText     = 128      // bytes of a target's name or a person's
)

// Parser reads facts. It remembers the names it met, so that a source that
// tells of the same things again and again costs no memory. It has one owner.
// The zero Parser works and remembers nothing.
type Parser struct {
	names map[string]string
	limit int

	s       scanner
	scratch []byte
	seen    fields
	texts   [numTexts]string
	words   [endWords - numTexts]uint8
	times   [endTimes - endWords]time.Time
	yes     fields
	numbers [endNumbers - endBools]float64
	points  []closures.AimPoint
	people  []string
	azimuth bool // the rate was given by azimuth and elevation
}

// NewParser makes a parser that remembers up to names names; with more it
// forgets them all and starts again.
func NewParser(names int) *Parser {
	return &Parser{names: make(map[string]string), limit: names, scratch: make([]byte, 0, 2*maxText)}
}

// ParseFact reads one line of a feed, without its line end: the shapes of
// facts that are the service's outside interface, in degrees, metres, metres a
// second and UTC. received is when the line came in: a fact from more than
// MaxAhead after it or more than MaxBehind before it is refused.
//
// name is what the sender must be bound to: the source, else the beam, the
// telescope or the post that the fact speaks for. The body's numbers that were
// not given are NaN where its type says so, and so are the position of an
// aircraft that gave none and its height without an altitude. Rates and proper
// motions in right ascension are times cos(declination), on the sky. The error
// is a *FactError, and then name is empty and body nil.
func ParseFact(line []byte, received time.Time) (name closures.Source, body closures.Body, err error) {
	var p Parser
	return p.Fact(line, received)
}

// Fact is ParseFact with the parser's memory.
func (p *Parser) Fact(line []byte, received time.Time) (name closures.Source, body closures.Body, err error) {
	p.seen, p.yes, p.azimuth, p.points, p.people = 0, 0, false, nil, nil
	wrong := p.read(line)
	if wrong == nil {
		wrong = p.check(received)
	}
	if wrong == nil {
		name, body, wrong = p.build()
	}
	if wrong != nil {
		return "", nil, wrong
	}
	return name, body, nil
}

func (p *Parser) read(line []byte) *FactError {
	if len(line) > MaxFactLine {
		return refuseLine("longer than "+strconv.Itoa(MaxFactLine)+" bytes", mendSyntax)
	}
	p.s = scanner{b: line}
	s := &p.s
	s.space()
	if !s.take('{') {
		return refuseLine("not a JSON object", mendSyntax)
	}
	s.space()
	if !s.take('}') {
		for {
			if wrong := p.member(); wrong != nil {
				return wrong
			}
			s.space()
			if s.take('}') {
				break
			}
			if !s.take(',') {
				return p.syntax("no comma and no end after a value")
			}
			s.space()
		}
	}
	s.space()
	if s.i != len(line) {
		return p.syntax("text after the object")
	}
	return nil
}

// syntax refuses the line for what stands at the present place.
func (p *Parser) syntax(cause string) *FactError {
	return refuseLine("byte "+strconv.Itoa(p.s.i+1)+": "+cause, mendSyntax)
}

// key reads a key and the colon after it. What it returns is good until the
// next string is read.
func (p *Parser) key() ([]byte, *FactError) {
	key, cause := p.s.text(p.scratch[:0])
	if cause != "" {
		if cause == notString {
			cause = "no key in quotes"
		}
		return nil, p.syntax(cause)
	}
	p.s.space()
	if !p.s.take(':') {
		return nil, p.syntax("no colon after a key")
	}
	p.s.space()
	return key, nil
}

func (p *Parser) member() *FactError {
	key, wrong := p.key()
	if wrong != nil {
		return wrong
	}
	f := fieldOf(key)
	if f == noField {
		return unknownField(key)
	}
	if p.seen.has(f) {
		return refuse(f, "given twice", "give it once")
	}
	p.seen |= 1 << f
	switch {
	case f < numTexts:
		return p.text(f)
	case f < endWords:
		return p.word(f)
	case f < endTimes:
		return p.instant(f, &p.times[f-endWords])
	case f < endBools:
		return p.boolean(f)
	case f < endNumbers:
		return p.number(f)
	}
	switch f {
	case fICRS, fOfDate:
		return p.pair(f, fRA, fDec)
	case fHorizon:
		return p.pair(f, fAz, fEl)
	case fRate:
		return p.rate()
	case fPM:
		return p.pair(f, fPMRA, fPMDec)
	case fTable:
		return p.table()
	}
	return p.by()
}

func unknownField(key []byte) *FactError {
	cause := "no fact has a field " + quote(key)
	for _, name := range fieldNames {
		if strings.EqualFold(name, string(key)) && fieldOf([]byte(name)) != noField {
			return refuseLine(cause, "write it "+name)
		}
	}
	return refuseLine(cause, "leave it out")
}

// intern returns b as a string, the same one as before where it is remembered.
func (p *Parser) intern(b []byte) string {
	if p.limit <= 0 {
		return string(b)
	}
	if s, ok := p.names[string(b)]; ok {
		return s
	}
	if len(p.names) >= p.limit {
		clear(p.names)
	}
	s := string(b)
	p.names[s] = s
	return s
}

func (p *Parser) text(f field) *FactError {
	b, cause := p.s.text(p.scratch[:0])
	if cause != "" {
		return refuse(f, cause, "give a string")
	}
	if f == fTarget {
		if !validText(b) {
			return refuse(f, quote(b)+" is no name of a target", mendText)
		}
	} else if !closures.ValidName(string(b)) {
		return refuse(f, quote(b)+" is not a name", "use 1 to 64 of A-Z a-z 0-9 . _ -")
	}
	p.texts[f] = p.intern(b)
	return nil
}

const mendText = "use 1 to 128 bytes of printable characters, no blank at either end"

// validText reports whether b can name a target or a person: it is shown to
// people, so it holds nothing that cannot be seen.
func validText(b []byte) bool {
	if len(b) == 0 || len(b) > maxText || b[0] == ' ' || b[len(b)-1] == ' ' {
		return false
	}
	for i := 0; i < len(b); {
		r, size := utf8.DecodeRune(b[i:])
		if !unicode.IsPrint(r) || r == utf8.RuneError {
			return false
		}
		i += size
	}
	return true
}

func (p *Parser) word(f field) *FactError {
	b, cause := p.s.text(p.scratch[:0])
	if cause == "" {
		for i, w := range words[f-numTexts] {
			if w != "" && w == string(b) {
				p.words[f-numTexts] = uint8(i)
				return nil
			}
		}
		cause = quote(b) + " is no such word"
	}
	return refuse(f, cause, "give one of "+strings.TrimPrefix(strings.Join(words[f-numTexts], ", "), ", "))
}

func (p *Parser) instant(f field, into *time.Time) *FactError {
	b, cause := p.s.text(p.scratch[:0])
	if cause == "" {
		if *into, cause = scanTime(b, FirstYear, LastYear); cause == "" {
			return nil
		}
		cause = quote(b) + ": " + cause
	}
	return refuse(f, cause, "give UTC as 2031-02-14T03:10:02.5Z")
}

func (p *Parser) boolean(f field) *FactError {
	switch {
	case p.s.word("true"):
		p.yes |= 1 << f
	case !p.s.word("false"):
		return refuse(f, "neither true nor false", "give true or false without quotes")
	}
	return nil
}

func (p *Parser) number(f field) *FactError {
	from := p.s.i
	v, cause := p.s.number()
	if cause != "" {
		return refuse(f, cause, "give a number without quotes, or leave it out")
	}
	l := &limits[f-endBools]
	if !(v >= l.low && v <= l.high) {
		return refuse(f, string(p.s.b[from:min(p.s.i, from+maxQuoted)])+" is out of range", l.mend)
	}
	p.numbers[f-endBools] = v
	return nil
}
