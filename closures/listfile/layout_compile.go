package listfile

import (
	"fmt"
	"regexp"
	"regexp/syntax"
	"slices"
	"strings"

	"gopkg.in/yaml.v3"
)

// compiler makes a layout of its YAML.
type compiler struct {
	*yamlReader
	l     *Layout
	forms map[string]timeForms
	as    map[string]cell // how values are written, for all rules
	used  map[string]bool // forms that some value has
}

// maxLayout bounds a layout's text, in bytes.
const maxLayout = 256 << 10

// CompileLayout compiles a layout. The error is a *LayoutError, which names
// every fault that could be found.
func CompileLayout(text []byte) (*Layout, error) {
	d := newDraft(Limits{}.filled())
	c := &compiler{yamlReader: &yamlReader{d: d}, l: &Layout{}, forms: map[string]timeForms{}, used: map[string]bool{}}
	if len(text) > maxLayout {
		d.stop(place{line: 1}, "the layout is larger than 256 KiB", "shorten it")
	} else if lines, ok := d.textLines(text); ok {
		c.lines = lines
		switch root := c.parse(text); {
		case root == nil:
		case root.Kind != yaml.MappingNode:
			d.stop(c.place(root), "the layout is not a mapping", "write it as keys and values")
		default:
			c.layout(root)
		}
	}
	if d.any() {
		r := d.refusal()
		return nil, &LayoutError{Lines: r.Lines, Total: r.Total}
	}
	return c.l, nil
}

// word returns a scalar's text; ok is false when it was reported.
func (c *compiler) word(n *yaml.Node, what string) (string, bool) {
	one := c.scalar(n)
	if one.kind == null {
		one.kind = nested
	}
	t, ok := c.d.wording(one, one.at, what)
	return string(t), ok
}

// choice returns the index of a scalar's text among words.
func (c *compiler) choice(n *yaml.Node, what string, words ...string) int {
	t, ok := c.word(n, what)
	if !ok {
		return -1
	}
	i := slices.Index(words, t)
	if i < 0 {
		c.d.addf(c.place(n), "write one of "+strings.Join(words, ", "), "%s %s is not known", what, quoted([]byte(t)))
	}
	return i
}

// words reads a mapping of words to words.
func (c *compiler) words(n *yaml.Node, what string) map[string]cell {
	m := map[string]cell{}
	c.mapping(n, what, func(key string, at place, value *yaml.Node) {
		if one := c.scalar(value); one.kind == bare || one.kind == quotedText {
			m[key] = one
		} else if one.kind != reported {
			c.d.add(at, what+" holds something that is not text", "write it as text")
		}
	})
	return m
}

func (c *compiler) layout(root *yaml.Node) {
	top := place{line: 1}
	var head, rules *yaml.Node
	var version bool
	c.mapping(root, "the layout", func(key string, at place, value *yaml.Node) {
		switch key {
		case "layout":
			version = true
			if t, ok := c.word(value, key); ok && t != "1" {
				c.d.addf(at, "write layout: 1", "layout %s is not a version that is read here", quoted([]byte(t)))
			}
		case "name":
			if t, ok := c.d.name(c.scalar(value), at, key); ok {
				c.l.name = string(t)
			}
		case "encoding":
			c.l.latin = c.choice(value, key, "utf-8", "latin-1") == 1
		case "zone":
			if t, ok := c.word(value, key); ok {
				if c.l.zone, c.l.hasZone = parseZone(t); !c.l.hasZone {
					c.d.addf(at, `write "+00:00" or another offset from UTC`, "zone %s is not an offset", quoted([]byte(t)))
				}
			}
		case "id_replace":
			if i := c.choice(value, key, "-", "_", "."); i >= 0 {
				c.l.replace = "-_."[i]
			}
		case "repeated_windows":
			c.l.dropRepeats = c.choice(value, key, "refuse", "drop") == 1
		case "times":
			c.times(value)
		case "as":
			c.as = c.words(value, key)
		case "head":
			head = value
		case "continuation":
			c.l.before = c.joint(value, key)
		case "continued":
			c.l.after = c.joint(value, key)
		case "lines":
			rules = value
		default:
			c.d.unknownKey(at, []byte(key))
		}
	})
	if !version {
		c.d.add(top, "layout is missing", "begin with layout: 1")
	}
	if c.l.name == "" && !c.d.any() {
		c.d.missing(top, "name")
	}
	if head != nil {
		c.constants(head)
	}
	if rules == nil {
		c.d.missing(top, "lines")
		return
	}
	c.sequence(rules, "lines", c.rule)
	for key, one := range c.as {
		if !known(key) {
			c.d.addf(one.at, "name a value that lines have", "as names %s, which is no value", quoted([]byte(key)))
		}
	}
	for name, forms := range c.forms {
		if !c.used[name] && !c.d.any() {
			c.d.addf(place{line: forms[0].line}, "take it out, or name it in as", "no value is written in the form %s", quoted([]byte(name)))
		}
	}
	if !c.d.any() {
		c.check()
	}
}

// times reads the named forms.
func (c *compiler) times(n *yaml.Node) {
	c.mapping(n, "times", func(key string, at place, value *yaml.Node) {
		one := func(n *yaml.Node) {
			t, ok := c.word(n, "a form")
			if !ok {
				return
			}
			f, cause := parseForm(t)
			if cause != "" {
				c.d.addf(c.place(n), "see the words that forms have", "%s: %s", quoted([]byte(t)), cause)
				return
			}
			f.line = at.line
			c.forms[key] = append(c.forms[key], f)
		}
		if value.Kind == yaml.SequenceNode {
			c.sequence(value, key, one)
		} else {
			one(value)
		}
		for _, f := range c.forms[key] {
			if f.has&hasAnyDay != c.forms[key][0].has&hasAnyDay || f.has&hasHour != c.forms[key][0].has&hasHour || f.has&hasYear != c.forms[key][0].has&hasYear {
				c.d.add(at, "the forms of one name say different parts of a time", "give them different names")
				break
			}
		}
		if parseUnit(key) != unitNone {
			c.d.addf(at, "use another name", "%s is the name of a unit", quoted([]byte(key)))
		}
	})
}

// joint reads how lines are joined.
func (c *compiler) joint(n *yaml.Node, what string) *joint {
	j := &joint{with: " "}
	var examples []cell
	ok := c.mapping(n, what, func(key string, at place, value *yaml.Node) {
		switch key {
		case "match":
			if t, ok := c.word(value, key); ok {
				j.match = c.pattern(t, c.place(value), "text")
			}
		case "example":
			examples = c.examples(value)
		case "with":
			if t, ok := c.word(value, key); ok {
				j.with = t
			}
		default:
			c.d.unknownKey(at, []byte(key))
		}
	})
	at := c.place(n)
	if !ok || j.match.re == nil {
		if ok && !c.d.any() {
			c.d.missing(at, "match")
		}
		return nil
	}
	if len(j.match.values) != 1 {
		c.d.add(at, "the expression has no group `text`", "name what is kept of the line (?P<text>…)")
		return nil
	}
	c.matchAll(&j.match, examples, at)
	return j
}

func (c *compiler) examples(n *yaml.Node) (all []cell) {
	add := func(n *yaml.Node) {
		if one := c.scalar(n); one.kind == bare || one.kind == quotedText {
			all = append(all, one)
		} else if one.kind != reported {
			c.d.add(c.place(n), "an example that is not text", "write it in quotes")
		}
	}
	if n.Kind == yaml.SequenceNode {
		c.sequence(n, "example", add)
	} else {
		add(n)
	}
	return all
}

// matchAll holds a pattern against its examples.
func (c *compiler) matchAll(p *pattern, examples []cell, at place) {
	if len(examples) == 0 {
		c.d.add(at, "the rule has no example", "give a line that it takes, word for word")
	}
	if len(examples) > maxExamples {
		c.d.add(at, fmt.Sprintf("the rule has more than %d examples", maxExamples), "keep those that differ")
		return
	}
	for _, e := range examples {
		if p.re != nil && !p.re.Match(e.text) {
			c.d.add(e.at, "the expression does not match its example", "correct one of them; an expression that matches nothing is of no use")
		}
	}
}

// pattern compiles an expression, which must match a whole line, and checks
// that its groups are among the values allowed.
func (c *compiler) pattern(expression string, at place, allowed ...string) (p pattern) {
	if len(expression) > maxExpression {
		c.d.add(at, fmt.Sprintf("the expression is longer than %d bytes", maxExpression), "make several rules of it")
		return p
	}
	whole := `\A(?:` + expression + `)\z`
	tree, err := syntax.Parse(expression, syntax.Perl)
	if err != nil {
		what := strings.TrimPrefix(err.Error(), "error parsing regexp: ")
		c.d.addf(at, "see the syntax of RE2", "the expression is not one: %s", strings.ReplaceAll(shown([]byte(what), 120), `\\`, `\`))
		return p
	}
	prog, err := syntax.Compile(tree.Simplify())
	if err != nil || len(prog.Inst) > maxWeight {
		c.d.addf(at, "write fewer or smaller repetitions", "the expression is too heavy: more than %d steps", maxWeight)
		return p
	}
	re, err := regexp.Compile(whole)
	if err != nil {
		c.d.add(at, "the expression cannot be compiled", "simplify it")
		return p
	}
	p.re, p.weight = re, len(prog.Inst)
	if bare, err := regexp.Compile(expression); err == nil {
		p.prefix, _ = bare.LiteralPrefix()
	}
	if c.l.weight += p.weight; c.l.weight > maxWeights && !c.d.full {
		c.d.stop(at, fmt.Sprintf("the layout's expressions are too heavy together: more than %d steps", maxWeights), "write fewer or smaller ones")
	}
	for i, name := range re.SubexpNames() {
		switch {
		case i == 0:
		case name == "":
			c.d.add(at, "a group without a name", "write (?:…), or name it (?P<name>…)")
		case !slices.Contains(allowed, name):
			c.d.addf(at, "use one of "+strings.Join(allowed, ", "), "the group %s is no value that this line can have", quoted([]byte(name)))
		case slices.ContainsFunc(p.values, func(v value) bool { return v.name == name }):
			c.d.addf(at, "name each group once", "the group %s stands twice", quoted([]byte(name)))
		default:
			p.values = append(p.values, value{name: name, group: i, at: at})
		}
	}
	return p
}

// constants reads what the text does not say of its head.
func (c *compiler) constants(n *yaml.Node) {
	for key, one := range c.words(n, "head") {
		v := value{name: key, text: string(one.text), at: one.at}
		if !slices.Contains(valuesOf[isHead], key) || key == "date" || key == "digest" || key == "window_count" {
			c.d.addf(one.at, "give only what can be the same for every text", "head cannot fix %s", quoted([]byte(key)))
			continue
		}
		c.written(&v, nil)
		c.l.head = append(c.l.head, v)
	}
	slices.SortFunc(c.l.head, func(a, b value) int { return strings.Compare(a.name, b.name) })
}
