package config_test

import (
	"bytes"
	"os"
	"regexp"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"beamward/closures"
	"beamward/service/config"
)

// same reports where two configurations differ but for their texts.
func same(a, b *config.Config) string {
	return cmp.Diff(a, b, cmpopts.IgnoreFields(config.Config{}, "Text", "Zone"), cmpopts.IgnoreUnexported(config.Config{}))
}

func TestCanonicalTextMeansTheSame(t *testing.T) {
	for _, s := range []string{text(t, "beamward.yaml"), text(t, "full.yaml"), smallest} {
		c, err := parse(s)
		if err != nil {
			t.Fatal(err)
		}
		again, err := parse(string(c.Canonical()))
		if err != nil {
			t.Fatalf("%v\n%s", err, c.Canonical())
		}
		if d := same(c, again); d != "" {
			t.Error(d)
		}
		if !bytes.Equal(c.Canonical(), again.Canonical()) {
			t.Errorf("another canonical text:\n%s", again.Canonical())
		}
	}
}

func TestCanonicalTextStatesDefaults(t *testing.T) {
	c, err := parse(smallest)
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"data_dir: \"var\"\n", "  lease: 2s\n", "  step_limit: 100ms\n", "    shutter_feedback: \"required\"\n",
		"    integrity: \"digest\"\n", "  keep_facts: 400d\n", "      unannounced_move_deg: 0.1\n"} {
		if !strings.Contains(string(c.Canonical()), want) {
			t.Errorf("%q is missing in\n%s", want, c.Canonical())
		}
	}
}

// How a text is laid out, and the order of its keys, is not part of what it
// means.
func TestLayoutIsNoPartOfTheDigest(t *testing.T) {
	a, err := parse(smallest)
	if err != nil {
		t.Fatal(err)
	}
	b, err := parse("# a comment\n" + strings.NewReplacer(
		"{name: Skerry Peak, time_zone: UTC,", `{time_zone: "UTC", name: 'Skerry Peak',`,
		"aperture_m: 0.3", "aperture_m: 0.300",
		"lat_deg: -31.5", "lat_deg: -31.50",
		"lead: 5s", "lead: 5000ms",
		"    aim_of: beam\n    guide_star: sodium\n", "    guide_star: sodium\n    aim_of: beam\n",
	).Replace(smallest))
	if err != nil {
		t.Fatal(err)
	}
	if a.Rules.Digest != b.Rules.Digest {
		t.Errorf("digests differ:\n%s\n%s", a.Canonical(), b.Canonical())
	}
	c, err := parse(strings.Replace(smallest, "lead: 5s", "lead: 4s", 1))
	if err != nil {
		t.Fatal(err)
	}
	if a.Rules.Digest == c.Rules.Digest {
		t.Error("another lead has the same digest")
	}
}

// Whatever number, time or text is taken comes back from the canonical text
// to the bit.
func TestCanonicalScalarsComeBack(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		digits := rapid.StringMatching(`-?(0|[1-8][0-9]?)(\.[0-9]{1,20})?`).Draw(rt, "latitude")
		lead := rapid.StringMatching(`(0|[1-9][0-9]{0,5})(ms|s|m|h)`).Draw(rt, "lead")
		phone := rapid.StringMatching(`[!-~äλ]([ -~äλ"\\]{0,20}[!-~])?`).Draw(rt, "phone")
		s := strings.NewReplacer("lat_deg: -31.5", "lat_deg: "+digits, "lead: 5s", "lead: "+lead+", phone: '"+strings.ReplaceAll(phone, "'", "''")+"'").Replace(smallest)
		c, err := parse(s)
		if err != nil {
			if strings.Contains(err.Error(), ".lead: ") { // over an hour
				return
			}
			rt.Fatal(err)
		}
		if got := c.Rules.Authorities[0].Phone; got != phone {
			rt.Fatalf("phone %q came in as %q", phone, got)
		}
		again, err := parse(string(c.Canonical()))
		if err != nil {
			rt.Fatalf("%v\n%s", err, c.Canonical())
		}
		if d := same(c, again); d != "" {
			rt.Fatal(d)
		}
	})
}

func TestNoKeyHoldsASecret(t *testing.T) {
	c, err := parse(text(t, "full.yaml"))
	if err != nil {
		t.Fatal(err)
	}
	for _, word := range []string{"password", "secret", "bw_"} {
		if strings.Contains(string(c.Canonical()), word) || strings.Contains(string(config.Schema()), word) {
			t.Errorf("%s stands in the text or the schema", word)
		}
	}
}

func FuzzParse(f *testing.F) {
	f.Add(smallest)
	f.Add(smallest + "rearm: {by_itself: []}\nlayouts: {a: b}\naccess: {tokens_file: t}\n")
	full, err := os.ReadFile(site + "full.yaml")
	if err != nil {
		f.Fatal(err)
	}
	f.Add(string(full))
	f.Add("site: &a {name: *a}\n")
	f.Add("- [{? {a: b} : c}]\n")
	f.Add("\"a\\u0000\": !!binary |\n  a\n")
	f.Fuzz(func(t *testing.T, s string) { comesBack(t, s) })
}

// FuzzValue writes anything in place of any one value of the full site, which
// gets past the shape of the text more often than any text would.
func FuzzValue(f *testing.F) {
	full, err := os.ReadFile(site + "full.yaml")
	if err != nil {
		f.Fatal(err)
	}
	values := regexp.MustCompile(`: ([^,{}\[\]\n]+)`).FindAllSubmatchIndex(full, -1)
	for i, v := range values {
		f.Add(i, string(full[v[2]:v[3]]))
	}
	for _, s := range []string{"0", "-0", "1e3", "999999999d", "9223372036854775807ms", "~", "!x y", "{}", "[a]", "'it''s'", `"\u00e4"`} {
		f.Add(7, s)
	}
	f.Fuzz(func(t *testing.T, i int, s string) {
		if i < 0 {
			return
		}
		v := values[i%len(values)]
		comesBack(t, string(full[:v[2]])+s+string(full[v[3]:]))
	})
}

// comesBack wants a text to be refused with a reason, or to mean the same by
// its canonical text.
func comesBack(t *testing.T, s string) {
	t.Helper()
	c, err := parse(s)
	if err != nil {
		if c != nil || err.Error() == "" {
			t.Fatalf("refused with %v and %q", c, err)
		}
		return
	}
	if err := c.Rules.Validate(); err != nil {
		t.Fatal(err)
	}
	if c.Rules.Digest == (closures.Digest{}) {
		t.Fatal("no digest")
	}
	again, err := parse(string(c.Canonical()))
	if err != nil {
		t.Fatalf("canonical text is refused: %v\n%s", err, c.Canonical())
	}
	if d := same(c, again); d != "" {
		t.Fatalf("canonical text means something else: %s", d)
	}
	if !bytes.Equal(c.Canonical(), again.Canonical()) {
		t.Fatal("canonical text is not canonical")
	}
}
