package closures

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
)

// BeamID names a beam: one facility behind one shutter.
type BeamID string

// EveryBeam stands for all beams in a hold.
const EveryBeam BeamID = "*"

// Source names where a fact came from: a configured source, a beam or a
// telescope (for what they say of themselves), a watch post, or a person's
// token.
type Source string

// AuthorityID names an authority that sends closure lists.
type AuthorityID string

// ListID names a closure list, uniquely within its authority.
type ListID string

// TelescopeID names a neighbour telescope.
type TelescopeID string

// HoldID names a hold.
type HoldID string

// Digest is a SHA-256 sum.
type Digest [sha256.Size]byte

// IsZero reports whether no digest was set.
func (d Digest) IsZero() bool { return d == Digest{} }

// String returns the digest as "sha256:" and 64 lower-case hexadecimal digits.
func (d Digest) String() string { return "sha256:" + hex.EncodeToString(d[:]) }

// ParseDigest reads what String writes, and nothing else.
func ParseDigest(s string) (Digest, error) {
	var d Digest
	const prefix = "sha256:"
	if len(s) != len(prefix)+2*len(d) || s[:len(prefix)] != prefix {
		return Digest{}, fmt.Errorf("digest %.80q: want sha256: and 64 lower-case hexadecimal digits", s)
	}
	for _, c := range s[len(prefix):] {
		if (c < '0' || c > '9') && (c < 'a' || c > 'f') {
			return Digest{}, fmt.Errorf("digest %.80q: want sha256: and 64 lower-case hexadecimal digits", s)
		}
	}
	if _, err := hex.Decode(d[:], []byte(s[len(prefix):])); err != nil {
		return Digest{}, fmt.Errorf("digest %.80q: %w", s, err)
	}
	return d, nil
}

// ValidName reports whether s can be an identifier: one to 64 of the
// characters A-Z a-z 0-9 . _ and -, and neither "." nor "..", so that it is
// safe in a path, a label and a log line.
func ValidName(s string) bool {
	if len(s) == 0 || len(s) > 64 || s == "." || s == ".." {
		return false
	}
	for i := 0; i < len(s); i++ {
		c := s[i]
		switch {
		case c >= 'A' && c <= 'Z', c >= 'a' && c <= 'z', c >= '0' && c <= '9', c == '.', c == '_', c == '-':
		default:
			return false
		}
	}
	return true
}
