package wire

import (
	"strconv"
	"unicode/utf8"
)

// scanner walks a JSON text (RFC 8259) once, without copying. The causes it
// gives are fixed texts.
type scanner struct {
	b []byte
	i int
}

// space skips blanks.
func (s *scanner) space() {
	for s.i < len(s.b) {
		switch s.b[s.i] {
		case ' ', '\t', '\n', '\r':
			s.i++
		default:
			return
		}
	}
}

// take steps over c if it comes next.
func (s *scanner) take(c byte) bool {
	if s.i < len(s.b) && s.b[s.i] == c {
		s.i++
		return true
	}
	return false
}

// next returns the byte that comes next, or 0.
func (s *scanner) next() byte {
	if s.i < len(s.b) {
		return s.b[s.i]
	}
	return 0
}

// word steps over a literal name if it comes next.
func (s *scanner) word(w string) bool {
	if len(s.b)-s.i >= len(w) && string(s.b[s.i:s.i+len(w)]) == w {
		s.i += len(w)
		return true
	}
	return false
}

// number reads a number.
func (s *scanner) number() (v float64, cause string) {
	v, end, cause := scanNumber(s.b, s.i)
	if cause == "" {
		s.i = end
	}
	return v, cause
}

const (
	notString  = "not a string"
	unended    = "a string without an end"
	controlIn  = "a control character in a string"
	notUTF8    = "not UTF-8"
	badEscape  = "no such escape in a string"
	halfEscape = "half a surrogate pair in a string"
)

// text reads a string. What it returns shares the text's memory or, when the
// string has escapes, is appended to scratch.
func (s *scanner) text(scratch []byte) (text []byte, cause string) {
	if s.next() != '"' {
		return nil, notString
	}
	ascii := true
	for i := s.i + 1; i < len(s.b); i++ {
		switch c := s.b[i]; {
		case c == '"':
			text = s.b[s.i+1 : i]
			if !ascii && !utf8.Valid(text) {
				return nil, notUTF8
			}
			s.i = i + 1
			return text, ""
		case c == '\\':
			return s.escaped(append(scratch, s.b[s.i+1:i]...), i, ascii)
		case c < ' ':
			s.i = i
			return nil, controlIn
		case c >= utf8.RuneSelf:
			ascii = false
		}
	}
	return nil, unended
}

// escaped reads on from the first escape of a string, at i.
func (s *scanner) escaped(out []byte, i int, ascii bool) ([]byte, string) {
	for i < len(s.b) {
		c := s.b[i]
		switch {
		case c == '"':
			if !ascii && !utf8.Valid(out) {
				return nil, notUTF8
			}
			s.i = i + 1
			return out, ""
		case c < ' ':
			s.i = i
			return nil, controlIn
		case c != '\\':
			ascii = ascii && c < utf8.RuneSelf
			out = append(out, c)
			i++
			continue
		}
		if i+1 >= len(s.b) {
			break
		}
		switch e := s.b[i+1]; e {
		case '"', '\\', '/':
			out = append(out, e)
		case 'b':
			out = append(out, '\b')
		case 'f':
			out = append(out, '\f')
		case 'n':
			out = append(out, '\n')
		case 'r':
			out = append(out, '\r')
		case 't':
			out = append(out, '\t')
		case 'u':
			r, ok := hex4(s.b, i+2)
			if !ok {
				s.i = i
				return nil, badEscape
			}
			i += 4
			if r >= 0xd800 && r < 0xe000 {
				low, ok := rune(0), false
				if i+3 < len(s.b) && s.b[i+2] == '\\' && s.b[i+3] == 'u' {
					low, ok = hex4(s.b, i+4)
				}
				if !ok || r >= 0xdc00 || low < 0xdc00 || low >= 0xe000 {
					s.i = i - 4
					return nil, halfEscape
				}
				r = (r-0xd800)<<10 + (low - 0xdc00) + 0x10000
				i += 6
			}
			out = utf8.AppendRune(out, r)
		default:
			s.i = i
			return nil, badEscape
		}
		i += 2
	}
	return nil, unended
}

func hex4(b []byte, i int) (rune, bool) {
	if i+4 > len(b) {
		return 0, false
	}
	var r rune
	for _, c := range b[i : i+4] {
		switch {
		case c >= '0' && c <= '9':
			c -= '0'
		case c >= 'a' && c <= 'f':
			c -= 'a' - 10
		case c >= 'A' && c <= 'F':
			c -= 'A' - 10
		default:
			return 0, false
		}
		r = r<<4 | rune(c)
	}
	return r, true
}

const hexDigits = "0123456789abcdef"

// appendString writes a string. Bytes that are not UTF-8 become U+FFFD.
func appendString[T ~string | ~[]byte](dst []byte, s T) []byte {
	dst = append(dst, '"')
	from := 0
	for i := 0; i < len(s); {
		c := s[i]
		if c >= utf8.RuneSelf {
			r, size := utf8.DecodeRuneInString(string(s[i:min(i+utf8.UTFMax, len(s))]))
			if r == utf8.RuneError && size == 1 {
				dst = append(append(dst, s[from:i]...), "\ufffd"...)
				from = i + 1
			}
			i += size
			continue
		}
		if c < ' ' || c == '"' || c == '\\' {
			dst = append(append(dst, s[from:i]...), '\\')
			switch c {
			case '"', '\\':
				dst = append(dst, c)
			case '\n':
				dst = append(dst, 'n')
			case '\r':
				dst = append(dst, 'r')
			case '\t':
				dst = append(dst, 't')
			default:
				dst = append(dst, 'u', '0', '0', hexDigits[c>>4], hexDigits[c&15])
			}
			from = i + 1
		}
		i++
	}
	return append(append(dst, s[from:]...), '"')
}

// maxQuoted bounds, in bytes, how much of its input an error repeats.
const maxQuoted = 80

// quote writes input for an error: in quotes, only printable ASCII, with
// escapes, at most maxQuoted bytes in all, cut with an ellipsis of dots.
func quote(b []byte) string {
	q := strconv.QuoteToASCII(string(b[:min(len(b), maxQuoted)]))
	if len(b) <= maxQuoted && len(q) <= maxQuoted {
		return q
	}
	// Whole characters and whole escapes, as many as fit before the dots.
	const room = maxQuoted - len(`..."`)
	end := 1
	for end < len(q)-1 {
		n := 1
		if q[end] == '\\' {
			switch q[end+1] {
			case 'x':
				n = len(`\x00`)
			case 'u':
				n = len(`\u0000`)
			case 'U':
				n = len(`\U00000000`)
			default:
				n = len(`\n`)
			}
		}
		if end+n > room {
			break
		}
		end += n
	}
	return q[:end] + `..."`
}

// clean is quote without the quotes, for text that is not input alone.
func clean(s string) string {
	q := quote([]byte(s))
	return q[1 : len(q)-1]
}
