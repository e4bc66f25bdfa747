package service_test

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// root is the module's folder, seen from this one.
const root = ".."

// floors are the house's packages from the top down: one may import those
// below it.
var floors = []string{"cmd", "service", "alerts", "closures", "geometry"}

// siblings are the only imports from one part of the service to another, other
// than by the package that wires them.
var siblings = map[string][]string{
	"service/replay": {"service/journal"},
	"service/night":  {"service/journal", "service/render"},
	"service/api":    {"service/render", "service/access"},
	"service/feed":   {"service/feed/modes", "service/feed/asterix"},
}

// outer parts may import the whole service; it never imports them.
var outer = []string{"service/demo", "service/simulate", "service/doctor"}

// source is one parsed file of the project, tests left out.
type source struct {
	path, pkg string
	file      *ast.File
}

func sources(t *testing.T) (*token.FileSet, []source) {
	t.Helper()
	set := token.NewFileSet()
	var out []source
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() && (d.Name() == "testdata" || strings.HasPrefix(d.Name(), ".") && path != root) {
			return filepath.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") {
			return nil
		}
		f, err := parser.ParseFile(set, path, nil, parser.ParseComments)
		if err != nil {
			return err
		}
		rel, err := filepath.Rel(root, path)
		if err != nil {
			return err
		}
		out = append(out, source{path: filepath.ToSlash(rel), pkg: filepath.ToSlash(filepath.Dir(rel)), file: f})
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if len(out) < 50 {
		t.Fatalf("only %d files were found", len(out))
	}
	return set, out
}

func floor(pkg string) int { return slices.Index(floors, strings.SplitN(pkg, "/", 2)[0]) }

// refusal says why package from may not import package to; empty when it may.
func refusal(from, to string) string {
	a, b := floor(from), floor(to)
	switch {
	case a < 0 || b < 0:
		return "is outside the house"
	case a > b:
		return "goes up"
	case from == "closures":
		if b == a {
			return "the domain package imports none of its subpackages"
		}
	case from == "closures/recheck" && to != "closures":
		return "the second opinion may use the types of closures alone"
	case a == b && floors[a] == "service":
		if from == "service" {
			if slices.Contains(outer, to) {
				return "the service never imports what stands outside it"
			}
			return ""
		}
		if slices.Contains(outer, from) {
			return ""
		}
		if to == "service" || !slices.Contains(siblings[from], to) {
			return "parts of the service import no sibling"
		}
	}
	return ""
}

// The imports go one way: cmd, service, alerts, closures, geometry.
func TestLattice(t *testing.T) {
	set, files := sources(t)
	for _, s := range files {
		if floor(s.pkg) < 0 {
			t.Errorf("%s: outside the house's top level", s.path)
		}
		for _, spec := range s.file.Imports {
			path, _ := strconv.Unquote(spec.Path.Value)
			if to, ours := strings.CutPrefix(path, "beamward/"); ours {
				if why := refusal(s.pkg, to); why != "" {
					t.Errorf("%s imports %s: %s", set.Position(spec.Pos()), to, why)
				}
			}
		}
	}
}

// barred are the packages that the pure core may not import.
var barred = []string{"os", "io/fs", "net", "net/http", "log", "log/slog", "sync", "sync/atomic", "math/rand", "math/rand/v2", "crypto/rand", "context", "os/exec", "syscall", "runtime", "database/sql"}

// The core is pure: no clock, goroutine, channel, lock, log, random or input
// and output.
func TestPureCore(t *testing.T) {
	set, files := sources(t)
	for _, s := range files {
		f := floors[max(floor(s.pkg), 0)]
		if f != "closures" && f != "geometry" {
			continue
		}
		for _, spec := range s.file.Imports {
			path, _ := strconv.Unquote(spec.Path.Value)
			if slices.Contains(barred, path) || strings.HasPrefix(path, "net/") {
				t.Errorf("%s: the core imports %s", set.Position(spec.Pos()), path)
			}
		}
		ast.Inspect(s.file, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.GoStmt:
				t.Errorf("%s: a goroutine in the core", set.Position(n.Pos()))
			case *ast.SelectorExpr:
				if id, is := n.X.(*ast.Ident); is && id.Name == "time" && slices.Contains([]string{"Now", "Since", "Until", "Sleep", "After", "Tick", "NewTimer", "NewTicker", "AfterFunc"}, n.Sel.Name) {
					t.Errorf("%s: the core reads a clock", set.Position(n.Pos()))
				}
			}
			return true
		})
	}
}

// Goroutines start only in the service, in what sends alarms, and in commands;
// only the clock reads the time.
func TestShell(t *testing.T) {
	set, files := sources(t)
	for _, s := range files {
		ast.Inspect(s.file, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.GoStmt:
				if s.pkg == "alerts" {
					t.Errorf("%s: a goroutine outside service, alerts/send and cmd", set.Position(n.Pos()))
				}
			case *ast.FuncDecl:
				if n.Name.Name == "init" && n.Recv == nil {
					t.Errorf("%s: an init function", set.Position(n.Pos()))
				}
			}
			return true
		})
	}
}

// Each package has a doc.go that says what it is for.
func TestEachPackageHasItsDoc(t *testing.T) {
	_, files := sources(t)
	docs := map[string]bool{}
	for _, s := range files {
		if _, known := docs[s.pkg]; !known {
			docs[s.pkg] = false
		}
		if filepath.Base(s.path) == "doc.go" && s.file.Doc != nil {
			docs[s.pkg] = true
		}
	}
	for pkg, has := range docs {
		if !has {
			t.Errorf("%s has no doc.go with a package comment", pkg)
		}
	}
}

var requirement = regexp.MustCompile(`BW-\d{3}`)

// Each numbered requirement of SAFETY.md is named by a test, and no test names
// one that is not there.
func TestEachRequirementHasItsTest(t *testing.T) {
	text, err := os.ReadFile(filepath.Join(root, "SAFETY.md"))
	if err != nil {
		t.Fatal(err)
	}
	stated := map[string]int{}
	for _, line := range strings.Split(string(text), "\n") {
		if strings.HasPrefix(line, "| BW-") {
			stated[requirement.FindString(line)]++
			if !strings.Contains(line, "shall") {
				t.Errorf("not a requirement: %s", line)
			}
		}
	}
	if len(stated) < 20 {
		t.Fatalf("SAFETY.md states only %d requirements", len(stated))
	}
	tested := map[string]string{}
	err = filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() || !strings.HasSuffix(path, "_test.go") || filepath.Base(path) == "lattice_test.go" {
			return err
		}
		body, err := os.ReadFile(path)
		for _, id := range requirement.FindAllString(string(body), -1) {
			tested[id] = path
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	for id, n := range stated {
		if n > 1 {
			t.Errorf("%s is stated %d times", id, n)
		}
		if tested[id] == "" {
			t.Errorf("%s is named by no test", id)
		}
	}
	for id, path := range tested {
		if stated[id] == 0 {
			t.Errorf("%s names %s, which SAFETY.md does not state", path, id)
		}
	}
}

// The top level holds what it should and nothing else.
func TestTopLevel(t *testing.T) {
	want := []string{"DEVELOPERS.md", "README.md", "SAFETY.md", "alerts", "closures", "cmd", "deploy", "geometry", "go.mod", "go.sum", "service", "testdata"}
	entries, err := os.ReadDir(root)
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), ".") {
			got = append(got, e.Name())
		}
	}
	slices.Sort(got)
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("the top level holds %v, not %v", got, want)
	}
}
