package access

import (
	"bytes"
	"crypto/sha256"
	"crypto/subtle"
	"fmt"
	"sync"
	"time"
)

// rereadAfter is the age at which the token file is read again before anyone
// is let in by it; half of the second within which a change has to hold.
const rereadAfter = 500 * time.Millisecond

// store is the token file as it was last read. The file is small, so that all
// of it is read again each time: its time stamps cannot be relied on to show a
// change.
type store struct {
	path string

	mu     sync.Mutex
	read   time.Time
	text   []byte
	tokens []Token
	err    error
}

// now returns the tokens of a file that was read just now; with an error there
// are none.
func (s *store) now() ([]Token, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if !s.read.IsZero() && time.Since(s.read) < rereadAfter {
		return s.tokens, s.err
	}
	s.read = time.Now() // before reading: the age counts from the earliest that the text can be
	b, err := readTokens(s.path)
	if err != nil {
		s.text, s.tokens, s.err = nil, nil, err
		return nil, err
	}
	if s.err == nil && s.text != nil && bytes.Equal(b, s.text) {
		return s.tokens, nil
	}
	tokens, err := parseTokens(b)
	if err != nil {
		s.text, s.tokens, s.err = nil, nil, fmt.Errorf("read tokens %s: %w", s.path, err)
		return nil, s.err
	}
	s.text, s.tokens, s.err = b, tokens, nil
	return tokens, nil
}

// find returns the token of a digest. It takes as long whichever token it is.
func find(tokens []Token, digest [sha256.Size]byte) (*Token, bool) {
	found := -1
	for i := range tokens {
		if subtle.ConstantTimeCompare(tokens[i].digest[:], digest[:]) == 1 {
			found = i
		}
	}
	if found < 0 {
		return nil, false
	}
	return &tokens[found], true
}
