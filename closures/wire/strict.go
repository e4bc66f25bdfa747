package wire

import (
	"bytes"
	"encoding"
	"encoding/json"
	"errors"
	"fmt"
	"reflect"
	"strconv"
	"strings"
	"time"
	"unicode/utf8"
)

// MaxDepth is how deep objects and arrays may lie within each other.
const MaxDepth = 32

// StrictError says where a JSON text is not what was wanted, and why.
type StrictError struct {
	Line, Column int    // from 1; columns count characters
	Pointer      string // JSON pointer (RFC 6901) to the place, cut where it is long
	Cause        string
}

// Error names place and cause.
func (e *StrictError) Error() string {
	at := "line " + strconv.Itoa(e.Line) + ", column " + strconv.Itoa(e.Column)
	if e.Pointer != "" {
		at += " (" + e.Pointer + ")"
	}
	return at + ": " + e.Cause
}

// Strict decodes one JSON text into what into points to, whose value should be
// zero. It refuses what encoding/json lets pass: an unknown key, a key that
// differs in case, a key given twice, null for what cannot be null, an array of
// the wrong length, text after the value, more than MaxDepth levels, bytes that
// are not UTF-8, half a surrogate pair. Numbers follow ParseNumber; a time.Time
// follows ParseTime; a number for an integer has neither point nor exponent.
// Field names and embedded structs are those of encoding/json, whose options
// "string" and "omitzero" mean nothing here. Types with an UnmarshalJSON or
// UnmarshalText of their own are asked after these checks.
//
// After an error what into points to is zero, so that no half of a refused text
// is used. The error is a *StrictError unless into is unfit.
func Strict(data []byte, into any) error {
	v := reflect.ValueOf(into)
	if v.Kind() != reflect.Pointer || v.IsNil() {
		return errors.New("strict decoding: into must be a pointer that is not nil")
	}
	d := decoder{scanner: scanner{b: data}, shapes: map[reflect.Type]*shape{}}
	err := d.whole(v.Elem())
	if err != nil {
		v.Elem().SetZero()
	}
	return err
}

type decoder struct {
	scanner
	path   []step
	shapes map[reflect.Type]*shape
}

// step is one level of the place: a key, or an index that is not negative.
type step struct {
	key   string
	index int
}

func keyed(key string) step { return step{key: key, index: -1} }

func (d *decoder) whole(v reflect.Value) error {
	d.space()
	if err := d.value(v); err != nil {
		return err
	}
	d.space()
	if d.i != len(d.b) {
		return d.fail("text after the end of the value")
	}
	return nil
}

func (d *decoder) fail(cause string) error {
	before := d.b[:min(d.i, len(d.b))]
	start := bytes.LastIndexByte(before, '\n') + 1
	return &StrictError{
		Line: bytes.Count(before, []byte{'\n'}) + 1, Column: utf8.RuneCount(before[start:]) + 1,
		Pointer: d.pointer(), Cause: cause,
	}
}

var pointerEscapes = strings.NewReplacer("~", "~0", "/", "~1")

// pointer writes the place, its keys cleaned as quote does.
func (d *decoder) pointer() string {
	var b strings.Builder
	for _, s := range d.path {
		b.WriteByte('/')
		if s.index >= 0 {
			b.WriteString(strconv.Itoa(s.index))
		} else {
			b.WriteString(clean(pointerEscapes.Replace(s.key)))
		}
		if b.Len() > 4*maxQuoted {
			return b.String()[:4*maxQuoted] + "..."
		}
	}
	return b.String()
}

var (
	timeType = reflect.TypeFor[time.Time]()
	rawType  = reflect.TypeFor[json.RawMessage]()
)

// value decodes the value that comes next into v.
func (d *decoder) value(v reflect.Value) error {
	if d.i >= len(d.b) {
		return d.fail("the text ends where a value should be")
	}
	t := v.Type()
	if t == timeType {
		return d.instant(v)
	}
	if v.Kind() == reflect.Pointer {
		if d.word("null") {
			v.SetZero()
			return nil
		}
		v.Set(reflect.New(t.Elem()))
		return d.value(v.Elem())
	}
	if v.CanAddr() {
		switch u := v.Addr().Interface().(type) {
		case json.Unmarshaler:
			return d.custom(v, u)
		case encoding.TextUnmarshaler:
			return d.customText(u)
		}
	}
	switch v.Kind() {
	case reflect.Struct:
		return d.object(v)
	case reflect.Map:
		if t.Key().Kind() == reflect.String {
			return d.dictionary(v)
		}
	case reflect.Slice, reflect.Array:
		return d.array(v)
	case reflect.Interface:
		if t.NumMethod() == 0 {
			return d.anything(v)
		}
	case reflect.String, reflect.Bool, reflect.Float64, reflect.Float32,
		reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64,
		reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		return d.scalar(v)
	}
	return fmt.Errorf("strict decoding: a %v cannot be decoded into", t)
}

func (d *decoder) instant(v reflect.Value) error {
	at := d.i
	text, cause := d.text(nil)
	if cause != "" {
		return d.wanted("a time", cause)
	}
	t, cause := scanTime(text, FirstYear, LastYear)
	if cause != "" {
		d.i = at
		return d.fail("time " + quote(text) + ": " + cause)
	}
	v.Set(reflect.ValueOf(t))
	return nil
}

// wanted is the error for a value of another kind than what was wanted.
func (d *decoder) wanted(what, cause string) error {
	switch cause {
	case notString, notNumber:
		return d.fail("want " + what)
	}
	return d.fail(cause)
}

// raw walks the value that comes next with every check and returns its text.
func (d *decoder) raw() ([]byte, error) {
	from := d.i
	var any any
	if err := d.anything(reflect.ValueOf(&any).Elem()); err != nil {
		return nil, err
	}
	return d.b[from:d.i], nil
}

func (d *decoder) custom(v reflect.Value, u json.Unmarshaler) error {
	at := d.i
	raw, err := d.raw()
	if err != nil {
		return err
	}
	if v.Type() == rawType {
		v.SetBytes(bytes.Clone(raw))
		return nil
	}
	if err := u.UnmarshalJSON(raw); err != nil {
		d.i = at
		return d.fail(clean(err.Error()))
	}
	return nil
}

func (d *decoder) customText(u encoding.TextUnmarshaler) error {
	at := d.i
	text, cause := d.text(nil)
	if cause != "" {
		return d.wanted("a string", cause)
	}
	if err := u.UnmarshalText(text); err != nil {
		d.i = at
		return d.fail(clean(err.Error()))
	}
	return nil
}

func (d *decoder) scalar(v reflect.Value) error {
	at := d.i
	switch {
	case v.Kind() == reflect.String:
		text, cause := d.text(nil)
		if cause != "" {
			return d.wanted("a string", cause)
		}
		v.SetString(string(text))
	case v.Kind() == reflect.Bool:
		switch {
		case d.word("true"):
			v.SetBool(true)
		case d.word("false"):
			v.SetBool(false)
		default:
			return d.fail("want true or false")
		}
	case v.CanFloat():
		f, cause := d.number()
		if cause != "" {
			return d.wanted("a number", cause)
		}
		if v.OverflowFloat(f) {
			d.i = at
			return d.fail("too large")
		}
		v.SetFloat(f)
	default:
		_, cause := d.number()
		if cause != "" {
			return d.wanted("a whole number", cause)
		}
		token := string(d.b[at:d.i])
		var err error
		if v.CanInt() {
			var n int64
			if n, err = strconv.ParseInt(token, 10, v.Type().Bits()); err == nil {
				v.SetInt(n)
			}
		} else {
			var n uint64
			if n, err = strconv.ParseUint(token, 10, v.Type().Bits()); err == nil {
				v.SetUint(n)
			}
		}
		if err != nil {
			d.i = at
			return d.fail("want a whole number within the range of " + v.Kind().String())
		}
	}
	return nil
}
