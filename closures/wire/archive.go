package wire

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"time"
	"unicode/utf8"

	"github.com/golang/geo/r3"
)

// archive carries values between memory and the text of the record, in either
// direction. Each type has one function that names its fields in order; it
// serves writing and reading, so that the two cannot drift apart.
//
// The text is JSON in one form only: no blanks, keys in the functions' order,
// zero values left out. Numbers are the shortest that read back to the same
// bits; not-a-number is null and the infinities are "inf" and "-inf". Times are
// in UTC to the nanosecond, durations whole nanoseconds. After the first error
// nothing more is carried.
type archive struct {
	out     []byte
	in      scanner
	reading bool
	err     error
}

func reader(b []byte) archive { return archive{in: scanner{b: b}, reading: true} }

func (a *archive) fail(cause string) {
	if a.err != nil {
		return
	}
	if a.reading {
		cause = "byte " + strconv.Itoa(a.in.i+1) + ": " + cause
	}
	a.err = errors.New(cause)
}

// mark carries one character of the form.
func (a *archive) mark(c byte) {
	switch {
	case a.err != nil:
	case !a.reading:
		a.out = append(a.out, c)
	case !a.in.take(c):
		a.fail("want " + string(rune(c)))
	}
}

// end ends the reading of a text.
func (a *archive) end() error {
	if a.err == nil && a.in.i != len(a.in.b) {
		a.fail("text after the end")
	}
	return a.err
}

// field carries a key and reports whether its value follows: when writing if it
// is there, when reading if the key comes next.
func (a *archive) field(key string, there bool) bool {
	if a.err != nil {
		return false
	}
	if !a.reading {
		if there {
			if a.out[len(a.out)-1] != '{' {
				a.out = append(a.out, ',')
			}
			a.out = append(append(append(a.out, '"'), key...), `":`...)
		}
		return there
	}
	b, i := a.in.b, a.in.i
	if b[i-1] != '{' { // an object was opened before, so there is one before i
		if a.in.next() != ',' {
			return false
		}
		i++
	}
	end := i + len(key) + len(`"":`)
	if end > len(b) || b[i] != '"' || string(b[i+1:end-2]) != key || b[end-2] != '"' || b[end-1] != ':' {
		return false
	}
	a.in.i = end
	return true
}

func number[T ~float64](a *archive, key string, p *T) {
	if !a.field(key, math.Float64bits(float64(*p)) != 0) {
		return
	}
	if a.reading {
		*p = T(a.readNumber())
	} else {
		a.writeNumber(float64(*p))
	}
}

func (a *archive) writeNumber(v float64) {
	switch {
	case math.IsInf(v, 1):
		a.out = append(a.out, `"inf"`...)
	case math.IsInf(v, -1):
		a.out = append(a.out, `"-inf"`...)
	default:
		a.out = appendNumber(a.out, v)
	}
}

func (a *archive) readNumber() float64 {
	switch {
	case a.in.word("null"):
		return math.NaN()
	case a.in.word(`"inf"`):
		return math.Inf(1)
	case a.in.word(`"-inf"`):
		return math.Inf(-1)
	}
	v, cause := a.in.number()
	if cause != "" {
		a.fail(cause)
	}
	return v
}

// vector carries the components themselves, so that no bit is lost to angles.
func vector(a *archive, key string, p *r3.Vector) {
	bits := math.Float64bits(p.X) | math.Float64bits(p.Y) | math.Float64bits(p.Z)
	if !a.field(key, bits != 0) {
		return
	}
	a.mark('[')
	for i, c := range [...]*float64{&p.X, &p.Y, &p.Z} {
		if i > 0 {
			a.mark(',')
		}
		if a.reading && a.err == nil {
			*c = a.readNumber()
		} else if a.err == nil {
			a.writeNumber(*c)
		}
	}
	a.mark(']')
}

func text[T ~string](a *archive, key string, p *T) {
	if a.field(key, *p != "") {
		line(a, p)
	}
}

// line carries a string that is an element.
func line[T ~string](a *archive, p *T) {
	switch {
	case a.err != nil:
	case a.reading:
		b, cause := a.in.text(nil)
		if cause != "" {
			a.fail(cause)
			return
		}
		*p = T(b)
	case !utf8.ValidString(string(*p)):
		a.fail("text that is not UTF-8: " + quote([]byte(*p)))
	default:
		a.out = appendString(a.out, *p)
	}
}

func flag(a *archive, key string, p *bool) {
	if !a.field(key, *p) {
		return
	}
	if a.reading {
		*p = true
		if !a.in.word("true") {
			a.fail("want true")
		}
		return
	}
	a.out = append(a.out, "true"...)
}

func whole[T ~int64 | ~uint64](a *archive, key string, p *T) {
	if !a.field(key, *p != 0) {
		return
	}
	// A conversion from a negative number would make it a large one.
	signed := T(0)-1 < 0
	if !a.reading {
		if signed {
			a.out = strconv.AppendInt(a.out, int64(*p), 10)
		} else {
			a.out = strconv.AppendUint(a.out, uint64(*p), 10)
		}
		return
	}
	from := a.in.i
	if _, cause := a.in.number(); cause != "" {
		a.fail(cause)
		return
	}
	token := string(a.in.b[from:a.in.i])
	var err error
	if signed {
		var n int64
		n, err = strconv.ParseInt(token, 10, 64)
		*p = T(n)
	} else {
		var n uint64
		n, err = strconv.ParseUint(token, 10, 64)
		*p = T(n)
	}
	if err != nil {
		a.fail("want a whole number")
	}
}

func instant(a *archive, key string, p *time.Time) {
	if !a.field(key, !p.IsZero()) {
		return
	}
	if a.reading {
		b, cause := a.in.text(nil)
		if cause == "" {
			*p, cause = scanTime(b, 0, 9999)
		}
		if cause != "" {
			a.fail(cause)
		}
		return
	}
	if y := p.UTC().Year(); y < 0 || y > 9999 {
		a.fail("an instant in the year " + strconv.Itoa(y))
		return
	}
	a.out = append(AppendTime(append(a.out, '"'), *p), '"')
}

// word carries one of a few values by its word. The first is the zero value.
func word[T ~uint8](a *archive, key string, p *T, words []string) {
	if a.field(key, *p != 0) {
		if int(*p) >= len(words) {
			a.fail(fmt.Sprintf("%s has no value %d", key, *p))
			return
		}
		oneOf(a, p, words)
	}
}

func oneOf[T ~uint8](a *archive, p *T, words []string) {
	if !a.reading {
		a.out = appendString(a.out, words[*p])
		return
	}
	b, cause := a.in.text(nil)
	if cause != "" {
		a.fail(cause)
		return
	}
	for i, w := range words {
		if w == string(b) {
			*p = T(i)
			return
		}
	}
	a.fail("no such word: " + quote(b))
}
