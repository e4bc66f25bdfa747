package listfile

import (
	"unicode/utf8"
)

// string reads a string, which follows, into memory that lasts until reset.
func (s *scanner) string() ([]byte, error) {
	s.pos++ // the quote
	start := len(s.scratch)
	for {
		c, ok := s.peekByte()
		if !ok {
			return nil, s.fail("the text ends inside a string")
		}
		switch {
		case c == '"':
			s.pos++
			text := s.scratch[start:len(s.scratch):len(s.scratch)]
			if !utf8.Valid(text) {
				return nil, s.fail("a string holds bytes that are not UTF-8")
			}
			return text, nil
		case c < 0x20:
			return nil, s.fail("a string holds a control character")
		case c == '\\':
			s.pos++
			if err := s.escape(); err != nil {
				return nil, err
			}
		default:
			s.pos++
			s.scratch = append(s.scratch, c)
		}
		if len(s.scratch)-start > maxString {
			return nil, s.fail("a string is longer than %d bytes", maxString)
		}
	}
}

// escape reads what follows a backslash.
func (s *scanner) escape() error {
	c, ok := s.peekByte()
	if !ok {
		return s.fail("the text ends inside a string")
	}
	s.pos++
	switch c {
	case '"', '\\', '/':
		s.scratch = append(s.scratch, c)
	case 'b':
		s.scratch = append(s.scratch, '\b')
	case 'f':
		s.scratch = append(s.scratch, '\f')
	case 'n':
		s.scratch = append(s.scratch, '\n')
	case 'r':
		s.scratch = append(s.scratch, '\r')
	case 't':
		s.scratch = append(s.scratch, '\t')
	case 'u':
		r, ok := s.hex4()
		if ok && r >= 0xD800 && r < 0xDC00 {
			var low rune
			if ok = s.literal(`\u`); ok {
				low, ok = s.hex4()
			}
			ok = ok && low >= 0xDC00 && low < 0xE000
			r = 0x10000 + (r-0xD800)<<10 + (low - 0xDC00)
		} else if r >= 0xDC00 && r < 0xE000 {
			ok = false
		}
		if !ok {
			return s.fail(`a \u escape is not one`)
		}
		s.scratch = utf8.AppendRune(s.scratch, r)
	default:
		return s.fail("a string holds an escape that JSON does not have")
	}
	return nil
}

func (s *scanner) hex4() (r rune, ok bool) {
	for range 4 {
		c, ok := s.peekByte()
		if !ok {
			return 0, false
		}
		switch {
		case c >= '0' && c <= '9':
			r = r<<4 | rune(c-'0')
		case c >= 'a' && c <= 'f':
			r = r<<4 | rune(c-'a'+10)
		case c >= 'A' && c <= 'F':
			r = r<<4 | rune(c-'A'+10)
		default:
			return 0, false
		}
		s.pos++
	}
	return r, true
}

// literal reads exactly the text of word.
func (s *scanner) literal(word string) bool {
	for i := 0; i < len(word); i++ {
		if c, ok := s.peekByte(); !ok || c != word[i] {
			return false
		}
		s.pos++
	}
	return true
}

// bareText reads a number or a word up to where it ends.
func (s *scanner) bareText() []byte {
	start := len(s.scratch)
	for {
		c, ok := s.peekByte()
		if !ok || len(s.scratch)-start > 64 {
			break
		}
		if !(c >= '0' && c <= '9' || c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c == '+' || c == '-' || c == '.' || c == '_') {
			break
		}
		s.scratch = append(s.scratch, c)
		s.pos++
	}
	return s.scratch[start:len(s.scratch):len(s.scratch)]
}
