package wire

import (
	"crypto/ed25519"
	"encoding/hex"
	"strings"
	"testing"
)

// The key of RFC 8037, appendix A.1 and A.2, which is that of RFC 8032, section
// 7.1, test 1.
const (
	rfcX = "11qYAYKxCrfVS_7TyWQHOg7hcvPapiMlrwIaaPcHURo"
	rfcD = "nWGxne_9WmC6hEr0kuwsxERJxWl7MmkZcDusAxyuf2A"
)

func TestTheExampleOfRFC8037(t *testing.T) {
	key, err := ParseJWK([]byte(`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `"}`))
	if err != nil {
		t.Fatal(err)
	}
	// Appendix A.3.
	if got := Thumbprint(key); got != "kPrK_qmxVWaYVA9wwBF6Iuo3vVzz7TxHCTwXBygrS4k" {
		t.Errorf("thumbprint %s", got)
	}
	// Appendix A.4.
	const jws = "eyJhbGciOiJFZERTQSJ9.RXhhbXBsZSBvZiBFZDI1NTE5IHNpZ25pbmc." +
		"hgyY0il_MGCjP0JzlnLWG1PPOt7-09PGcvMg3AIbQR6dWbhijcNR4ki4iylGjg5BhVsPt9g7sVvpAr_MuM0KAg"
	header, payload, signature, err := splitJWS(jws)
	if err != nil || string(header) != `{"alg":"EdDSA"}` || string(payload) != "Example of Ed25519 signing" {
		t.Fatalf("%s, %s, %v", header, payload, err)
	}
	// Appendix A.5.
	if !signedBy(jws, signature, key) {
		t.Error("the signature does not verify")
	}
	if _, err := VerifyPermit(jws, key); err == nil {
		t.Error("the example passed for a permit")
	}
	// Signing is deterministic, so the same bytes come out.
	seed, err := base64url(rfcD)
	if err != nil {
		t.Fatal(err)
	}
	private := ed25519.NewKeyFromSeed(seed)
	in := jws[:strings.LastIndexByte(jws, '.')]
	if got := ed25519.Sign(private, []byte(in)); string(got) != string(signature) {
		t.Errorf("signed %x", got)
	}
}

// TestTheVectorsOfRFC8032 checks the primitive with section 7.1, tests 1 to 3.
func TestTheVectorsOfRFC8032(t *testing.T) {
	for _, v := range []struct{ secret, public, message, signature string }{
		{
			"9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60", "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a", "",
			"e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b",
		},
		{
			"4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb", "3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c", "72",
			"92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da085ac1e43e15996e458f3613d0f11d8c387b2eaeb4302aeeb00d291612bb0c00",
		},
		{
			"c5aa8df43f9f837bedb7442f31dcb7b166d38535076f094b85ce3a2e0b4458f7", "fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025", "af82",
			"6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac18ff9b538d16f290ae67f760984dc6594a7c15e9716ed28dc027beceea1ec40a",
		},
	} {
		secret, public, message, signature := unhex(t, v.secret), unhex(t, v.public), unhex(t, v.message), unhex(t, v.signature)
		private := ed25519.NewKeyFromSeed(secret)
		if got := private.Public().(ed25519.PublicKey); !got.Equal(ed25519.PublicKey(public)) {
			t.Errorf("public key %x", got)
		}
		if got := ed25519.Sign(private, message); string(got) != string(signature) {
			t.Errorf("signature %x", got)
		}
		if !ed25519.Verify(public, message, signature) {
			t.Error("it does not verify")
		}
		signature[63] ^= 0x80
		if ed25519.Verify(public, message, signature) {
			t.Error("it verifies with S over the order of the group")
		}
	}
}

func unhex(t *testing.T, s string) []byte {
	t.Helper()
	b, err := hex.DecodeString(s)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func TestKeysReadBackAsTheyWere(t *testing.T) {
	key := publicKey()
	got, err := ParseJWK(JWK(key))
	if err != nil || !got.Equal(key) {
		t.Errorf("%x, %v", got, err)
	}
	for _, bad := range []string{
		``, `{}`, `[]`, `null`,
		`{"kty":"OKP","crv":"Ed25519"}`,
		`{"kty":"OKP","crv":"Ed25519","x":""}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `="}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX[1:] + `"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX[:42] + `p"}`,
		`{"kty":"OKP","crv":"X25519","x":"` + rfcX + `"}`,
		`{"kty":"EC","crv":"Ed25519","x":"` + rfcX + `"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `","alg":"HS256"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `","use":"enc"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `","d":"` + rfcD + `"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `","x":"` + rfcX + `"}`,
		`{"kty":"OKP","crv":"Ed25519","X":"` + rfcX + `"}`,
		`{"kty":"OKP","crv":"Ed25519","x":"` + rfcX + `"}{}`,
	} {
		if got, err := ParseJWK([]byte(bad)); err == nil || got != nil {
			t.Errorf("%s: %x", bad, got)
		}
	}
}
