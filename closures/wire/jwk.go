package wire

import (
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"fmt"
)

// Thumbprint returns the name of a key (RFC 7638 as in RFC 8037, appendix A.3):
// the SHA-256 of its needed members in base64url.
func Thumbprint(key ed25519.PublicKey) string {
	sum := sha256.Sum256([]byte(`{"crv":"Ed25519","kty":"OKP","x":"` + base64.RawURLEncoding.EncodeToString(key) + `"}`))
	return base64.RawURLEncoding.EncodeToString(sum[:])
}

// JWK returns a public key as a JSON Web Key (RFC 8037, section 2), named by
// its thumbprint.
func JWK(key ed25519.PublicKey) []byte {
	return []byte(`{"alg":"EdDSA","crv":"Ed25519","kid":"` + Thumbprint(key) + `","kty":"OKP","use":"sig","x":"` +
		base64.RawURLEncoding.EncodeToString(key) + `"}`)
}

// ParseJWK reads a public key of Ed25519, strictly. A private key is refused:
// it has no business where this reads from. With an error the key is nil, with
// which nothing verifies.
func ParseJWK(data []byte) (ed25519.PublicKey, error) {
	var k struct {
		Kty string  `json:"kty"`
		Crv string  `json:"crv"`
		X   string  `json:"x"`
		Alg *string `json:"alg"`
		Use *string `json:"use"`
		Kid *string `json:"kid"`
		D   *string `json:"d"`
	}
	if err := Strict(data, &k); err != nil {
		return nil, fmt.Errorf("reading a public key: %w", err)
	}
	switch {
	case k.D != nil:
		return nil, errors.New("reading a public key: it is a private one; take d out, and use that key no more")
	case k.Kty != "OKP" || k.Crv != "Ed25519" || k.Alg != nil && *k.Alg != "EdDSA" || k.Use != nil && *k.Use != "sig":
		return nil, errors.New("reading a public key: want one of Ed25519, for signatures")
	}
	x, err := base64url(k.X)
	if err != nil || len(x) != ed25519.PublicKeySize {
		return nil, errors.New("reading a public key: x: want 32 bytes in base64url")
	}
	return x, nil
}
