package alerts

import (
	"strings"
	"unicode"
	"unicode/utf8"
)

// clean makes text from outside fit to be shown anywhere: control characters,
// line ends, direction marks and other invisible format characters become
// spaces or go, bytes that are not UTF-8 become the replacement character, and
// what is longer than most characters is cut.
func clean(s string, most int) string {
	var b strings.Builder
	n := 0
	for i, r := range s {
		if n == most {
			b.WriteString("…")
			break
		}
		switch {
		case r == utf8.RuneError:
			if _, size := utf8.DecodeRuneInString(s[i:]); size == 1 {
				r = unicode.ReplacementChar
			}
		case unicode.IsControl(r), r == '\u2028', r == '\u2029':
			r = ' '
		case unicode.Is(unicode.Cf, r), unicode.Is(unicode.Co, r), unicode.Is(unicode.Cs, r):
			continue // direction marks, joiners, tags, private use
		}
		b.WriteRune(r)
		n++
	}
	return b.String()
}

// How long texts from outside may be, in characters.
const (
	mostName   = 80
	mostDetail = 300
)
