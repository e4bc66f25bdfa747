package config_test

import (
	"encoding/json"
	"fmt"
	"regexp"
	"strings"
	"testing"

	"gopkg.in/yaml.v3"

	"beamward/service/config"
)

// The walker below knows the part of JSON Schema 2020-12 that the schema uses
// and nothing of how the schema is made.
type walker struct {
	t       *testing.T
	touched map[string]bool // keys of the schema that a value was checked by
}

func (w *walker) check(s map[string]any, v any, at string) []string {
	var wrong []string
	say := func(format string, args ...any) { wrong = append(wrong, at+": "+fmt.Sprintf(format, args...)) }
	for k := range s {
		switch k {
		case "$schema", "title", "description", "default", "type", "properties", "additionalProperties", "required", "enum", "const",
			"pattern", "minLength", "items", "prefixItems", "minItems", "maxItems", "uniqueItems", "oneOf", "propertyNames", "minimum":
		default:
			w.t.Fatalf("the schema uses %s, which this test does not know", k)
		}
	}
	if alternatives, ok := s["oneOf"].([]any); ok {
		fit := 0
		for _, a := range alternatives {
			if len(w.check(a.(map[string]any), v, at)) == 0 {
				fit++
			}
		}
		if fit != 1 {
			say("%d of the alternatives fit", fit)
		}
	}
	if c, ok := s["const"]; ok && c != v {
		say("want %v", c)
	}
	if e, ok := s["enum"].([]any); ok {
		found := false
		for _, x := range e {
			found = found || x == v
		}
		if !found {
			say("%v is none of %v", v, e)
		}
	}
	switch x := v.(type) {
	case map[string]any:
		if s["type"] != "object" && s["oneOf"] == nil {
			say("an object is not wanted")
			return wrong
		}
		properties, _ := s["properties"].(map[string]any)
		for k, child := range x {
			if p, ok := properties[k].(map[string]any); ok {
				w.touched[strings.TrimPrefix(at+"."+k, ".")] = true
				wrong = append(wrong, w.check(p, child, strings.TrimPrefix(at+"."+k, "."))...)
				continue
			}
			if p, ok := s["additionalProperties"].(map[string]any); ok {
				wrong = append(wrong, w.check(p, child, at+".*")...)
			} else if s["additionalProperties"] == false {
				say("unknown key %s", k)
			}
		}
		required, _ := s["required"].([]any)
		for _, k := range required {
			if _, ok := x[k.(string)]; !ok {
				say("%s is missing", k)
			}
		}
	case []any:
		if s["type"] != "array" && s["oneOf"] == nil {
			say("an array is not wanted")
			return wrong
		}
		if pair, ok := s["prefixItems"].([]any); ok {
			for i := range pair {
				if i < len(x) {
					wrong = append(wrong, w.check(pair[i].(map[string]any), x[i], at+"[]")...)
				}
			}
			if n := float64(len(x)); n < s["minItems"].(float64) || n > s["maxItems"].(float64) {
				say("%v items", n)
			}
		}
		for _, one := range x {
			if items, ok := s["items"].(map[string]any); ok {
				wrong = append(wrong, w.check(items, one, at+"[]")...)
			}
		}
	case string:
		if s["type"] != nil && s["type"] != "string" {
			say("a string is not wanted")
		}
		if p, ok := s["pattern"].(string); ok && !regexp.MustCompile(p).MatchString(x) {
			say("%q does not match %s", x, p)
		}
	case float64:
		if s["type"] != nil && s["type"] != "number" && !(s["type"] == "integer" && x == float64(int(x))) {
			say("a number is not wanted")
		}
	case bool:
		if s["type"] != nil && s["type"] != "boolean" {
			say("a boolean is not wanted")
		}
	default:
		say("%T", v)
	}
	return wrong
}

func schema(t *testing.T) map[string]any {
	t.Helper()
	var s map[string]any
	if err := json.Unmarshal(config.Schema(), &s); err != nil {
		t.Fatal(err)
	}
	return s
}

// plain gives a YAML text as JSON values.
func plain(t *testing.T, s string) any {
	t.Helper()
	var n yaml.Node
	if err := yaml.Unmarshal([]byte(s), &n); err != nil {
		t.Fatal(err)
	}
	var turn func(n *yaml.Node) any
	turn = func(n *yaml.Node) any {
		switch n.Kind {
		case yaml.MappingNode:
			m := map[string]any{}
			for i := 0; i < len(n.Content); i += 2 {
				m[n.Content[i].Value] = turn(n.Content[i+1])
			}
			return m
		case yaml.SequenceNode:
			list := []any{}
			for _, c := range n.Content {
				list = append(list, turn(c))
			}
			return list
		}
		var x any
		switch n.Tag {
		case "!!int", "!!float", "!!bool":
			if err := n.Decode(&x); err != nil {
				t.Fatal(err)
			}
			if i, ok := x.(int); ok {
				return float64(i)
			}
			return x
		}
		return n.Value
	}
	return turn(n.Content[0])
}

func TestSchemaTakesEverySite(t *testing.T) {
	w := &walker{t: t, touched: map[string]bool{}}
	s := schema(t)
	if s["$schema"] != "https://json-schema.org/draft/2020-12/schema" {
		t.Errorf("$schema is %v", s["$schema"])
	}
	for _, site := range []string{text(t, "beamward.yaml"), text(t, "full.yaml"), smallest} {
		for _, e := range w.check(s, plain(t, site), "") {
			t.Error(e)
		}
		c, err := parse(site)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range w.check(s, plain(t, string(c.Canonical())), "") {
			t.Error("canonical text:", e)
		}
	}
	// The full site shows every key, and every key is described.
	var walk func(s map[string]any, at string)
	walk = func(s map[string]any, at string) {
		if p, ok := s["properties"].(map[string]any); ok {
			for k, child := range p {
				key := strings.TrimPrefix(at+"."+k, ".")
				c := child.(map[string]any)
				if d, _ := c["description"].(string); len(d) < 10 || !strings.HasSuffix(d, ".") {
					t.Errorf("%s is not described: %q", key, d)
				}
				if !w.touched[key] {
					t.Errorf("%s is in no site of testdata", key)
				}
				walk(c, key)
			}
		}
		if items, ok := s["items"].(map[string]any); ok {
			walk(items, at+"[]")
		}
		if alternatives, ok := s["oneOf"].([]any); ok {
			for _, a := range alternatives {
				walk(a.(map[string]any), at)
			}
		}
	}
	walk(s, "")
}

func TestSchemaRefuses(t *testing.T) {
	s := schema(t)
	for name, site := range map[string]string{
		"an unknown section":      smallest + "weather: {}\n",
		"an unknown key":          strings.Replace(smallest, "name: Skerry", "nome: x, name: Skerry", 1),
		"a key that is missing":   strings.Replace(smallest, "    shutter_time: 500ms\n", "", 1),
		"a word":                  strings.Replace(smallest, "aim_of: beam", "aim_of: mount", 1),
		"a compound duration":     strings.Replace(smallest, "500ms", "1m30s", 1),
		"a number in quotes":      strings.Replace(smallest, "power_w: 22", `power_w: "22"`, 1),
		"a name with a slash":     strings.Replace(smallest, "catwalk", "cat/walk", 1),
		"a star of another kind":  strings.Replace(smallest, "sodium", "potassium", 1),
		"a listener by host name": smallest + "listen: skerry.invalid:1\n",
	} {
		w := &walker{t: t, touched: map[string]bool{}}
		if len(w.check(s, plain(t, site), "")) == 0 {
			t.Errorf("%s is taken", name)
		}
	}
}
