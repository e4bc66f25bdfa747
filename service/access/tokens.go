package access

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"
	"time"

	"beamward/closures"
)

// Token is one line of a token file: who, as what, for which sources, and the
// digest of the secret.
type Token struct {
	Name    string            `json:"name"`
	Role    string            `json:"role"`
	Sources []closures.Source `json:"sources,omitempty"`
	Created time.Time         `json:"created"`
	SHA256  string            `json:"sha256"` // of the token's text, in hexadecimal

	digest [sha256.Size]byte
	role   Role
}

// The bounds of a token file.
const (
	maxTokens     = 1000
	maxTokenBytes = 1 << 20
)

// tokenHead is the first line of a token file. Without it the file is not
// whole, so that an emptied one is told from one without tokens.
const tokenHead = "beamward tokens 1"

// check says whether a token can be kept.
func (t *Token) check() error {
	role, ok := ParseRole(t.Role)
	switch {
	case !closures.ValidName(t.Name):
		return errors.New("its name must be 1 to 64 of the characters A-Z a-z 0-9 . _ -")
	case strings.EqualFold(t.Name, LocalName):
		return errors.New("the name local is whoever signs in without a name")
	case !ok:
		return errors.New("its role must be read, feed, operate or admin")
	case role == Feed && len(t.Sources) == 0:
		return errors.New("a feed must name the sources that it may speak for")
	case role == Read && len(t.Sources) > 0:
		return errors.New("the role read speaks for no source")
	case len(t.Sources) > 256:
		return errors.New("it may name at most 256 sources")
	}
	for _, s := range t.Sources {
		if !closures.ValidName(string(s)) {
			return errors.New("its sources must be names of 1 to 64 of the characters A-Z a-z 0-9 . _ -")
		}
	}
	t.role = role
	return nil
}

// person is who holds the token.
func (t *Token) person() Person {
	return Person{Name: t.Name, Role: t.role, Sources: t.Sources, Token: true, proof: t.digest}
}

// readTokens reads the whole file, after seeing to it that others can neither
// read nor have written it.
func readTokens(path string) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("read tokens: %w", err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, fmt.Errorf("read tokens %s: %w", path, err)
	}
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("read tokens %s: it is not a regular file", path)
	}
	if info.Mode().Perm()&0o077 != 0 {
		return nil, fmt.Errorf("read tokens %s: its mode is %#o: make it 0600", path, info.Mode().Perm())
	}
	if err := ownFile(info); err != nil {
		return nil, fmt.Errorf("read tokens %s: %w", path, err)
	}
	b, err := io.ReadAll(io.LimitReader(f, maxTokenBytes+1))
	if err != nil {
		return nil, fmt.Errorf("read tokens %s: %w", path, err)
	}
	if len(b) > maxTokenBytes {
		return nil, fmt.Errorf("read tokens %s: it is over %d bytes", path, maxTokenBytes)
	}
	return b, nil
}

// parseTokens takes a file exactly as formatTokens writes it. A line that
// would be written differently is refused, and with it the file.
func parseTokens(b []byte) ([]Token, error) {
	rest, ok := bytes.CutPrefix(b, []byte(tokenHead+"\n"))
	if !ok {
		return nil, fmt.Errorf("line 1: want %q", tokenHead)
	}
	var tokens []Token
	names, digests := map[string]bool{}, map[[sha256.Size]byte]bool{}
	for line := 2; len(rest) > 0; line++ {
		one, after, ended := bytes.Cut(rest, []byte("\n"))
		rest = after
		t, err := parseToken(one)
		if err == nil && !ended {
			err = errors.New("it has no end: the file was cut")
		}
		if err == nil && (names[strings.ToLower(t.Name)] || digests[t.digest]) {
			err = errors.New("its name or digest stands twice")
		}
		if err == nil && len(tokens) == maxTokens {
			err = fmt.Errorf("there are more than %d tokens", maxTokens)
		}
		if err != nil {
			return nil, fmt.Errorf("line %d: %w", line, err)
		}
		names[strings.ToLower(t.Name)], digests[t.digest] = true, true
		tokens = append(tokens, t)
	}
	return tokens, nil
}

func parseToken(line []byte) (Token, error) {
	var t Token
	if err := json.Unmarshal(line, &t); err != nil {
		return Token{}, errors.New("it is not a token: use the token command to change the file")
	}
	sum, err := hex.DecodeString(t.SHA256)
	if err != nil || len(sum) != sha256.Size {
		return Token{}, errors.New("its sha256 must be 64 hexadecimal digits")
	}
	copy(t.digest[:], sum)
	if err := t.check(); err != nil {
		return Token{}, err
	}
	t.Created = t.Created.UTC()
	same, err := json.Marshal(t)
	if err != nil || !bytes.Equal(same, line) {
		return Token{}, errors.New("it is not as the token command writes it")
	}
	return t, nil
}

func formatTokens(tokens []Token) ([]byte, error) {
	b := bytes.NewBufferString(tokenHead + "\n")
	for i := range tokens {
		line, err := json.Marshal(&tokens[i])
		if err != nil {
			return nil, err
		}
		b.Write(line)
		b.WriteByte('\n')
	}
	return b.Bytes(), nil
}
