package listfile

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"beamward/closures"
	"beamward/closures/wire"
)

// cell is one scalar of a list as it stood in the text, before anything is
// made of it. Its text may be borrowed from the reader until own is called.
type cell struct {
	kind kind
	text []byte
	at   place
	when *instant // of a moment
}

// kind is what a format says of a scalar.
type kind uint8

const (
	absent     kind = iota
	bare            // a CSV field or a plain YAML scalar, which may be anything
	quotedText      // a JSON string or a quoted YAML scalar
	numeral         // a JSON number
	truthValue      // JSON's true or false
	null            // JSON's null, or a YAML scalar that is one
	nested          // an object or an array where a scalar belongs
	reported        // anything that its reader has reported already
	moment          // a time that a layout has read
)

func (c cell) set() bool { return c.kind != absent }

// own returns c with its own copy of the text.
func (c cell) own() cell {
	c.text = append([]byte(nil), c.text...)
	c.at.text = append([]byte(nil), c.at.text...)
	return c
}

const nameMend = "use 1 to 64 of A-Z a-z 0-9 . _ -"

// missing reports a key that must be there, unless the reading stopped before
// all of the list was seen.
func (d *draft) missing(at place, what string) {
	if d.full {
		return
	}
	d.add(at, what+" is missing", "add "+what)
}

// unknownKey reports a key that no list has. Keys are matched to the letter.
func (d *draft) unknownKey(at place, key []byte) {
	d.addf(at, "take it out, or spell it as the format does, in small letters", "the key %s is not known", quoted(key))
}

// twice reports a key that stands twice in one object.
func (d *draft) twice(at place, key []byte) {
	d.addf(at, "give each key once", "the key %s stands twice", quoted(key))
}

// wording returns the text of a scalar that must be there and be text. All the
// readers of cells report what is wrong themselves and then return false.
func (d *draft) wording(c cell, at place, what string) ([]byte, bool) {
	switch c.kind {
	case bare, quotedText:
		return c.text, true
	case absent:
		d.missing(at, what)
	case reported:
	default:
		d.add(c.at, what+" is not text", "write it as text")
	}
	return nil, false
}

func (d *draft) name(c cell, at place, what string) ([]byte, bool) {
	t, ok := d.wording(c, at, what)
	if !ok {
		return nil, false
	}
	if !closures.ValidName(string(t)) {
		d.addf(c.at, nameMend, "%s %s is not a name", what, quoted(t))
		return nil, false
	}
	return t, true
}

func (d *draft) time(c cell, at place, what string) (instant, bool) {
	if c.kind == moment {
		return *c.when, true
	}
	t, ok := d.wording(c, at, what)
	if !ok {
		return instant{}, false
	}
	i, cause, mend := parseInstant(t)
	if cause != "" {
		d.addf(c.at, mend, "%s %s %s", what, quoted(t), cause)
		return instant{}, false
	}
	return i, true
}

// angle reads degrees from lo to hi, both included.
func (d *draft) angle(c cell, at place, what string, lo, hi float64) (picodegrees, bool) {
	switch c.kind {
	case bare, numeral:
	case absent:
		d.missing(at, what)
		return 0, false
	case reported:
		return 0, false
	default:
		d.add(c.at, what+" is not a number", "write degrees as a plain number, without quotes")
		return 0, false
	}
	v, err := wire.ParseNumber(string(c.text))
	if err != nil {
		d.addf(c.at, "write degrees as a plain decimal number, such as 150.1", "%s %s is not a number", what, quoted(c.text))
		return 0, false
	}
	if !(v >= lo && v <= hi) {
		d.addf(c.at, fmt.Sprintf("give degrees from %g to %g", lo, hi), "%s %s is out of range", what, quoted(c.text))
		return 0, false
	}
	return roundDegrees(v), true
}

// rightAscension is angle from 0 to less than 360.
func (d *draft) rightAscension(c cell, at place, what string) (picodegrees, bool) {
	p, ok := d.angle(c, at, what, 0, 360)
	if !ok || p < fullTurn {
		return p, ok
	}
	if v, _ := wire.ParseNumber(string(c.text)); v < 360 { // rounded up to the full turn
		return 0, true
	}
	d.addf(c.at, "give degrees from 0 to less than 360", "%s %s is out of range", what, quoted(c.text))
	return 0, false
}

// radius is angle above 0, at most 90.
func (d *draft) radius(c cell, at place, what string) (picodegrees, bool) {
	p, ok := d.angle(c, at, what, 0, 90)
	if ok && p <= 0 {
		d.addf(c.at, "give degrees over 0, at most 90", "%s %s is out of range", what, quoted(c.text))
		return 0, false
	}
	return p, ok
}

// truth reads true or false; absent is false.
func (d *draft) truth(c cell, what string) (value, ok bool) {
	switch {
	case c.kind == absent:
		return false, true
	case (c.kind == bare || c.kind == truthValue) && string(c.text) == "true":
		return true, true
	case (c.kind == bare || c.kind == truthValue) && string(c.text) == "false":
		return false, true
	case c.kind == reported:
		return false, false
	}
	d.addf(c.at, "write true or false", "%s %s is neither true nor false", what, quoted(c.text))
	return false, false
}

// state reads closed or open.
func (d *draft) state(c cell, at place, what string) (open, ok bool) {
	t, ok := d.wording(c, at, what)
	if !ok {
		return false, false
	}
	switch string(t) {
	case "open":
		return true, true
	case "closed":
		return false, true
	}
	d.addf(c.at, "write closed or open", "%s %s is neither closed nor open", what, quoted(t))
	return false, false
}

// maxRef bounds an authority's own reference, in bytes.
const maxRef = 200

// reference reads an authority's own reference: printable text that neither
// begins nor ends with a space. Absent is empty.
func (d *draft) reference(c cell) (string, bool) {
	if !c.set() || c.kind == bare && len(c.text) == 0 {
		return "", true
	}
	t, ok := d.wording(c, c.at, "ref")
	if !ok {
		return "", false
	}
	if len(t) == 0 || len(t) > maxRef || t[0] == ' ' || t[len(t)-1] == ' ' || !printable(t) {
		d.addf(c.at, "use 1 to 200 bytes of printable text, without a space at either end", "ref %s is not usable", quoted(t))
		return "", false
	}
	return string(t), true
}

func printable[T []byte | string](t T) bool {
	for i := 0; i < len(t); i++ {
		if t[i] >= utf8.RuneSelf {
			return printableRunes(string(t[i:]))
		}
		if t[i] < 0x20 || t[i] == 0x7f {
			return false
		}
	}
	return true
}

func printableRunes(t string) bool {
	for i, r := range t {
		if !unicode.IsPrint(r) || r == utf8.RuneError && !strings.HasPrefix(t[i:], string(utf8.RuneError)) {
			return false
		}
	}
	return true
}
