package config

import (
	"reflect"
	"strings"

	"gopkg.in/yaml.v3"

	"beamward/closures"
)

// guideStar is the word sodium, or the heights of a Rayleigh star.
type guideStar struct {
	rayleigh *rayleighKeys
}

const guideStarMend = "make it sodium or {rayleigh: {from_m: 10000, until_m: 20000}}"

// rayleighForm is the mapping that stands for a Rayleigh star.
type rayleighForm struct {
	Rayleigh rayleighKeys `key:"rayleigh" need:"yes" doc:"Heights of a Rayleigh star."`
}

func (g *guideStar) bind(b *binder, n *yaml.Node, key string, _ tags) {
	switch {
	case n.Kind == yaml.MappingNode:
		var f rayleighForm
		b.mapping(reflect.ValueOf(&f).Elem(), n, key)
		g.rayleigh = &f.Rayleigh
	case n.Kind == yaml.ScalarNode && n.Value == "sodium":
		b.where[key] = at{key: key, text: n.Value, line: n.Line}
	default:
		b.refuse(n.Line, key, written(n), guideStarMend)
	}
}

func (g *guideStar) missing(*binder, tags) {}

func (g *guideStar) write(w *writer, t tags) {
	if g.rayleigh == nil {
		w.line(t.key, `"sodium"`)
		return
	}
	w.section(t.key, reflect.ValueOf(rayleighForm{Rayleigh: *g.rayleigh}))
}

func (g *guideStar) schema(tags) object {
	return object{"oneOf": []object{
		{"const": "sodium"},
		mappingSchema(reflect.TypeOf(rayleighForm{})),
	}}
}

// codeList is the word all, or a list of reason codes.
type codeList struct {
	codes closures.Codes
}

// causes are the codes that can be listed: the latch's own are no causes.
func causes() []string {
	return closures.AllCodes.Without(closures.CodeReopening).Without(closures.CodeRearm).Names()
}

func (l *codeList) bind(b *binder, n *yaml.Node, key string, _ tags) {
	if n.Kind == yaml.ScalarNode && n.Value == "all" {
		b.where[key] = at{key: key, text: n.Value, line: n.Line}
		l.codes = closures.AllCodes
		return
	}
	if n.Kind != yaml.SequenceNode {
		b.refuse(n.Line, key, written(n), "make it all, or a list of "+strings.Join(causes(), ", "))
		return
	}
	for _, c := range n.Content {
		code, ok := closures.ParseCode(c.Value)
		switch {
		case c.Kind != yaml.ScalarNode || !ok || code == closures.CodeReopening || code == closures.CodeRearm:
			b.refuse(c.Line, key, written(c), "make each one of "+strings.Join(causes(), ", "))
		case l.codes.Has(code):
			b.refuse(c.Line, key, c.Value, "the code stands twice: keep one")
		default:
			l.codes = l.codes.With(code)
		}
	}
}

func (l *codeList) missing(_ *binder, t tags) {
	for _, s := range strings.Split(t.def, ", ") {
		if c, ok := closures.ParseCode(s); ok {
			l.codes = l.codes.With(c)
		}
	}
}

func (l *codeList) write(w *writer, t tags) {
	if l.codes == closures.AllCodes {
		w.line(t.key, `"all"`)
		return
	}
	names := l.codes.Names()
	for i := range names {
		names[i] = `"` + names[i] + `"`
	}
	w.line(t.key, "["+strings.Join(names, ", ")+"]")
}

func (l *codeList) schema(t tags) object {
	return object{
		"oneOf": []object{
			{"const": "all"},
			{"type": "array", "items": object{"enum": causes()}, "uniqueItems": true},
		},
		"default": strings.Split(t.def, ", "),
	}
}

// band is a pair of wavelengths.
type band struct {
	from, until number
}

func (p *band) bind(b *binder, n *yaml.Node, key string, t tags) {
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		b.refuse(n.Line, key, written(n), "write each as [from, until]")
		return
	}
	b.value(reflect.ValueOf(&p.from), n.Content[0], key, t)
	b.value(reflect.ValueOf(&p.until), n.Content[1], key, t)
}

func (p *band) missing(*binder, tags) {}

func (p *band) write(w *writer, _ tags) {
	w.item("[" + p.from.write() + ", " + p.until.write() + "]")
}

func (p *band) schema(t tags) object {
	return object{"type": "array", "prefixItems": []object{p.from.schema(t), p.until.schema(t)}, "minItems": 2, "maxItems": 2}
}
