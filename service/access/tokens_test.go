package access

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"log/slog"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"beamward/closures"
)

var made = time.Date(2031, 2, 13, 18, 5, 0, 0, time.UTC)

func newFile(t testing.TB) TokenFile { return TokenFile(filepath.Join(t.TempDir(), "tokens")) }

func add(t testing.TB, f TokenFile, name string, role Role, sources ...closures.Source) Secret {
	t.Helper()
	s, err := f.Add(name, role, sources, made)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestTokensAreAddedListedRevoked(t *testing.T) {
	f := newFile(t)
	if _, err := f.List(); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("a file that is not there: %v", err)
	}
	if err := f.Revoke("ada"); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("revoking from a file that is not there: %v", err)
	}
	a := add(t, f, "ada", Operate, "spotter-east")
	b := add(t, f, "bus", Feed, "north", "catwalk")
	for _, s := range []Secret{a, b} {
		if !regexp.MustCompile(`^bw_[A-Za-z0-9_-]{43}$`).MatchString(s.Reveal()) {
			t.Errorf("a token looks like %s", s.Reveal())
		}
	}
	info, err := os.Stat(string(f))
	if err != nil || info.Mode() != 0o600 {
		t.Errorf("the file has mode %v, %v", info.Mode(), err)
	}
	text, err := os.ReadFile(string(f))
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Contains(text, []byte(a.Reveal())) || bytes.Contains(text, []byte(b.Reveal()[3:])) {
		t.Errorf("the file holds a token in the clear:\n%s", text)
	}
	tokens, err := f.List()
	if err != nil || len(tokens) != 2 || tokens[0].Name != "ada" || tokens[1].Role != "feed" || !tokens[0].Created.Equal(made) ||
		!cmp.Equal(tokens[1].Sources, []closures.Source{"north", "catwalk"}) {
		t.Errorf("listed %+v, %v", tokens, err)
	}
	if err := f.Revoke("ada"); err != nil {
		t.Fatal(err)
	}
	if err := f.Revoke("ada"); err == nil || !strings.Contains(err.Error(), "nobody of that name") {
		t.Errorf("revoking again: %v", err)
	}
	if tokens, err := f.List(); err != nil || len(tokens) != 1 || tokens[0].Name != "bus" {
		t.Errorf("listed %+v, %v", tokens, err)
	}
	again := add(t, f, "ada", Operate)
	if again.Reveal() == a.Reveal() {
		t.Error("the same token was made twice")
	}
	left, err := os.ReadDir(filepath.Dir(string(f)))
	if err != nil || len(left) != 2 { // the file and its lock
		t.Errorf("left behind: %v, %v", left, err)
	}
}

func TestAddRefuses(t *testing.T) {
	f := newFile(t)
	add(t, f, "ada", Operate)
	for want, try := range map[string]func() (Secret, error){
		"has a token: revoke it first":           func() (Secret, error) { return f.Add("Ada", Read, nil, made) },
		"1 to 64 of the characters":              func() (Secret, error) { return f.Add("a b", Read, nil, made) },
		"whoever signs in without a name":        func() (Secret, error) { return f.Add("Local", Admin, nil, made) },
		"role must be":                           func() (Secret, error) { return f.Add("bob", NoRole, nil, made) },
		"must name the sources":                  func() (Secret, error) { return f.Add("bus", Feed, nil, made) },
		"speaks for no source":                   func() (Secret, error) { return f.Add("display", Read, []closures.Source{"north"}, made) },
		"sources must be names":                  func() (Secret, error) { return f.Add("bus", Feed, []closures.Source{"no rth"}, made) },
		"no such file or directory":              func() (Secret, error) { return (f + "/x/y").Add("bob", Read, nil, made) },
		"it may name at most 256 sources":        func() (Secret, error) { return f.Add("bus", Feed, make([]closures.Source, 257), made) },
		"add token \"\\x1b[31m\": its name must": func() (Secret, error) { return f.Add("\x1b[31m", Read, nil, made) },
	} {
		if s, err := try(); err == nil || !strings.Contains(strings.ReplaceAll(err.Error(), "not a directory", "no such file or directory"), want) || s.Reveal() != "" {
			t.Errorf("want %q, got %v, %v", want, err, s)
		}
	}
	if tokens, err := f.List(); err != nil || len(tokens) != 1 {
		t.Errorf("%+v, %v", tokens, err)
	}
}

func TestNoChangeIsLostAmongMany(t *testing.T) {
	f := newFile(t)
	const n = 20
	var wg sync.WaitGroup
	for i := range n {
		wg.Go(func() {
			name := fmt.Sprintf("p-%d", i)
			if _, err := f.Add(name, Read, nil, made); err != nil {
				t.Error(err)
			}
			if i%2 == 0 {
				if err := f.Revoke(name); err != nil {
					t.Error(err)
				}
			}
		})
	}
	wg.Wait()
	tokens, err := f.List()
	if err != nil || len(tokens) != n/2 {
		t.Errorf("%d tokens are left, %v", len(tokens), err)
	}
}

func TestBrokenTokenFilesLetNobodyIn(t *testing.T) {
	f := newFile(t)
	s := add(t, f, "ada", Operate)
	add(t, f, "bob", Read)
	good, err := os.ReadFile(string(f))
	if err != nil {
		t.Fatal(err)
	}
	line := strings.Split(string(good), "\n")[1]
	for name, text := range map[string]string{
		"empty":              "",
		"no head":            string(good[len(tokenHead)+1:]),
		"another head":       strings.Replace(string(good), "tokens 1", "tokens 2", 1),
		"cut in a line":      string(good[:len(good)-20]),
		"cut before the end": string(good[:len(good)-1]),
		"blank line":         string(good) + "\n",
		"line twice":         string(good) + line + "\n",
		"name in upper case": string(good) + strings.Replace(strings.Replace(line, "ada", "ADA", 1), `"sha256":"`, `"sha256":"00`, 1) + "\n",
		"unknown key":        strings.Replace(string(good), `{"name"`, `{"rank":1,"name"`, 1),
		"key twice":          strings.Replace(string(good), `{"name"`, `{"name":"eve","name"`, 1),
		"key in upper case":  strings.Replace(string(good), `"role":"read"`, `"Role":"admin"`, 1),
		"role unknown":       strings.Replace(string(good), "operate", "root", 1),
		"role raised":        strings.Replace(string(good), `"role":"read"`, `"role":"read","sources":["north"]`, 1),
		"digest cut":         strings.Replace(string(good), `"sha256":"`, `"sha256":"a`, 1),
		"digest in capitals": strings.ToUpper(line),
		"space":              strings.Replace(string(good), `":"ada"`, `": "ada"`, 1),
		"trailing data":      strings.Replace(string(good), "}\n", "} {}\n", 1),
		"CRLF":               strings.ReplaceAll(string(good), "\n", "\r\n"),
		"a comment":          "# tokens\n" + string(good),
		"an hour ahead":      strings.Replace(string(good), "18:05:00Z", "18:05:00+01:00", 1),
		"too long":           string(good) + strings.Repeat("#", maxTokenBytes),
	} {
		if err := os.WriteFile(string(f), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		if tokens, err := f.List(); err == nil {
			t.Errorf("%s is read as %+v", name, tokens)
			continue
		}
		g, err := New(Options{TokensFile: string(f)})
		if err != nil {
			t.Fatal(err)
		}
		if p, err := g.Token(remote("192.0.2.1:1"), s.Reveal()); err == nil || p.Name != "" {
			t.Errorf("%s lets in %+v", name, p)
		}
		if g.Err() == nil {
			t.Errorf("%s: the guard does not say why", name)
		}
	}
}

func TestTokenFileThatOthersCanTouch(t *testing.T) {
	f := newFile(t)
	s := add(t, f, "ada", Operate)
	for _, mode := range []os.FileMode{0o640, 0o604, 0o620, 0o602, 0o660, 0o644, 0o666, 0o601} {
		if err := os.Chmod(string(f), mode); err != nil {
			t.Fatal(err)
		}
		if _, err := f.List(); err == nil || !strings.Contains(err.Error(), "make it 0600") {
			t.Errorf("mode %#o: %v", mode, err)
		}
		g, err := New(Options{TokensFile: string(f)})
		if err != nil {
			t.Fatal(err)
		}
		if p, err := g.Token(remote("192.0.2.1:1"), s.Reveal()); err == nil {
			t.Errorf("mode %#o lets in %+v", mode, p)
		}
	}
	dir := newFile(t)
	if err := os.Mkdir(string(dir), 0o700); err != nil {
		t.Fatal(err)
	}
	if _, err := dir.List(); err == nil {
		t.Error("a folder is read as tokens")
	}
	if os.Geteuid() == 0 { // only root can give a file away
		if err := os.Chmod(string(f), 0o600); err != nil {
			t.Fatal(err)
		}
		if err := os.Chown(string(f), 65534, -1); err != nil {
			t.Fatal(err)
		}
		if _, err := f.List(); err == nil || !strings.Contains(err.Error(), "another user") {
			t.Errorf("a file of another user: %v", err)
		}
	}
}

// BW-030
func TestSecretsDoNotPrint(t *testing.T) {
	s := mint()
	inside := struct {
		s Secret
		P *Secret
		M map[string]Secret
	}{s, &s, map[string]Secret{"a": s}}
	var log bytes.Buffer
	l := slog.New(slog.NewJSONHandler(&log, nil))
	l.Info("made", "secret", s, "inside", inside, "error", fmt.Errorf("%v: %w", s, errors.New("x")))
	slog.New(slog.NewTextHandler(&log, nil)).Info("made", "secret", s, "inside", inside)
	j, err := json.Marshal(inside)
	if err != nil {
		t.Fatal(err)
	}
	out := log.String() + string(j)
	for _, verb := range []string{"%v", "%+v", "%#v", "%s", "%q", "%x", "%X", "%d", "%t", "%e"} {
		out += fmt.Sprintf(verb+" "+verb+" "+verb, s, &s, inside)
	}
	if strings.Contains(out, s.Reveal()[3:]) || strings.Contains(strings.ToLower(out), fmt.Sprintf("%x", s.Reveal()[3:])) {
		t.Errorf("the token shows in\n%s", out)
	}
}

func TestParseSecretTakesOneSpelling(t *testing.T) {
	s := mint().Reveal()
	if p, ok := parseSecret(s); !ok || p.Reveal() != s {
		t.Error("a token is not taken")
	}
	last := s[:len(s)-1]
	for _, bad := range []string{"", "bw_", s[3:], s + "A", last, "BW_" + s[3:], " " + s, s + "=", strings.Replace(s, "_", "-", 1), last + "\n", last + "é"} {
		if _, ok := parseSecret(bad); ok {
			t.Errorf("%q is taken", bad)
		}
	}
	// The last of 43 digits carries four bits; the two below it must be zero,
	// or one token had four spellings.
	spellings := 0
	for _, c := range "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_" {
		if _, ok := parseSecret(last + string(c)); ok {
			spellings++
		}
	}
	if spellings != 16 {
		t.Errorf("%d of the 64 last digits are taken, want 16", spellings)
	}
}

func FuzzParseTokens(f *testing.F) {
	file := newFile(f)
	add(f, file, "ada", Operate, "spotter-east")
	add(f, file, "bus", Feed, "north")
	b, err := os.ReadFile(string(file))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(b)
	f.Add([]byte(tokenHead + "\n"))
	f.Add([]byte(tokenHead + "\n{}\n"))
	f.Fuzz(func(t *testing.T, b []byte) {
		tokens, err := parseTokens(b)
		if err != nil {
			if tokens != nil {
				t.Fatal("tokens beside an error")
			}
			return
		}
		same, err := formatTokens(tokens)
		if err != nil || !bytes.Equal(same, b) {
			t.Fatalf("%q comes back as %q, %v", b, same, err)
		}
	})
}
