package wire

import (
	"crypto/ed25519"
	"encoding/base64"
	"encoding/json"
	"math"
	"reflect"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"beamward/closures"
	"beamward/geometry/span"
)

func samplePermit() Permit {
	from, until, age := said, said.Add(time.Hour), 0.25
	return Permit{
		Beam: "north", State: Shuttered, Seq: math.MaxInt64, BootID: "b-7f", IssuedAt: received, ValidUntil: received.Add(2 * time.Second), LeaseMS: 2000,
		Reasons: []Reason{
			{Code: "listed-closure", Source: "orbital-desk", From: &from, Until: &until, Detail: "a listed window", Ref: "A-17 <&> é"},
			{Code: "aircraft", Source: "rx-1", Margin: &Margin{-12.5, "m"}},
			{Code: "elevation-limit", Margin: &Margin{-0.1, "deg"}},
		},
		Cautions: []Caution{{Code: "source-silent", Source: "mast", Detail: "optional"}}, ClosesAt: &until, OpensAt: &until,
		Inputs:      []Input{{Source: "rx-1", AgeS: &age, LimitS: 10}, {Source: "catwalk", LimitS: 5}},
		RulesDigest: closures.Digest{1}.String(), ListsDigest: closures.Digest{}.String(), Simulated: true, Nonce: `a "quoted" nonce`,
	}
}

func openPermit() Permit {
	closes := received.Add(time.Minute)
	return Permit{
		Beam: "north", State: Open, Seq: 7, BootID: "b-7f", IssuedAt: received, ValidUntil: received.Add(2 * time.Second), LeaseMS: 2000, ClosesAt: &closes,
		RulesDigest: closures.Digest{1}.String(), ListsDigest: closures.Digest{2}.String(),
	}
}

func testKey() ed25519.PrivateKey {
	return ed25519.NewKeyFromSeed([]byte("thirty-two bytes of a test's key"))
}

func signed(p Permit) Permit {
	key := testKey()
	p.Signed = Sign(PayloadOf(&p), "k1", func(b []byte) []byte { return ed25519.Sign(key, b) })
	return p
}

func publicKey() ed25519.PublicKey { return testKey().Public().(ed25519.PublicKey) }

func TestAPermitHasItsFieldsInOrder(t *testing.T) {
	p := openPermit()
	const want = `{"beam":"north","state":"open","seq":7,"boot_id":"b-7f","issued_at":"2031-02-14T03:10:02Z","valid_until":"2031-02-14T03:10:04Z",` +
		`"lease_ms":2000,"reasons":[],"cautions":[],"closes_at":"2031-02-14T03:11:02Z","opens_at":null,"inputs":[],` +
		`"rules_digest":"sha256:0100000000000000000000000000000000000000000000000000000000000000",` +
		`"lists_digest":"sha256:0200000000000000000000000000000000000000000000000000000000000000","simulated":false,"nonce":""}`
	if got := string(PayloadOf(&p)); got != want {
		t.Errorf("%s\nwant %s", got, want)
	}
	// The order and names are those of the struct, which encoding/json follows.
	s := samplePermit()
	type plain Permit
	bare, err := json.Marshal(plain(s))
	if err != nil {
		t.Fatal(err)
	}
	var ours, theirs any
	if err := json.Unmarshal(AppendPermit(nil, &s), &ours); err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(bare, &theirs); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(theirs, ours); diff != "" {
		t.Error(diff)
	}
	if n := reflect.TypeFor[Permit]().NumField(); n != permitFields+1 {
		t.Errorf("%d fields", n)
	}
}

func TestPermitsReadBackAsTheyWere(t *testing.T) {
	for _, p := range []Permit{signed(samplePermit()), signed(openPermit()), openPermit()} {
		got, err := ParsePermit(AppendPermit(nil, &p))
		if err != nil || !cmp.Equal(p, got, exact) {
			t.Errorf("%v\n%s", err, cmp.Diff(p, got, exact))
		}
		viaJSON, err := json.MarshalIndent(p, "", "  ")
		if err != nil {
			t.Fatal(err)
		}
		var again Permit
		if err := json.Unmarshal(viaJSON, &again); err != nil || !cmp.Equal(p, again, exact) {
			t.Errorf("%v\n%s", err, cmp.Diff(p, again, exact))
		}
		if p.Signed == "" {
			continue
		}
		verified, err := VerifyPermit(p.Signed, publicKey())
		if err != nil || !cmp.Equal(p, verified, exact) {
			t.Errorf("%v\n%s", err, cmp.Diff(p, verified, exact))
		}
	}
}

func TestTheZeroPermitAllowsNothing(t *testing.T) {
	var p Permit
	if p.State != Shuttered || p.Allows(time.Time{}) || p.Allows(received) || State(7).String() != "shuttered" {
		t.Error("it allows")
	}
	open := openPermit()
	for off, want := range map[time.Duration]bool{
		0: true, time.Second: true, 2*time.Second - 1: true, 2 * time.Second: false, time.Hour: false, -2 * time.Second: true, -2*time.Second - 1: false,
	} {
		if open.Allows(received.Add(off)) != want {
			t.Errorf("%v after its issue: %v", off, !want)
		}
	}
	simulated := openPermit()
	simulated.Simulated = true
	if simulated.Allows(received) {
		t.Error("a simulated permit allows")
	}
}

func TestFindingsLeaveInDegreesMetresAndSeconds(t *testing.T) {
	r := ReasonOf(&closures.Finding{
		Code: closures.CodeElevationLimit, Source: "s", Verdict: closures.Violated, Over: span.Span{From: said, Until: closures.Forever},
		Margin: closures.Margin{Value: -math.Pi / 180, Unit: closures.Radian}, Detail: "d", Ref: "r",
	})
	want := Reason{Code: "elevation-limit", Source: "s", From: &said, Margin: &Margin{-1, "deg"}, Detail: "d", Ref: "r"}
	if diff := cmp.Diff(want, r, near); diff != "" {
		t.Error(diff)
	}
	for _, m := range []closures.Margin{{}, closures.UnknownMargin(), {Value: math.Inf(-1), Unit: closures.Metre}, {Value: 1, Unit: 9}} {
		if r := ReasonOf(&closures.Finding{Margin: m}); r.Margin != nil || r.From != nil || r.Until != nil {
			t.Errorf("%+v: %+v", m, r)
		}
	}
	if in := InputOf(&closures.Input{Source: "s", Age: -1, Limit: 1500 * time.Millisecond}); in.AgeS != nil || in.LimitS != 1.5 {
		t.Errorf("%+v", in)
	}
	if c := CautionOf(&closures.Caution{Code: closures.CodeSourceSilent, Source: "s", Detail: "d"}); c != (Caution{"source-silent", "s", "d"}) {
		t.Errorf("%+v", c)
	}
}

// change returns the sample as JSON with one text replaced by another.
func change(t *testing.T, p Permit, from, to string) []byte {
	t.Helper()
	text := string(AppendPermit(nil, &p))
	if !strings.Contains(text, from) {
		t.Fatalf("no %s in %s", from, text)
	}
	return []byte(strings.Replace(text, from, to, 1))
}

func TestPermitsThatMakeNoSenseAreRefused(t *testing.T) {
	for _, c := range [][2]string{
		{`"state":"open"`, `"state":"Open"`},
		{`"state":"open"`, `"state":"opened"`},
		{`"state":"open"`, `"state":null`},
		{`"state":"open"`, `"state":1`},
		{`"state":"open",`, ``},
		{`"state":"open"`, `"state":"shuttered","state":"open"`},
		{`"state":"open"`, `"state":"shuttered","State":"open"`},
		{`"seq":7`, `"seq":-7`},
		{`"seq":7`, `"seq":7.0`},
		{`"seq":7`, `"seq":"7"`},
		{`"beam":"north"`, `"beam":""`},
		{`"beam":"north"`, `"beam":"*"`},
		{`"boot_id":"b-7f"`, `"boot_id":""`},
		{`"issued_at":"2031-02-14T03:10:02Z"`, `"issued_at":null`},
		{`"issued_at":"2031-02-14T03:10:02Z"`, `"issued_at":"2031-02-14T03:10:02+00:00"`},
		{`"issued_at":"2031-02-14T03:10:02Z"`, `"issued_at":"2031-02-14T03:10:01Z"`}, // longer than the lease
		{`"valid_until":"2031-02-14T03:10:04Z"`, `"valid_until":"2031-02-14T03:10:02Z"`},
		{`"valid_until":"2031-02-14T03:10:04Z"`, `"valid_until":"2031-02-14T03:10:60Z"`},
		{`"lease_ms":2000`, `"lease_ms":1999`},
		{`"lease_ms":2000`, `"lease_ms":-1`},
		{`"lease_ms":2000`, `"lease_ms":3600001`},
		{`"closes_at":"2031-02-14T03:11:02Z"`, `"closes_at":"2031-02-14T03:10:03Z"`},
		{`"reasons":[]`, `"reasons":[{"code":"hold","source":"","from":null,"until":null,"margin":null,"detail":"","ref":""}]`},
		{`"reasons":[]`, `"reasons":{}`},
		{`"cautions":[]`, `"cautions":[{"code":"nothing","source":"","detail":""}]`},
		{`"inputs":[]`, `"inputs":[{"source":"","age_s":"1","limit_s":1}]`},
		{`"rules_digest":"sha256:01`, `"rules_digest":"sha1:01`},
		{`"rules_digest":"sha256:01`, `"rules_digest":"sha256:G1`},
		{`"simulated":false`, `"simulated":0`},
		{`"nonce":""`, `"nonce":"a\u0000"`},
		{`"nonce":""`, `"nonce":"` + strings.Repeat("n", maxNonce+1) + `"`},
		{`"nonce":""`, `"nonce":"","extra":1`},
		{`,"signed":""}`, `}`},
		{`"signed":""}`, `"signed":"" } {}`},
		{`"signed":""}`, `"signed":"a.b.c"}`},
		{`"signed":""}`, `"signed":"` + signed(samplePermit()).Signed + `"}`},
	} {
		text := change(t, openPermit(), c[0], c[1])
		if p, err := ParsePermit(text); err == nil || !reflect.ValueOf(p).IsZero() {
			t.Errorf("%s: %+v, %v", text, p, err)
		}
		// Signed with the right key it is no better.
		payload := strings.Replace(string(text), `,"signed":""`, ``, 1)
		if strings.Contains(c[0], "signed") {
			continue
		}
		key := testKey()
		jws := Sign([]byte(payload), "k1", func(b []byte) []byte { return ed25519.Sign(key, b) })
		if p, err := VerifyPermit(jws, publicKey()); err == nil || !reflect.ValueOf(p).IsZero() {
			t.Errorf("signed %s: %+v, %v", payload, p, err)
		}
	}
	for _, c := range [][2]string{{`"code":"aircraft"`, `"code":"nothing"`}, {`"unit":"m"`, `"unit":"ft"`}, {`"value":-12.5`, `"value":null`}, {`"code":"aircraft"`, `"code":"aircraft","list":"x"`}} {
		if p, err := ParsePermit(change(t, samplePermit(), c[0], c[1])); err == nil {
			t.Errorf("%s: %+v", c[1], p)
		}
	}
}

func TestSignaturesAreReadInOneFormOnly(t *testing.T) {
	key := testKey()
	sign := func(b []byte) []byte { return ed25519.Sign(key, b) }
	p := openPermit()
	payload := PayloadOf(&p)
	good := signed(p).Signed
	parts := strings.Split(good, ".")
	e := base64.RawURLEncoding
	// jws signs whatever header and payload are given.
	jws := func(header, payload string) string {
		in := e.EncodeToString([]byte(header)) + "." + e.EncodeToString([]byte(payload))
		return in + "." + e.EncodeToString(sign([]byte(in)))
	}
	const head = `{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws"}`
	if _, err := VerifyPermit(jws(head, string(payload)), publicKey()); err != nil {
		t.Fatal(err)
	}
	other := ed25519.NewKeyFromSeed(make([]byte, 32))
	none := e.EncodeToString([]byte(strings.Replace(head, "EdDSA", "none", 1))) + "." + parts[1] + "."
	for name, bad := range map[string]string{
		"empty":                     "",
		"points":                    "..",
		"two parts":                 parts[0] + "." + parts[1],
		"four parts":                good + ".",
		"no signature":              parts[0] + "." + parts[1] + ".",
		"algorithm none":            none,
		"padding":                   good + "==",
		"line end":                  good[:40] + "\n" + good[40:],
		"blank":                     good + " ",
		"bare bits":                 good[:len(good)-1] + nextLetter(good[len(good)-1]),
		"standard alphabet":         strings.NewReplacer("-", "+", "_", "/").Replace(good) + "+",
		"payload of another":        parts[0] + "." + e.EncodeToString(PayloadOf(&Permit{Beam: "north", State: Open})) + "." + parts[2],
		"short signature":           parts[0] + "." + parts[1] + "." + e.EncodeToString(make([]byte, 63)),
		"zero signature":            parts[0] + "." + parts[1] + "." + e.EncodeToString(make([]byte, 64)),
		"HMAC with the key":         jws(`{"alg":"HS256","kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"RFC 9864's name":           jws(`{"alg":"Ed25519","kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"algorithm in lower case":   jws(`{"alg":"eddsa","kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"no algorithm":              jws(`{"kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"two algorithms":            jws(`{"alg":"none","alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"algorithm in another case": jws(`{"Alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws"}`, string(payload)),
		"another type":              jws(`{"alg":"EdDSA","kid":"k1","typ":"JWT"}`, string(payload)),
		"no type":                   jws(`{"alg":"EdDSA","kid":"k1"}`, string(payload)),
		"no key name":               jws(`{"alg":"EdDSA","typ":"beamward-permit+jws"}`, string(payload)),
		"crit":                      jws(`{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws","crit":["b64"],"b64":false}`, string(payload)),
		"crit, empty":               jws(`{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws","crit":[]}`, string(payload)),
		"a key of its own":          jws(`{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws","jwk":{}}`, string(payload)),
		"jku":                       jws(`{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws","jku":"https://example.com"}`, string(payload)),
		"x5c":                       jws(`{"alg":"EdDSA","kid":"k1","typ":"beamward-permit+jws","x5c":[]}`, string(payload)),
		"header an array":           jws(`[]`, string(payload)),
		"header empty":              jws(``, string(payload)),
		"payload empty":             jws(head, ``),
		"payload with a blank":      jws(head, " "+string(payload)),
		"payload with a line end":   jws(head, string(payload)+"\n"),
		"payload of two":            jws(head, string(payload)+string(payload)),
		"payload in another order":  jws(head, `{"nonce":"",`+strings.Replace(string(payload)[1:], `,"nonce":""`, "", 1)),
		"payload with a signature":  jws(head, string(AppendPermit(nil, &p))),
		"payload spelt otherwise":   jws(head, strings.Replace(string(payload), "north", `n\u006frth`, 1)),
		"time spelt otherwise":      jws(head, strings.Replace(string(payload), "03:10:02Z", `03:10:02.0Z`, 1)),
		"too long":                  strings.Repeat("A", MaxJWS+1),
		"signed by another":         Sign(payload, "k1", func(b []byte) []byte { return ed25519.Sign(other, b) }),
	} {
		if p, err := VerifyPermit(bad, publicKey()); err == nil || !reflect.ValueOf(p).IsZero() {
			t.Errorf("%s: %+v, %v", name, p, err)
		}
	}
	for name, key := range map[string]ed25519.PublicKey{
		"none": nil, "short": publicKey()[:31], "zero": make([]byte, 32), "another": other.Public().(ed25519.PublicKey),
	} {
		if p, err := VerifyPermit(good, key); err == nil || p.State != Shuttered {
			t.Errorf("with the key %s: %+v", name, p)
		}
	}
	// No letter of it can be another.
	for i := range len(good) {
		for _, c := range []byte{nextLetter(good[i])[0], '.', 'A', '='} {
			if good[i] == c {
				continue
			}
			if _, err := VerifyPermit(good[:i]+string(rune(c))+good[i+1:], publicKey()); err == nil {
				t.Fatalf("letter %d as %c was taken", i, c)
			}
		}
		if _, err := VerifyPermit(good[:i], publicKey()); err == nil {
			t.Fatalf("cut at %d it was taken", i)
		}
	}
}

func nextLetter(c byte) string {
	const alphabet = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_"
	return string(alphabet[(strings.IndexByte(alphabet, c)+1)%len(alphabet)])
}

// FuzzVerifyPermit checks that of all texts only what was signed verifies, and
// that of all payloads, signed by the right key, only those that are written as
// permits are.
func FuzzVerifyPermit(f *testing.F) {
	good := map[string]bool{}
	for _, p := range []Permit{signed(openPermit()), signed(samplePermit())} {
		good[p.Signed] = true
		f.Add(p.Signed, PayloadOf(&p))
		f.Add(p.Signed[1:], AppendPermit(nil, &p))
	}
	key := testKey()
	f.Fuzz(func(t *testing.T, jws string, payload []byte) {
		if p, err := VerifyPermit(jws, publicKey()); (err == nil) != good[jws] || err != nil && !reflect.ValueOf(p).IsZero() {
			t.Fatalf("%s: %+v, %v", jws, p, err)
		}
		p, err := VerifyPermit(Sign(payload, "k", func(b []byte) []byte { return ed25519.Sign(key, b) }), publicKey())
		if err == nil && string(PayloadOf(&p)) != string(payload) {
			t.Fatalf("%s: %+v", payload, p)
		}
		if err != nil && !reflect.ValueOf(p).IsZero() {
			t.Fatalf("%s: %v, and %+v", payload, err, p)
		}
		if p, err := ParsePermit(payload); err == nil {
			again, err := ParsePermit(AppendPermit(nil, &p))
			if err != nil || !cmp.Equal(p, again, exact) {
				t.Fatalf("%s: %v\n%s", payload, err, cmp.Diff(p, again, exact))
			}
		}
	})
}
