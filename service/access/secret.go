package access

import (
	"crypto/rand"
	"crypto/sha256"
	"encoding/base64"
	"fmt"
	"io"
	"log/slog"
	"regexp"
	"strings"
)

// Secret is a token in the clear. It prints as dots; Reveal is the one way to
// its text. The text is behind a pointer, since a printer that meets a Secret
// in a field it may not call methods on would show what lies in it.
type Secret struct{ text *string }

const (
	secretPrefix = "bw_"
	secretBytes  = 32 // 256 bits
	hidden       = "bw_…"
)

// secretLike finds what may be a token in any text.
var secretLike = regexp.MustCompile(`bw_[A-Za-z0-9_-]{43}`)

// mint makes a new secret.
func mint() Secret {
	var b [secretBytes]byte
	rand.Read(b[:]) // ends the program rather than fail
	text := secretPrefix + base64.RawURLEncoding.EncodeToString(b[:])
	return Secret{&text}
}

// parseSecret takes what mint made, in that one spelling.
func parseSecret(s string) (Secret, bool) {
	rest, ok := strings.CutPrefix(s, secretPrefix)
	if !ok || len(rest) != base64.RawURLEncoding.EncodedLen(secretBytes) {
		return Secret{}, false
	}
	b, err := base64.RawURLEncoding.Strict().DecodeString(rest)
	if err != nil || len(b) != secretBytes {
		return Secret{}, false
	}
	return Secret{&s}, true
}

// Reveal returns the token, to be shown once; empty for no token.
func (s Secret) Reveal() string {
	if s.text == nil {
		return ""
	}
	return *s.text
}

func (s Secret) digest() [sha256.Size]byte { return sha256.Sum256([]byte(s.Reveal())) }

// Format hides the token from every verb of fmt.
func (s Secret) Format(f fmt.State, _ rune) { io.WriteString(f, hidden) }

// LogValue hides the token.
func (s Secret) LogValue() slog.Value { return slog.StringValue(hidden) }

// MarshalText hides the token.
func (s Secret) MarshalText() ([]byte, error) { return []byte(hidden), nil }
