package config

import (
	"encoding/json"
	"reflect"
)

type object = map[string]any

// Schema returns the JSON Schema (draft 2020-12) of a configuration file. It
// knows names, shapes, words and defaults; whether numbers can be met, and
// what depends on another key, only Parse can tell.
func Schema() []byte {
	s := mappingSchema(reflect.TypeOf(fileKeys{}))
	s["$schema"] = "https://json-schema.org/draft/2020-12/schema"
	s["title"] = "beamward configuration"
	b, err := json.MarshalIndent(s, "", "  ")
	if err != nil { // the declarations hold strings, numbers and lists only
		return nil
	}
	return append(b, '\n')
}

func mappingSchema(t reflect.Type) object {
	properties, need := object{}, []string{}
	for i := 0; i < t.NumField(); i++ {
		tag := tagsOf(t.Field(i))
		p := valueSchema(reflect.New(t.Field(i).Type), tag)
		p["description"] = tag.doc
		if tag.only != nil {
			p["description"] = tag.doc + " Of kind " + either(tag.only) + "."
		}
		properties[tag.key] = p
		if tag.need && tag.only == nil {
			need = append(need, tag.key)
		}
	}
	s := object{"type": "object", "properties": properties, "additionalProperties": false}
	if len(need) > 0 {
		s["required"] = need
	}
	return s
}

// valueSchema describes what v, a pointer, points to.
func valueSchema(v reflect.Value, t tags) object {
	switch x := v.Interface().(type) {
	case union:
		return x.schema(t)
	case leaf:
		s := x.schema(t)
		if t.hasDef && x.read(t.def, t) == "" {
			s["default"] = x.native()
		}
		return s
	}
	switch e := v.Elem().Type(); e.Kind() {
	case reflect.Pointer:
		return valueSchema(reflect.New(e.Elem()), t)
	case reflect.Slice:
		t.hasDef = false
		return object{"type": "array", "items": valueSchema(reflect.New(e.Elem()), t), "maxItems": maxEntries}
	case reflect.Map:
		return object{
			"type":                 "object",
			"propertyNames":        object{"pattern": forms["name"].pattern},
			"additionalProperties": valueSchema(reflect.New(e.Elem()), t),
		}
	default:
		return mappingSchema(e)
	}
}

func (x *text) schema(t tags) object {
	if t.words != nil {
		return object{"enum": t.words}
	}
	s := object{"type": "string", "minLength": 1}
	if p := forms[t.form].pattern; p != "" {
		s["pattern"] = p
	}
	return s
}

func (x *number) schema(tags) object { return object{"type": "number"} }

func (x *whole) schema(tags) object { return object{"type": "integer", "minimum": 0} }

func (x *flag) schema(tags) object { return object{"type": "boolean"} }

func (x *duration) schema(tags) object {
	return object{"type": "string", "pattern": durationForm.String()}
}

func (x *instant) schema(tags) object {
	return object{"type": "string", "pattern": instantForm.String()}
}

// native gives a value as JSON has it.
func (x *text) native() any     { return x.value }
func (x *number) native() any   { return x.value }
func (x *whole) native() any    { return x.value }
func (x *flag) native() any     { return x.value }
func (x *duration) native() any { return x.write() }
func (x *instant) native() any  { return x.write() }
