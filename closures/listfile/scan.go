package listfile

import (
	"fmt"
	"io"

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
	return &scanner{r: r, limit: limit, buf: make([]byte, 4096), line: 1}
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
	to := s.buf
	if len(to) < 64<<10 { // small texts need no more; large ones soon have enough
		to = make([]byte, 2*len(s.buf))
	}
	copy(to, s.buf[s.pos-keep:s.end])
	s.buf = to
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
	return cell{kind: k, text: text, at: at}, err
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
