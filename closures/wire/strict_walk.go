package wire

import (
	"reflect"
	"strconv"
	"strings"
)

// shape is what a struct takes: its fields by key.
type shape struct {
	fields map[string]int // index into paths
	paths  [][]int
}

// shapeOf lists the fields of a struct as encoding/json names them. A field
// nearer the surface hides one of the same key within an embedded struct.
func (d *decoder) shapeOf(t reflect.Type) *shape {
	if s := d.shapes[t]; s != nil {
		return s
	}
	s := &shape{fields: map[string]int{}}
	level := [][]int{nil}
	for len(level) > 0 {
		var deeper [][]int
		for _, at := range level {
			in := t
			if len(at) > 0 {
				in = t.FieldByIndex(at).Type
			}
			for i := range in.NumField() {
				f := in.Field(i)
				name, _, _ := strings.Cut(f.Tag.Get("json"), ",")
				path := append(append([]int(nil), at...), i)
				switch {
				case f.Tag.Get("json") == "-":
				case f.Anonymous && name == "" && f.Type.Kind() == reflect.Struct:
					deeper = append(deeper, path)
				case !f.IsExported():
				default:
					if name == "" {
						name = f.Name
					}
					if _, hidden := s.fields[name]; !hidden {
						s.fields[name] = len(s.paths)
						s.paths = append(s.paths, path)
					}
				}
			}
		}
		level = deeper
	}
	d.shapes[t] = s
	return s
}

// members walks the members of the object that comes next. each is called with
// the value next; the key, which began at at, is already a step of the place.
func (d *decoder) members(each func(key string, at int) error) error {
	if d.next() != '{' {
		return d.fail("want an object")
	}
	if err := d.enter(); err != nil {
		return err
	}
	d.space()
	if d.take('}') {
		return nil
	}
	for {
		at := d.i
		key, cause := d.text(nil)
		if cause != "" {
			return d.wanted("a key", cause)
		}
		d.path = append(d.path, keyed(string(key)))
		d.space()
		if !d.take(':') {
			return d.fail("want a colon after the key")
		}
		d.space()
		if err := each(string(key), at); err != nil {
			return err
		}
		d.path = d.path[:len(d.path)-1]
		d.space()
		if d.take('}') {
			return nil
		}
		if !d.take(',') {
			return d.fail("want a comma or the end of the object")
		}
		d.space()
	}
}

// enter steps into an object or an array.
func (d *decoder) enter() error {
	if len(d.path) >= MaxDepth {
		return d.fail("more than " + strconv.Itoa(MaxDepth) + " levels deep")
	}
	d.i++
	return nil
}

func (d *decoder) twice(key string, at int) error {
	d.i = at
	return d.fail("the key " + quote([]byte(key)) + " is given twice")
}

func (d *decoder) object(v reflect.Value) error {
	s := d.shapeOf(v.Type())
	seen := make([]bool, len(s.paths))
	return d.members(func(key string, at int) error {
		i, known := s.fields[key]
		switch {
		case !known:
			d.i = at
			for name := range s.fields {
				if strings.EqualFold(name, key) {
					return d.fail("unknown key " + quote([]byte(key)) + ": case matters, it is written " + quote([]byte(name)))
				}
			}
			return d.fail("unknown key " + quote([]byte(key)))
		case seen[i]:
			return d.twice(key, at)
		}
		seen[i] = true
		return d.value(v.FieldByIndex(s.paths[i]))
	})
}

func (d *decoder) dictionary(v reflect.Value) error {
	if d.word("null") {
		v.SetZero()
		return nil
	}
	t := v.Type()
	m := reflect.MakeMap(t)
	err := d.members(func(key string, at int) error {
		k := reflect.ValueOf(key).Convert(t.Key())
		if m.MapIndex(k).IsValid() {
			return d.twice(key, at)
		}
		e := reflect.New(t.Elem()).Elem()
		if err := d.value(e); err != nil {
			return err
		}
		m.SetMapIndex(k, e)
		return nil
	})
	v.Set(m)
	return err
}

func (d *decoder) array(v reflect.Value) error {
	slice := v.Kind() == reflect.Slice
	if slice && d.word("null") {
		v.SetZero()
		return nil
	}
	if slice {
		v.Set(reflect.MakeSlice(v.Type(), 0, 0))
	}
	n := 0
	err := d.elements(func() error {
		if slice {
			v.Set(reflect.Append(v, reflect.Zero(v.Type().Elem())))
		} else if n >= v.Len() {
			return d.fail("want " + strconv.Itoa(v.Len()) + " elements")
		}
		n++
		return d.value(v.Index(n - 1))
	})
	if err == nil && !slice && n != v.Len() {
		return d.fail("want " + strconv.Itoa(v.Len()) + " elements")
	}
	return err
}

// elements walks the elements of the array that comes next.
func (d *decoder) elements(each func() error) error {
	if d.next() != '[' {
		return d.fail("want an array")
	}
	if err := d.enter(); err != nil {
		return err
	}
	d.space()
	if d.take(']') {
		return nil
	}
	for n := 0; ; n++ {
		d.path = append(d.path, step{index: n})
		if err := each(); err != nil {
			return err
		}
		d.path = d.path[:len(d.path)-1]
		d.space()
		if d.take(']') {
			return nil
		}
		if !d.take(',') {
			return d.fail("want a comma or the end of the array")
		}
		d.space()
	}
}

// anything decodes as encoding/json does into an empty interface.
func (d *decoder) anything(v reflect.Value) error {
	var value any
	var err error
	switch c := d.next(); {
	case c == '{':
		m := map[string]any{}
		err = d.dictionary(reflect.ValueOf(&m).Elem())
		value = m
	case c == '[':
		list := []any{}
		err = d.array(reflect.ValueOf(&list).Elem())
		value = list
	case c == '"':
		text, cause := d.text(nil)
		if cause != "" {
			return d.fail(cause)
		}
		value = string(text)
	case c == '-' || isDigit(c):
		number, cause := d.number()
		if cause != "" {
			return d.fail(cause)
		}
		value = number
	case d.word("true"):
		value = true
	case d.word("false"):
		value = false
	case d.word("null"):
		v.SetZero()
		return nil
	default:
		return d.fail("want a value")
	}
	if err != nil {
		return err
	}
	v.Set(reflect.ValueOf(value))
	return nil
}
