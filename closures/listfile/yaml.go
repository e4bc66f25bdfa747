package listfile

import (
	"bytes"
	"errors"
	"io"
	"regexp"
	"strconv"
	"strings"

	"gopkg.in/yaml.v3"
)

// yamlReader reads the native YAML form from a tree of nodes. The tree keeps
// each scalar as it stood, so numbers and times are read by the same grammar
// as in the other formats and not by YAML's own.
type yamlReader struct {
	d     *draft
	lines [][]byte
}

// readYAML reads a whole list. The error is the reader's own; what is wrong
// with the list is in d.
func readYAML(d *draft, r io.Reader, report *Report) error {
	limit := min(d.limits.Bytes, yamlBytes)
	d.limits.Windows = min(d.limits.Windows, yamlWindows)
	d.smaller = "send it as CSV, or split it"
	all, err := io.ReadAll(io.LimitReader(r, limit+1))
	report.Bytes = int64(len(all))
	if err != nil {
		return err
	}
	if int64(len(all)) > limit {
		d.stop(place{}, "a YAML list is at most 16 MiB", d.smaller)
		return nil
	}
	lines, ok := d.textLines(all)
	report.Lines = len(lines)
	if !ok {
		return nil
	}
	items := 0
	for _, c := range all {
		if c == ',' || c == '{' || c == '[' || c == '\n' {
			items++
		}
	}
	if items > yamlItems {
		d.stop(place{}, "a YAML list has at most 1,000,000 lines, braces, brackets and commas", d.smaller)
		return nil
	}
	y := &yamlReader{d: d, lines: lines}
	d.line = y.lineText
	root := y.parse(all)
	if root != nil {
		y.list(root)
	}
	return nil
}

// textLines parts a whole text into lines and checks each; when one cannot
// stand in a list nothing more is made of the text.
func (d *draft) textLines(all []byte) (lines [][]byte, ok bool) {
	lines = bytes.Split(all, []byte("\n"))
	if len(lines[len(lines)-1]) == 0 {
		lines = lines[:len(lines)-1]
	}
	for i, line := range lines {
		line = bytes.TrimSuffix(line, []byte("\r"))
		lines[i] = line
		if cause, mend := badText(line); cause != "" {
			d.add(place{i + 1, line}, "the line holds "+cause, mend)
			d.full = true
		}
	}
	return lines, !d.full
}

func (y *yamlReader) lineText(n int) []byte {
	if n < 1 || n > len(y.lines) {
		return nil
	}
	return y.lines[n-1]
}

func (y *yamlReader) place(n *yaml.Node) place { return place{n.Line, y.lineText(n.Line)} }

// parse makes the tree of the only document; nil when there is none.
func (y *yamlReader) parse(all []byte) (root *yaml.Node) {
	defer func() {
		if recover() != nil { // a fault of the YAML library: the text is refused like any that it cannot read
			y.d.stop(place{}, "the text cannot be read as YAML", "simplify it, or send it as JSON or CSV")
			root = nil
		}
	}()
	var doc, second yaml.Node
	decoder := yaml.NewDecoder(bytes.NewReader(all))
	err := decoder.Decode(&doc)
	switch {
	case errors.Is(err, io.EOF):
		y.d.stop(place{line: 1}, "the text is empty", "write a closure list")
		return nil
	case err != nil:
		y.syntax(err)
		return nil
	}
	if err := decoder.Decode(&second); err == nil {
		y.d.stop(y.place(&second), "a second document follows the list", "send one list in one text")
		return nil
	} else if !errors.Is(err, io.EOF) {
		y.syntax(err)
		return nil
	}
	return doc.Content[0]
}

// syntax reports what the YAML library says, whose messages are fixed text but
// for names of anchors and tags.
func (y *yamlReader) syntax(err error) {
	line := regexp.MustCompile(`^line (\d+): `)
	parser := regexp.MustCompile(`^did not find expected (<|node content|'-' indicator|key|',' or)`)
	message := strings.TrimPrefix(err.Error(), "yaml: ")
	at := place{}
	if m := line.FindStringSubmatch(message); m != nil {
		message = message[len(m[0]):]
		at.line, _ = strconv.Atoi(m[1])
		if parser.MatchString(message) { // the library counts these from 0
			at.line++
		}
		at.line = min(at.line, len(y.lines)) // the end of the text
		at.text = y.lineText(at.line)
	}
	y.d.stop(at, "not well-formed YAML: "+shown([]byte(message), 120), "correct it on this line or a later one; nothing was read")
}

// plain refuses what native lists leave out of YAML.
func (y *yamlReader) plain(n *yaml.Node) bool {
	switch {
	case n.Kind == yaml.AliasNode:
		y.d.add(y.place(n), "an alias", "write the value out")
	case n.Anchor != "":
		y.d.add(y.place(n), "an anchor", "take it out and write each value out")
	case n.Style&yaml.TaggedStyle != 0:
		y.d.add(y.place(n), "a tag", "take it out")
	case n.Style&(yaml.LiteralStyle|yaml.FoldedStyle) != 0:
		y.d.add(y.place(n), "a block of text", "write the value on one line")
	default:
		return true
	}
	return false
}

// scalar makes a cell of a node.
func (y *yamlReader) scalar(n *yaml.Node) cell {
	c := cell{kind: bare, text: []byte(n.Value), at: y.place(n)}
	switch {
	case !y.plain(n):
		c.kind = reported
	case n.Kind != yaml.ScalarNode:
		c.kind, c.text = nested, nil
	case n.Style&(yaml.DoubleQuotedStyle|yaml.SingleQuotedStyle) != 0:
		c.kind = quotedText
	case n.Tag == "!!null":
		c.kind = null
	}
	return c
}

// mapping hands each key and its value on; ok is false when the node is no
// mapping or one of its keys was refused.
func (y *yamlReader) mapping(n *yaml.Node, what string, each func(key string, at place, value *yaml.Node)) (ok bool) {
	if !y.plain(n) {
		return false
	}
	if n.Kind != yaml.MappingNode {
		y.d.add(y.place(n), what+" is not a mapping", "write it as keys and values")
		return false
	}
	ok = true
	var few [16]string
	seen := few[:0]
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], n.Content[i+1]
		at := y.place(key)
		if !y.plain(key) {
			ok = false
			continue
		}
		if key.Kind != yaml.ScalarNode {
			y.d.add(at, "a key that is no word", "write keys and values")
			ok = false
			continue
		}
		twice := false
		for _, k := range seen {
			twice = twice || k == key.Value
		}
		if twice {
			y.d.twice(at, []byte(key.Value))
			ok = false
			continue
		}
		if len(seen) < cap(few) { // no mapping of a list has as many keys
			seen = append(seen, key.Value)
		}
		each(key.Value, at, value)
	}
	return ok
}

// sequence hands each item on.
func (y *yamlReader) sequence(n *yaml.Node, what string, each func(item *yaml.Node)) (ok bool) {
	if !y.plain(n) {
		return false
	}
	if n.Kind != yaml.SequenceNode {
		y.d.add(y.place(n), what+" is not a sequence", "write it as a sequence")
		return false
	}
	for _, item := range n.Content {
		if y.d.full {
			return false
		}
		each(item)
	}
	return true
}

// cells reads a mapping of scalars into the cells that a function names.
func (y *yamlReader) cells(n *yaml.Node, what string, dst func(key string) *cell) bool {
	good := true
	ok := y.mapping(n, what, func(key string, at place, value *yaml.Node) {
		to := dst(key)
		if to == nil {
			y.d.unknownKey(at, []byte(key))
			good = false
			return
		}
		*to = y.scalar(value)
	})
	return ok && good
}
