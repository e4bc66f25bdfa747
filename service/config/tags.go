package config

import (
	"reflect"
	"strings"
)

// tags is what the declaration of one key says.
type tags struct {
	key, form, def, doc string
	words               []string
	need, hasDef, label bool
	only                []string // the kinds it belongs to; nil: all
}

func tagsOf(f reflect.StructField) tags {
	t := tags{
		key: f.Tag.Get("key"), form: f.Tag.Get("form"), doc: f.Tag.Get("doc"),
		need: f.Tag.Get("need") == "yes", label: f.Tag.Get("label") == "yes",
	}
	t.def, t.hasDef = f.Tag.Lookup("default")
	if w := f.Tag.Get("words"); w != "" {
		t.words = strings.Split(w, "|")
	}
	if o := f.Tag.Get("only"); o != "" {
		t.only = strings.Split(strings.TrimPrefix(o, "kind="), "|")
	}
	return t
}

// belongs reports whether the key belongs to an entry of the kind.
func (t *tags) belongs(kind string) bool {
	if t.only == nil {
		return true
	}
	for _, k := range t.only {
		if k == kind {
			return true
		}
	}
	return false
}

// kindOf returns what the struct's kind key says; empty without one.
func kindOf(v reflect.Value) string {
	if f := v.FieldByName("Kind"); f.IsValid() {
		return f.Interface().(text).value
	}
	return ""
}
