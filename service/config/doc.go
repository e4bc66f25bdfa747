// Package config reads what a site has decided: one strict YAML file, whole or
// not at all.
//
// The keys are declared once, as the structs of keys.go with their tags. The
// reader, the canonical text, the defaults and the JSON Schema all walk that
// one declaration, so that they cannot come to differ.
//
// The reader is strict because a setting that was misread can open a beam. A
// key that is unknown, doubled or without a value is refused, and so are
// anchors, aliases, merge keys, tags, a second document, numbers and times in
// any but one form, and text over 1 MiB. What cannot be met is refused too, by
// closures.Rules.Validate and by the rules of this package for listeners,
// feeds and access; nothing is repaired. As far as they can be told apart, all
// problems are reported at once, each with its line, key, value and mend.
//
// The canonical text states every value, defaults included, in one order and
// one form. Its SHA-256 is Rules.Digest; the record keeps the text, and a
// replay that parses it has equal rules, whatever a later build's defaults
// are. It names files that hold secrets but holds none.
//
// Parse reads no file beyond the text that it is given. The package keeps no
// state.
package config
