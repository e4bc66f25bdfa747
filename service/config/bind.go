package config

import (
	"reflect"
	"sort"
	"strconv"
	"strings"

	"gopkg.in/yaml.v3"

	"beamward/closures"
)

// binder fills the declared structs from a tree and gathers what is wrong.
type binder struct {
	problems []Problem
	where    map[string]at   // every value and section by its key
	spoiled  map[string]bool // sections whose values cannot be trusted for comparing
}

// union is a value with more than one shape.
type union interface {
	bind(b *binder, n *yaml.Node, key string, t tags)
	missing(b *binder, t tags) // takes the default, if there is one
	write(w *writer, t tags)
	schema(t tags) object
}

func (b *binder) refuse(line int, key, value, mend string) {
	b.problems = append(b.problems, Problem{Line: line, Key: key, Value: value, Mend: mend})
	b.spoiled[section(key)] = true
}

// section returns the top-level key and its entry, such as beams[north].
func section(key string) string {
	if i := strings.IndexByte(key, '.'); i >= 0 {
		if j := strings.IndexByte(key, '['); j < 0 || j > i {
			return key[:i]
		}
	}
	if i := strings.IndexByte(key, ']'); i >= 0 {
		return key[:i+1]
	}
	return key
}

// trusted reports whether a comparison between the keys means anything: no
// value in their sections was refused.
func (b *binder) trusted(keys ...string) bool {
	for _, k := range keys {
		s := section(k)
		for bad := range b.spoiled {
			if bad == "" || bad == s || strings.HasPrefix(bad, s+"[") || strings.HasPrefix(s, bad+"[") {
				return false
			}
		}
	}
	return true
}

// value binds one node to what v, a pointer, points to.
func (b *binder) value(v reflect.Value, n *yaml.Node, key string, t tags) {
	b.where[key] = at{key: key, line: n.Line}
	if n.Kind == yaml.AliasNode || n.Style&(yaml.LiteralStyle|yaml.FoldedStyle) != 0 {
		b.spoiled[section(key)] = true // refused with the tree
		return
	}
	if isNull(n) {
		b.refuse(n.Line, key, "", "it has no value: write one, or leave the key out")
		return
	}
	switch x := v.Interface().(type) {
	case union:
		x.bind(b, n, key, t)
		return
	case leaf:
		b.leaf(x, n, key, t)
		return
	}
	switch e := v.Elem(); e.Kind() {
	case reflect.Pointer:
		e.Set(reflect.New(e.Type().Elem()))
		b.value(e, n, key, t)
	case reflect.Struct:
		b.mapping(e, n, key)
	case reflect.Slice:
		b.sequence(e, n, key, t)
	case reflect.Map:
		b.named(e, n, key, t)
	}
}

func (b *binder) leaf(x leaf, n *yaml.Node, key string, t tags) {
	p := x.place()
	*p = at{key: key, text: n.Value, line: n.Line}
	b.where[key] = *p
	if n.Kind != yaml.ScalarNode {
		b.refuse(n.Line, key, "", "write one value here")
		return
	}
	if isQuoted(n) && !x.quotes() {
		b.refuse(n.Line, key, strconv.Quote(n.Value), x.read("", t))
		return
	}
	if mend := x.read(n.Value, t); mend != "" {
		b.refuse(n.Line, key, written(n), mend)
		return
	}
	p.has = true
}

// mapping binds the keys of one struct.
func (b *binder) mapping(v reflect.Value, n *yaml.Node, key string) {
	if n.Kind != yaml.MappingNode {
		b.refuse(n.Line, key, written(n), "write keys and values here: "+strings.Join(keysOf(v.Type()), ", "))
		return
	}
	given := map[string]*yaml.Node{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		k := n.Content[i]
		switch {
		case k.Kind != yaml.ScalarNode || k.Tag == "!!merge":
			if k.Kind != yaml.ScalarNode {
				b.refuse(k.Line, key, "", "write a plain word as the key")
			}
		case given[k.Value] != nil:
			b.refuse(k.Line, join(key, shown(k.Value)), "", "the key stands twice: keep one")
		default:
			given[k.Value] = n.Content[i+1]
		}
	}
	for i := 0; i < v.NumField(); i++ {
		t := tagsOf(v.Type().Field(i))
		child, at := given[t.key], join(key, t.key)
		delete(given, t.key)
		if !t.belongs(kindOf(v)) {
			if child != nil && kindOf(v) != "" {
				b.refuse(child.Line, at, "", "take it out: it belongs to kind "+either(t.only))
			}
			continue
		}
		if child == nil {
			b.absent(v.Field(i).Addr(), n.Line, at, t)
			continue
		}
		b.value(v.Field(i).Addr(), child, at, t)
	}
	known := keysOf(v.Type())
	for k, child := range given {
		mend := "there is no such key"
		if near := nearest(k, known); near != "" {
			mend += ": did you mean " + near + "?"
		} else {
			mend += ": make it one of " + strings.Join(known, ", ")
		}
		b.refuse(child.Line, join(key, shown(k)), "", mend)
	}
}

// absent gives a key that was left out its default, or misses it.
func (b *binder) absent(v reflect.Value, line int, key string, t tags) {
	if t.need {
		b.refuse(line, key, "", "it is missing: "+lowerFirst(strings.TrimSuffix(t.doc, ".")))
		return
	}
	switch x := v.Interface().(type) {
	case union:
		x.missing(b, t)
		return
	case leaf:
		*x.place() = at{key: key}
		if t.hasDef {
			if mend := x.read(t.def, t); mend != "" {
				b.refuse(line, key, t.def, mend)
				return
			}
			*x.place() = at{key: key, text: t.def, has: true}
		}
		b.where[key] = *x.place()
		return
	}
	if e := v.Elem(); e.Kind() == reflect.Struct {
		b.mapping(e, &yaml.Node{Kind: yaml.MappingNode, Line: line}, key)
	}
}

// maxEntries is the longest list that is read.
const maxEntries = 1000

func (b *binder) sequence(v reflect.Value, n *yaml.Node, key string, t tags) {
	if n.Kind != yaml.SequenceNode {
		b.refuse(n.Line, key, written(n), "write a list here")
		return
	}
	if len(n.Content) > maxEntries {
		b.refuse(n.Line, key, "", "write at most "+strconv.Itoa(maxEntries)+" entries")
		return
	}
	v.Set(reflect.MakeSlice(v.Type(), len(n.Content), len(n.Content)))
	for i, c := range n.Content {
		b.value(v.Index(i).Addr(), c, b.entry(v.Type().Elem(), c, key, i), t)
	}
}

// entry returns the key of a list's entry: its name in brackets, or # and its
// place, which no name can be.
func (b *binder) entry(elem reflect.Type, n *yaml.Node, key string, i int) string {
	byPlace := key + "[#" + strconv.Itoa(i+1) + "]"
	if elem.Kind() != reflect.Struct || n.Kind != yaml.MappingNode {
		return byPlace
	}
	for f := 0; f < elem.NumField(); f++ {
		t := tagsOf(elem.Field(f))
		if !t.label {
			continue
		}
		for j := 0; j+1 < len(n.Content); j += 2 {
			if n.Content[j].Value == t.key && n.Content[j+1].Kind == yaml.ScalarNode && closures.ValidName(n.Content[j+1].Value) && !isNull(n.Content[j+1]) {
				return key + "[" + n.Content[j+1].Value + "]"
			}
		}
		b.spoiled[section(key+"[]")] = true // rules know the entry by no name at all
	}
	return byPlace
}

// named binds a mapping whose keys are names of the site's choice.
func (b *binder) named(v reflect.Value, n *yaml.Node, key string, t tags) {
	if n.Kind != yaml.MappingNode {
		b.refuse(n.Line, key, written(n), "write names and values here")
		return
	}
	v.Set(reflect.MakeMap(v.Type()))
	for i := 0; i+1 < len(n.Content); i += 2 {
		k := n.Content[i]
		if k.Kind != yaml.ScalarNode || !closures.ValidName(k.Value) {
			b.refuse(k.Line, key, shown(k.Value), forms["name"].mend)
			continue
		}
		if v.MapIndex(reflect.ValueOf(k.Value)).IsValid() {
			b.refuse(k.Line, join(key, k.Value), "", "the key stands twice: keep one")
			continue
		}
		x := reflect.New(v.Type().Elem())
		b.value(x, n.Content[i+1], join(key, k.Value), t)
		v.SetMapIndex(reflect.ValueOf(k.Value), x.Elem())
	}
}

func keysOf(t reflect.Type) []string {
	var keys []string
	for i := 0; i < t.NumField(); i++ {
		keys = append(keys, tagsOf(t.Field(i)).key)
	}
	sort.Strings(keys)
	return keys
}

func join(key, child string) string {
	if key == "" {
		return child
	}
	return key + "." + child
}

func lowerFirst(s string) string {
	if s == "" {
		return s
	}
	if len(s) > 1 && s[1] >= 'A' && s[1] <= 'Z' { // an abbreviation
		return s
	}
	return strings.ToLower(s[:1]) + s[1:]
}
