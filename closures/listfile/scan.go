package listfile

import (
	"fmt"
	"io"
	"unicode/utf8"

	"beamward/closures/wire"
)

// scanner reads JSON after RFC 8259 token by token, without keeping the text.
// It is strict: control characters, lone surrogates, bytes that are not UTF-8
// and anything after the value are errors.
type scanner struct {
	r         io.Reader
	limit     int64
	buf       []byte
	pos, end  int
	lineStart int // in buf, of the present line, or of what is left of it
	ended     bool
	line      int
	total     int64
	readErr   error // not the list's fault
	scratch   []byte
	depth     int
	tooLarge  bool
}

// token is the kind of what begins at the scanner's place.
type token byte

const (
	tokenEnd    token = 0
	tokenString token = '"'
	tokenNumber token = '0'
	tokenWord   token = 'a' // true, false, null
	// otherwise the character itself: { } [ ] , :
)

const (
	maxDepth  = 32
	maxString = 4096
)

// syntaxError is a text that is no JSON, or is damaged so that what follows
// cannot be read.
type syntaxError struct {
	at    place
	cause string
	mend  string
}

func (e *syntaxError) Error() string { return e.cause }

func newScanner(r io.Reader, limit int64) *scanner {
	return &scanner{r: r, limit: limit, buf: make([]byte, 64<<10), line: 1}
}

// here returns the scanner's place with the end of the line as far as read.
func (s *scanner) here() place {
	from := max(s.lineStart, s.pos-80, 0)
	to := s.pos
	for to < s.end && to-from < 80 && s.buf[to] != '\n' && s.buf[to] != '\r' {
		to++
	}
	return place{line: s.line, text: s.buf[from:to]}
}

func (s *scanner) fail(cause string, args ...any) error {
	if s.readErr != nil {
		return s.readErr
	}
	if s.tooLarge {
		return &syntaxError{at: s.here(), cause: "the list is too large", mend: "split the list"}
	}
	return &syntaxError{at: s.here(), cause: fmt.Sprintf(cause, args...), mend: "send well-formed JSON; what follows was not read"}
}

// more reads on, keeping the last 80 bytes for here; ok is false at the end.
func (s *scanner) more() bool {
	if s.ended || s.readErr != nil {
		return false
	}
	keep := min(s.pos, 80)
	copy(s.buf, s.buf[s.pos-keep:s.end])
	s.lineStart = max(0, s.lineStart-(s.pos-keep))
	s.end -= s.pos - keep
	s.pos = keep
	for tries := 0; tries < 100; tries++ {
		n, err := s.r.Read(s.buf[s.end:])
		s.end += n
		if s.total += int64(n); s.total > s.limit {
			s.ended, s.tooLarge = true, true
			s.end = s.pos
			return false
		}
		switch {
		case err == io.EOF:
			s.ended = true
		case err != nil:
			s.readErr = err
		}
		if n > 0 || err != nil {
			return n > 0
		}
	}
	s.readErr = io.ErrNoProgress
	return false
}

func (s *scanner) peekByte() (byte, bool) {
	if s.pos == s.end && !s.more() {
		return 0, false
	}
	return s.buf[s.pos], true
}

// peek skips white space and returns what comes next.
func (s *scanner) peek() (token, error) {
	for {
		c, ok := s.peekByte()
		if !ok {
			if s.readErr != nil || s.tooLarge {
				return tokenEnd, s.fail("")
			}
			return tokenEnd, nil
		}
		switch c {
		case '\n':
			s.pos++
			s.line++
			s.lineStart = s.pos
		case ' ', '\t', '\r':
			s.pos++
		case '{', '}', '[', ']', ',', ':', '"':
			return token(c), nil
		case '-', '0', '1', '2', '3', '4', '5', '6', '7', '8', '9':
			return tokenNumber, nil
		case 't', 'f', 'n':
			return tokenWord, nil
		case 0:
			return tokenEnd, s.fail("the text holds a NUL byte")
		case 0xEF:
			return tokenEnd, s.fail("the text holds a byte order mark or a letter where none can stand")
		default:
			return tokenEnd, s.fail("%s cannot stand here", quoted([]byte{c}))
		}
	}
}

// expect reads the character c.
func (s *scanner) expect(c byte) error {
	t, err := s.peek()
	if err != nil {
		return err
	}
	if t != token(c) {
		if t == tokenEnd {
			return s.fail("the text ends too soon")
		}
		return s.fail("%q is missing here", c)
	}
	s.pos++
	return nil
}

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

// scalar reads any value; of an object or an array it returns only that it was
// one.
func (s *scanner) scalar() (cell, error) {
	t, err := s.peek()
	if err != nil {
		return cell{}, err
	}
	at := place{line: s.line}
	var k kind
	var text []byte
	switch t {
	case tokenString:
		k = quotedText
		text, err = s.string()
	case tokenNumber:
		k, text = numeral, s.bareText()
		if _, e := wire.ParseNumber(string(text)); e != nil {
			err = s.fail("%s is not a JSON number", quoted(text))
		}
	case tokenWord:
		k, text = truthValue, s.bareText()
		switch string(text) {
		case "null":
			k = null
		case "true", "false":
		default:
			err = s.fail("%s cannot stand here", quoted(text))
		}
	case '{', '[':
		k = nested
		err = s.skip()
	case tokenEnd:
		err = s.fail("the text ends too soon")
	default:
		err = s.fail("a value is missing")
	}
	at.text = text
	return cell{k, text, at}, err
}

// skip reads a value and forgets it.
func (s *scanner) skip() error {
	t, err := s.peek()
	if err != nil {
		return err
	}
	mark := len(s.scratch)
	switch t {
	case '{':
		err = s.object(func([]byte) error { return s.skip() })
	case '[':
		err = s.array(s.skip)
	default:
		_, err = s.scalar()
	}
	s.scratch = s.scratch[:mark]
	return err
}

// object reads an object, which follows. each must read the value of the key
// it is handed.
func (s *scanner) object(each func(key []byte) error) error {
	if err := s.enter('{'); err != nil {
		return err
	}
	for first := true; ; first = false {
		t, err := s.peek()
		if err != nil {
			return err
		}
		if t == '}' && first {
			break
		}
		if t != tokenString {
			return s.fail("a key in quotes is missing here")
		}
		key, err := s.string()
		if err != nil {
			return err
		}
		if err := s.expect(':'); err != nil {
			return err
		}
		if err := each(key); err != nil {
			return err
		}
		if more, err := s.comma('}'); err != nil {
			return err
		} else if !more {
			break
		}
	}
	s.pos++
	s.depth--
	return nil
}

// array reads an array, which follows. each must read one value.
func (s *scanner) array(each func() error) error {
	if err := s.enter('['); err != nil {
		return err
	}
	for first := true; ; first = false {
		t, err := s.peek()
		if err != nil {
			return err
		}
		if t == ']' && first {
			break
		}
		if err := each(); err != nil {
			return err
		}
		if more, err := s.comma(']'); err != nil {
			return err
		} else if !more {
			break
		}
	}
	s.pos++
	s.depth--
	return nil
}

func (s *scanner) enter(c byte) error {
	if err := s.expect(c); err != nil {
		return err
	}
	if s.depth++; s.depth > maxDepth {
		return s.fail("objects and arrays are nested too deep")
	}
	return nil
}

// comma reads a comma, or sees the end.
func (s *scanner) comma(end byte) (more bool, err error) {
	t, err := s.peek()
	if err != nil {
		return false, err
	}
	switch t {
	case ',':
		s.pos++
		return true, nil
	case token(end):
		return false, nil
	case tokenEnd:
		return false, s.fail("the text ends too soon")
	}
	return false, s.fail("a comma or %q is missing here", end)
}
