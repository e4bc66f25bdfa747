package config

import (
	"bytes"
	"errors"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// MaxText is the longest text that is read, in bytes.
const MaxText = 1 << 20

// tree reads the text as one YAML document and returns its top, checked to use
// nothing but mappings, sequences and scalars. With no top the problems say
// why.
func tree(text []byte) (top *yaml.Node, problems []Problem) {
	if len(text) > MaxText {
		return nil, []Problem{{Mend: "the text is over " + strconv.Itoa(MaxText) + " bytes: a configuration is short"}}
	}
	for i, line := range bytes.Split(text, []byte("\n")) {
		if !utf8.Valid(line) || bytes.ContainsRune(line, 0) || bytes.ContainsRune(line, '\uFEFF') {
			return nil, []Problem{{Line: i + 1, Mend: "the text is not plain UTF-8: save it as UTF-8 without a byte order mark"}}
		}
	}
	d := yaml.NewDecoder(bytes.NewReader(text))
	var doc, more yaml.Node
	switch err := next(d, &doc); {
	case errors.Is(err, io.EOF):
		return nil, []Problem{{Mend: "the text is empty"}}
	case err != nil:
		return nil, []Problem{notYAML(err)}
	}
	if err := next(d, &more); err == nil {
		return nil, []Problem{{Line: more.Line, Mend: "a second document starts here: keep to one"}}
	} else if !errors.Is(err, io.EOF) {
		return nil, []Problem{notYAML(err)}
	}
	if len(doc.Content) != 1 || isNull(doc.Content[0]) {
		return nil, []Problem{{Mend: "the text is empty"}}
	}
	top = doc.Content[0]
	return top, plainOnly(top, nil)
}

// next decodes a document. The library panics on some broken texts; such a
// text is refused like any other that it cannot read.
func next(d *yaml.Decoder, into *yaml.Node) (err error) {
	defer func() {
		if recover() != nil {
			err = errors.New("it cannot be read")
		}
	}()
	return d.Decode(into)
}

var yamlLine = regexp.MustCompile(`^line ([0-9]{1,9}): `)

func notYAML(err error) Problem {
	p := Problem{}
	s := strings.TrimPrefix(err.Error(), "yaml: ")
	if m := yamlLine.FindStringSubmatch(s); m != nil {
		p.Line, _ = strconv.Atoi(m[1])
		s = s[len(m[0]):]
	}
	p.Mend = "this is not YAML: " + shown(s)
	return p
}

// plainOnly refuses what lets a text mean something other than it shows.
func plainOnly(n *yaml.Node, ps []Problem) []Problem {
	if n.Kind == yaml.AliasNode {
		return append(ps, Problem{Line: n.Line, Value: "*" + shown(n.Value), Mend: "write the value out: aliases are not read"})
	}
	if n.Anchor != "" {
		ps = append(ps, Problem{Line: n.Line, Value: "&" + shown(n.Anchor), Mend: "take it out: anchors are not read"})
	}
	if n.Style&yaml.TaggedStyle != 0 {
		ps = append(ps, Problem{Line: n.Line, Value: shown(n.Tag), Mend: "take it out: tags are not read"})
	}
	if n.Style&(yaml.LiteralStyle|yaml.FoldedStyle) != 0 {
		ps = append(ps, Problem{Line: n.Line, Mend: "write the value on one line: blocks of text are not read"})
	}
	if n.Kind == yaml.MappingNode {
		for i := 0; i < len(n.Content); i += 2 {
			if k := n.Content[i]; k.Kind == yaml.ScalarNode && k.Tag == "!!merge" {
				ps = append(ps, Problem{Line: k.Line, Value: "<<", Mend: "write the keys out: merge keys are not read"})
			}
		}
	}
	for _, c := range n.Content {
		ps = plainOnly(c, ps)
	}
	return ps
}

func isNull(n *yaml.Node) bool {
	return n.Kind == yaml.ScalarNode && n.Tag == "!!null" && n.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle) == 0
}

func isQuoted(n *yaml.Node) bool {
	return n.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle) != 0
}

// written shows what a node holds, if that is one value.
func written(n *yaml.Node) string {
	if n.Kind != yaml.ScalarNode {
		return ""
	}
	return shown(n.Value)
}
