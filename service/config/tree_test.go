package config_test

import (
	"strings"
	"testing"
	"unicode/utf8"

	"beamward/service/config"
)

// Texts made to cost or to break: each is refused, and none takes the program
// with it.
func TestHostileTexts(t *testing.T) {
	deep := 1 << 19
	for name, s := range map[string]string{
		"too long":            smallest + "#" + strings.Repeat("x", config.MaxText),
		"deep sequences":      strings.Repeat("[", deep),
		"deep mappings":       strings.Repeat("{a: ", deep/4),
		"deep blocks":         strings.Repeat("- ", deep/2) + "a",
		"alias bomb":          "a: &a [x, x]\nb: &b [*a, *a]\nc: &c [*b, *b]\nsite: *c\n",
		"alias to itself":     "site: &a {name: *a}\n",
		"many unknown keys":   smallest + many("k%: 1\n", 20000),
		"one key many times":  strings.Repeat("listen: 127.0.0.1:1\n", 20000),
		"many feeds":          smallest + "feeds:\n" + strings.Repeat("- {kind: mode-s}\n", 1001),
		"long line":           strings.Replace(smallest, "Skerry Peak", strings.Repeat("s", 1001), 1),
		"many long words":     smallest + many(strings.Repeat("y", 200)+"%: 1\n", 2000),
		"nul":                 smallest + "\x00",
		"not UTF-8":           smallest + "# \xff\n",
		"UTF-16":              "\xff\xfes\x00i\x00t\x00e\x00",
		"question keys":       "? {a: b}\n: c\n",
		"list as a key":       "[a, b]: c\n",
		"alias as a key":      "a: &a x\n*a : y\n",
		"tagged section":      strings.Replace(smallest, "site: {", "site: !!map {", 1),
		"tagged key":          strings.Replace(smallest, "site: {", "!!str site: {", 1),
		"binary":              strings.Replace(smallest, "Skerry Peak", "!!binary U2tlcnJ5", 1),
		"null in a list":      strings.Replace(smallest, "sources: [", "sources: [~, ", 1),
		"escaped control":     strings.Replace(smallest, "Skerry Peak", `"Skerry\u202ePeak"`, 1),
		"comment then nought": "# \n---\n# \n",
		"document end":        smallest + "...\n---\n" + smallest,
		"second is broken":    smallest + "...\n--- {\n",
		"directive":           "%TAG ! tag:skerry.invalid,2031:\n---\nsite: !x {}\n",
	} {
		c, err := parse(s)
		if err == nil || c != nil {
			t.Errorf("%s is taken", name)
			continue
		}
		if strings.ContainsAny(err.Error(), "\x00\u202e") || !utf8.ValidString(err.Error()) {
			t.Errorf("%s: the message passes on what it refused: %.200q", name, err)
		}
	}
}

func many(line string, n int) string {
	var b strings.Builder
	for i := range n {
		b.WriteString(strings.Replace(line, "%", strings.Repeat("j", i%7)+string(rune('a'+i%26))+strings.Repeat("q", i/182), 1))
		if b.Len() > config.MaxText-1000 {
			break
		}
	}
	return b.String()
}

// What cannot be read twice in two ways is taken once in each.
func TestHarmlessForms(t *testing.T) {
	for name, s := range map[string]string{
		"quoted text":     strings.Replace(smallest, "Skerry Peak", `"Skerry Peak"`, 1),
		"quoted key":      strings.Replace(smallest, "site: {", `"site": {`, 1),
		"quoted duration": strings.Replace(smallest, "500ms", `"500ms"`, 1),
		"document start":  "---\n" + smallest,
		"document end":    smallest + "...\n",
		"CRLF":            strings.ReplaceAll(smallest, "\n", "\r\n"),
		"name as a word":  strings.Replace(smallest, "catwalk", "no", 1),
		"name as digits":  strings.Replace(smallest, "catwalk", "007", 1),
		"IPv6 loopback":   smallest + "listen: \"[::1]:8460\"\n",
		"localhost":       smallest + "listen: localhost:0\n",
		"mapped loopback": smallest + "listen: \"[::ffff:127.0.0.1]:8460\"\n",
	} {
		c, err := parse(s)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if again, err := parse(string(c.Canonical())); err != nil || same(c, again) != "" {
			t.Errorf("%s does not come back: %v", name, err)
		}
	}
}
