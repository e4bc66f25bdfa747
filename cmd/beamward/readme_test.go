package main

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"syscall"
	"testing"
	"time"

	"beamward/closures/listfile"
	"beamward/closures/plan"
	"beamward/closures/wire"
	"beamward/service/config"
)

// example is one fenced block of the README: its language, what it is an
// example of, and its text.
type example struct{ language, of, text string }

var fence = regexp.MustCompile("(?ms)^```(\\w+)(?: (\\w+))?\n(.*?)^```$")

func readme(t *testing.T) (whole string, examples []example) {
	t.Helper()
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range fence.FindAllStringSubmatch(string(text), -1) {
		examples = append(examples, example{m[1], m[2], m[3]})
	}
	if len(examples) < 10 {
		t.Fatalf("README has only %d examples", len(examples))
	}
	return string(text), examples
}

// Every example of the README that is a document is read by the reader that it
// is for.
func TestReadmeDocuments(t *testing.T) {
	_, examples := readme(t)
	read := map[string]int{}
	for _, e := range examples {
		read[e.of]++
		switch e.of {
		case "config":
			if _, err := config.Parse([]byte(e.text), "/"); err != nil {
				t.Error(err)
			}
		case "list":
			f, _ := listfile.ParseFormat(e.language)
			if _, _, err := listfile.Load(strings.NewReader(e.text), f, listfile.Limits{}); err != nil {
				t.Errorf("list in %s: %v", e.language, err)
			}
		case "layout":
			if _, err := listfile.CompileLayout([]byte(e.text)); err != nil {
				t.Errorf("layout: %v", err)
			}
		case "facts":
			for n, line := range wire.Lines([]byte(e.text)) {
				if _, _, err := wire.ParseFact(line, time.Date(2031, 2, 14, 3, 11, 1, 0, time.UTC)); err != nil {
					t.Errorf("fact %d: %v", n, err)
				}
			}
		case "targets":
			if _, err := plan.ReadTargets(strings.NewReader(e.text)); err != nil {
				t.Errorf("targets: %v", err)
			}
		}
	}
	for of, least := range map[string]int{"config": 1, "list": 3, "layout": 1, "facts": 1, "targets": 1, "run": 3} {
		if read[of] < least {
			t.Errorf("README has %d examples of %s", read[of], of)
		}
	}
}

// Every command line of the README is one that the program takes.
func TestReadmeCommands(t *testing.T) {
	_, examples := readme(t)
	lines := 0
	for _, e := range examples {
		if e.language != "sh" {
			continue
		}
		for _, line := range strings.Split(e.text, "\n") {
			line, _, _ = strings.Cut(line, " #")
			line = strings.TrimPrefix(line, "./")
			words := shellWords(line)
			if len(words) == 0 || words[0] != "beamward" {
				continue
			}
			lines++
			root := rootCommand(&console{in: strings.NewReader(""), out: io.Discard, err: io.Discard})
			c, rest, err := root.Find(words[1:])
			if err != nil {
				t.Errorf("%s: %v", line, err)
				continue
			}
			if end := strings.Index(strings.Join(rest, "\x00"), "||"); end >= 0 {
				rest = strings.Split(strings.TrimSuffix(strings.Join(rest, "\x00")[:end], "\x00"), "\x00")
			}
			if err := c.ParseFlags(rest); err != nil {
				t.Errorf("%s: %v", line, err)
				continue
			}
			if err := c.ValidateArgs(c.Flags().Args()); err != nil {
				t.Errorf("%s: %v", line, err)
			}
		}
	}
	if lines < 20 {
		t.Errorf("only %d command lines were tried", lines)
	}
}

// shellWords splits a line as a shell would that knows quotes and no more.
func shellWords(line string) []string {
	var words []string
	var word strings.Builder
	quote, some := rune(0), false
	for _, r := range line {
		switch {
		case quote != 0 && r == quote:
			quote = 0
		case quote != 0:
			word.WriteRune(r)
		case r == '"' || r == '\'':
			quote, some = r, true
		case r == ' ':
			if some {
				words = append(words, word.String())
			}
			word.Reset()
			some = false
		default:
			word.WriteRune(r)
			some = true
		}
	}
	if some {
		words = append(words, word.String())
	}
	return words
}

// Every route of the README's table is one that the service describes, and
// the other way round.
func TestReadmeRoutes(t *testing.T) {
	t.Parallel()
	whole, _ := readme(t)
	_, path := quickSite(t)
	p, err := launch(path)
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = p.end(syscall.SIGKILL) }()
	var served struct {
		Paths map[string]map[string]any `json:"paths"`
	}
	if err := get(p.api+"/openapi.json", &served); err != nil {
		t.Fatal(err)
	}
	told := map[string]bool{"get /openapi.json": true}
	row := regexp.MustCompile("(?m)^\\| `(GET|POST) (/[^|]*)\\|")
	for _, m := range row.FindAllStringSubmatch(whole, -1) {
		for _, route := range regexp.MustCompile(`/[a-z][^\s`+"`"+`]*`).FindAllString(m[2], -1) {
			told[strings.ToLower(m[1])+" "+route] = true
			if served.Paths[route][strings.ToLower(m[1])] == nil {
				t.Errorf("README tells of %s %s, which is not served", m[1], route)
			}
		}
	}
	for route, methods := range served.Paths {
		for method := range methods {
			if !told[method+" "+route] {
				t.Errorf("README does not tell of %s %s", method, route)
			}
		}
	}
}

// The walk through the example site works as it is written, on other ports.
func TestReadmeWalk(t *testing.T) {
	t.Parallel()
	if _, err := exec.LookPath("curl"); err != nil {
		t.Skip("the walk uses curl")
	}
	_, examples := readme(t)
	text, err := os.ReadFile("../../testdata/site/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	site := filepath.Join(dir, "testdata", "site")
	if err := os.MkdirAll(site, 0o700); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(site, "beamward.yaml")
	if err := os.WriteFile(path, []byte(siteCopy(string(text))), 0o600); err != nil {
		t.Fatal(err)
	}
	p, err := launch(path)
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = p.end(syscall.SIGKILL) }()
	there := strings.NewReplacer("http://127.0.0.1:8460", p.api, "http://127.0.0.1:8461", p.permit)
	for _, e := range examples {
		if e.of != "run" {
			continue
		}
		c := exec.Command("bash", "-euo", "pipefail", "-c", there.Replace(e.text))
		c.Dir = dir
		c.Env = append(os.Environ(), "BEAMWARD_SERVER="+p.api)
		var out bytes.Buffer
		c.Stdout, c.Stderr = &out, &out
		if err := c.Run(); err != nil {
			t.Fatalf("%v\n%s\n%s\nthe log:\n%s", err, e.text, out.Bytes(), p.log)
		}
		if testing.Verbose() {
			fmt.Printf("%s\n%s\n", e.text, out.Bytes())
		}
	}
	if err := p.end(syscall.SIGTERM); err != nil {
		t.Error(err)
	}
}
