package config

import (
	"bytes"
	"reflect"
	"sort"
	"strconv"
	"strings"
)

// canonical writes every value in the declared order and its one form,
// defaults included, so that the text means the same to any later build.
func canonical(f *fileKeys) []byte {
	w := &writer{}
	w.mapping(reflect.ValueOf(f).Elem())
	return w.b.Bytes()
}

// writer writes block YAML, two spaces a level.
type writer struct {
	b      bytes.Buffer
	depth  int
	dashed bool // the next line is the first of a list's entry
}

func (w *writer) indent() {
	if w.dashed {
		w.b.WriteString(strings.Repeat("  ", w.depth-1) + "- ")
		w.dashed = false
		return
	}
	w.b.WriteString(strings.Repeat("  ", w.depth))
}

func (w *writer) line(key, value string) {
	w.indent()
	w.b.WriteString(key + ": " + value + "\n")
}

func (w *writer) item(value string) {
	w.dashed = true
	w.depth++
	w.indent()
	w.depth--
	w.b.WriteString(value + "\n")
}

func (w *writer) open(key string) {
	w.indent()
	w.b.WriteString(key + ":\n")
	w.depth++
}

// section writes a struct under its key, and nothing when there is nothing in
// it.
func (w *writer) section(key string, v reflect.Value) {
	if !stated(v) {
		return
	}
	w.open(key)
	w.mapping(v)
	w.depth--
}

func (w *writer) mapping(v reflect.Value) {
	addressable := reflect.New(v.Type()).Elem()
	addressable.Set(v)
	for i := 0; i < v.NumField(); i++ {
		t := tagsOf(v.Type().Field(i))
		if t.belongs(kindOf(v)) {
			w.value(addressable.Field(i), t)
		}
	}
}

func (w *writer) value(v reflect.Value, t tags) {
	switch x := v.Addr().Interface().(type) {
	case union:
		x.write(w, t)
		return
	case leaf:
		if x.place().has {
			w.line(t.key, x.write())
		}
		return
	}
	switch v.Kind() {
	case reflect.Pointer:
		if !v.IsNil() {
			w.section(t.key, v.Elem())
		}
	case reflect.Struct:
		w.section(t.key, v)
	case reflect.Slice:
		if v.Len() == 0 {
			return
		}
		w.open(t.key)
		for i := 0; i < v.Len(); i++ {
			w.entry(v.Index(i), t)
		}
		w.depth--
	case reflect.Map:
		if v.Len() == 0 {
			return
		}
		w.open(t.key)
		keys := make([]string, 0, v.Len())
		for _, k := range v.MapKeys() {
			keys = append(keys, k.String())
		}
		sort.Strings(keys)
		for _, k := range keys {
			x := v.MapIndex(reflect.ValueOf(k)).Interface().(text)
			w.line(strconv.Quote(k), x.write())
		}
		w.depth--
	}
}

func (w *writer) entry(v reflect.Value, t tags) {
	switch x := v.Addr().Interface().(type) {
	case union:
		x.write(w, t)
	case leaf:
		w.item(x.write())
	default:
		w.dashed = true
		w.depth++
		w.mapping(v)
		w.depth--
	}
}

// stated reports whether a struct has anything to write.
func stated(v reflect.Value) bool {
	probe := &writer{}
	probe.mapping(v)
	return probe.b.Len() > 0
}
