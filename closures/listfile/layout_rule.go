package listfile

import (
	"fmt"
	"regexp"
	"slices"
	"strings"

	"gopkg.in/yaml.v3"

	"beamward/closures"
)

// written finds how a value is written.
func (c *compiler) written(v *value, as map[string]cell) {
	isTime, units := timeValues[v.name], unitsOfValue(v.name)
	how, ok := as[v.name]
	if !ok {
		how, ok = c.as[v.name]
	}
	switch {
	case !isTime && units == nil:
		if _, given := as[v.name]; given {
			c.d.addf(how.at, "take it out of as", "%s is neither a time nor an angle nor a duration", v.name)
		}
	case !ok:
		c.d.addf(v.at, "say in as how it is written", "nothing says how %s is written", v.name)
	case isTime:
		v.times = c.forms[string(how.text)]
		c.used[string(how.text)] = true
		if v.times == nil {
			c.d.addf(how.at, "define the form in times", "no form is named %s", quoted(how.text))
		}
	default:
		v.unit = parseUnit(string(how.text))
		if !slices.Contains(units, v.unit) {
			names := make([]string, len(units))
			for i, u := range units {
				names[i] = unitNames[u]
			}
			c.d.addf(how.at, "write one of "+strings.Join(names, ", "), "%s cannot be written in %s", v.name, quoted(how.text))
		}
	}
}

// rule reads one rule.
func (c *compiler) rule(n *yaml.Node) {
	r := rule{at: c.place(n)}
	if len(c.l.rules) == maxRules {
		c.d.stop(r.at, fmt.Sprintf("the layout has more than %d rules", maxRules), "join some of them")
		return
	}
	var match, each *yaml.Node
	var as, fixed map[string]cell
	before := c.d.total
	ok := c.mapping(n, "a rule", func(key string, at place, value *yaml.Node) {
		switch key {
		case "is":
			r.kind = ruleKind(c.choice(value, key, ruleKinds[1:]...) + 1)
		case "match":
			match = value
		case "each":
			each = value
		case "example":
			r.examples = c.examples(value)
		case "in":
			c.sequence(value, key, func(n *yaml.Node) {
				if t, ok := c.d.name(c.scalar(n), at, key); ok {
					r.in = append(r.in, string(t))
				}
			})
			if len(r.in) == 0 {
				c.d.add(at, "in names no section", "name some, or leave it out")
			}
		case "enter":
			if t, ok := c.d.name(c.scalar(value), at, key); ok {
				r.enter = string(t)
			}
		case "need":
			r.need = need(max(0, c.choice(value, key, "any", "some", "once")))
		case "as":
			as = c.words(value, key)
		case "shape":
			r.shape = closures.Shape(c.choice(value, key, "icrs", "horizon", "track", "whole_sky") + 1)
		case "observed":
			r.observed, _ = c.d.truth(c.scalar(value), key)
		case "midnight":
			r.midnight = midnight(max(0, c.choice(value, key, midnights[:]...)))
		case "values":
			fixed = c.words(value, key)
		case "words":
			c.stateWords(&r, value)
		default:
			c.d.unknownKey(at, []byte(key))
		}
	})
	if ok && r.kind == isNone && c.d.total == before {
		c.d.missing(r.at, "is")
	}
	if !ok || c.d.total > before {
		return
	}
	c.patterns(&r, match, each, as, fixed)
	if c.d.total == before {
		c.l.rules = append(c.l.rules, r)
	}
}

// stateWords reads what the text calls open and closed.
func (c *compiler) stateWords(r *rule, n *yaml.Node) {
	r.words = map[string]string{}
	for key, one := range c.words(n, "words") {
		if t := string(one.text); t == "open" || t == "closed" {
			r.words[key] = t
		} else {
			c.d.addf(one.at, "write closed or open", "words give %s, which is neither closed nor open", quoted(one.text))
		}
	}
}

// patterns compiles the expressions of a rule and finds how its values are
// written.
func (c *compiler) patterns(r *rule, match, each *yaml.Node, as, fixed map[string]cell) {
	allowed := valuesOf[r.kind]
	if match == nil {
		c.d.missing(r.at, "match")
		return
	}
	t, ok := c.word(match, "match")
	if !ok {
		return
	}
	if each != nil {
		allowed = append(slices.Clone(allowed), "spans")
	}
	r.match = c.pattern(t, c.place(match), allowed...)
	if each != nil {
		t, ok := c.word(each, "each")
		if !ok {
			return
		}
		p := c.pattern(t, c.place(each), "state", "from", "until", "for", "ref")
		if p.re == nil {
			return
		}
		// Not the whole of a line, but again and again from where the last ended.
		p.re = regexp.MustCompile(`\A(?:` + t + `)`)
		r.each = &p
	}
	for key, one := range fixed {
		if !slices.Contains(valuesOf[r.kind], key) || timeValues[key] || key == "region" || key == "ref" || key == "for" {
			c.d.addf(one.at, "give only what every such line has", "values cannot fix %s", quoted([]byte(key)))
			continue
		}
		r.fixed = append(r.fixed, value{name: key, text: string(one.text), at: one.at})
	}
	slices.SortFunc(r.fixed, func(a, b value) int { return strings.Compare(a.name, b.name) })
	seen := map[string]bool{}
	for _, all := range [...][]value{r.match.values, r.fixed, r.spans()} {
		for i := range all {
			if seen[all[i].name] {
				c.d.addf(all[i].at, "give it once", "%s is given twice", all[i].name)
			}
			seen[all[i].name] = true
			c.written(&all[i], as)
		}
	}
	for key, one := range as {
		if !seen[key] {
			c.d.addf(one.at, "take it out", "as names %s, which the rule does not have", quoted([]byte(key)))
		}
	}
	c.matchAll(&r.match, r.examples, r.at)
}

// valuesOf are the values that a line of each kind can have.
var valuesOf = [...][]string{
	isHead:   {"id", "authority", "issued", "covers_from", "covers_until", "covers_for", "replaces", "beams", "unlisted_sky", "window_count", "digest", "date"},
	isRegion: {"region", "ra", "dec", "radius", "az_from", "az_to", "el_from", "el_to", "throughout", "date"},
	isWindow: {"region", "ra", "dec", "radius", "az_from", "az_to", "el_from", "el_to", "state", "from", "until", "for", "ref", "date"},
	isPoint:  {"region", "at", "ra", "dec", "date"},
	isDate:   {"date"},
	isMark:   {},
	isIgnore: {},
}

var timeValues = map[string]bool{"issued": true, "covers_from": true, "covers_until": true, "from": true, "until": true, "at": true, "date": true}

// known reports whether some line can have a value of that name.
func known(name string) bool {
	for _, all := range valuesOf {
		if slices.Contains(all, name) {
			return true
		}
	}
	return false
}
