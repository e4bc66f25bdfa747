package wire

import (
	"crypto/ed25519"
	"encoding/base64"
	"errors"
	"fmt"
	"strings"
)

// PermitType is the type that a permit's signature states of itself, so that
// nothing else signed by the same key passes for a permit.
const PermitType = "beamward-permit+jws"

// MaxJWS bounds a signed permit, in bytes.
const MaxJWS = 128 << 10

// Sign makes a JWS in compact form (RFC 7515, section 7.1) of a payload, by
// Ed25519 (RFC 8037). sign returns the signature of the bytes it is given; kid
// names the key.
func Sign(payload []byte, kid string, sign func([]byte) []byte) string {
	header := append(appendString([]byte(`{"alg":"EdDSA","kid":`), kid), `,"typ":"`+PermitType+`"}`...)
	e := base64.RawURLEncoding
	out := make([]byte, 0, e.EncodedLen(len(header))+e.EncodedLen(len(payload))+e.EncodedLen(ed25519.SignatureSize)+2)
	out = append(e.AppendEncode(out, header), '.')
	out = e.AppendEncode(out, payload)
	signature := sign(out)
	return string(e.AppendEncode(append(out, '.'), signature))
}

// VerifyPermit checks a signed permit and returns it as its payload has it;
// nothing is taken from elsewhere. Beyond the signature it checks that the
// header is for a permit by Ed25519 and says no more than that, that each part
// is written in the one way it can be, and that the payload is whole and makes
// sense. With an error the permit is the zero one, which is shuttered.
//
// It knows neither the time nor what was asked: the reader checks Allows, that
// the nonce and the beam are those of its request, and that the number within
// one boot never falls.
func VerifyPermit(jws string, key ed25519.PublicKey) (Permit, error) {
	p, err := verifyPermit(jws, key)
	if err != nil {
		return Permit{}, fmt.Errorf("verifying a permit: %w", err)
	}
	return p, nil
}

func verifyPermit(jws string, key ed25519.PublicKey) (Permit, error) {
	header, payload, signature, err := splitJWS(jws)
	if err != nil {
		return Permit{}, err
	}
	var head struct {
		Alg string `json:"alg"`
		Kid string `json:"kid"`
		Typ string `json:"typ"`
	}
	if err := Strict(header, &head); err != nil {
		return Permit{}, fmt.Errorf("the header: %w", err)
	}
	if head.Alg != "EdDSA" || head.Typ != PermitType || head.Kid == "" {
		return Permit{}, errors.New("the header is not that of a permit signed by Ed25519")
	}
	if !signedBy(jws, signature, key) {
		return Permit{}, errors.New("the signature is not that of the key")
	}
	p, err := parsePermit(payload, false)
	if err != nil {
		return Permit{}, fmt.Errorf("the payload: %w", err)
	}
	if string(PayloadOf(&p)) != string(payload) {
		return Permit{}, errors.New("the payload: not written as permits are")
	}
	p.Signed = jws
	return p, nil
}

// signedBy reports whether the signature is the key's over all before it.
func signedBy(jws string, signature []byte, key ed25519.PublicKey) bool {
	return len(key) == ed25519.PublicKeySize && ed25519.Verify(key, []byte(jws[:strings.LastIndexByte(jws, '.')]), signature)
}

// splitJWS returns the parts of a JWS, decoded and not verified.
func splitJWS(jws string) (header, payload, signature []byte, err error) {
	if len(jws) > MaxJWS {
		return nil, nil, nil, errors.New("the signed permit is too long")
	}
	parts := strings.Split(jws, ".")
	if len(parts) != 3 {
		return nil, nil, nil, errors.New("want three parts between points")
	}
	var out [3][]byte
	for i, part := range parts {
		if out[i], err = base64url(part); err != nil {
			return nil, nil, nil, err
		}
	}
	return out[0], out[1], out[2], nil
}

// base64url decodes base64url without padding (RFC 7515, section 2), where one
// text alone stands for given bytes: the standard decoder skips line ends and
// may let the unused bits of the last character be anything.
func base64url(s string) ([]byte, error) {
	b, err := base64.RawURLEncoding.Strict().DecodeString(s)
	if err != nil || base64.RawURLEncoding.EncodeToString(b) != s {
		return nil, errors.New("a part is not base64url in its one form")
	}
	return b, nil
}
