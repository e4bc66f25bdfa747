package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/service/config"
)

// listReader reads closure lists from files, each in the way that its place
// asks for.
type listReader struct {
	layout  *listfile.Layout // for every file; nil: as follows
	folders []config.Folder  // files in these by their authority's layout
	layouts map[string]*listfile.Layout
}

// newListReader compiles the layouts that the configuration names, or the one
// at layoutPath, which then reads everything. The configuration may be nil.
func newListReader(c *config.Config, layoutPath string) (*listReader, error) {
	r := &listReader{layouts: map[string]*listfile.Layout{}}
	if layoutPath != "" {
		l, err := compileLayout(layoutPath)
		r.layout = l
		return r, err
	}
	if c == nil {
		return r, nil
	}
	r.folders = c.Folders
	for _, f := range c.Folders {
		if f.Layout == "" || r.layouts[f.Layout] != nil {
			continue
		}
		l, err := compileLayout(c.Layouts[f.Layout])
		if err != nil {
			return nil, &usageError{fmt.Errorf("layouts.%s: %w", f.Layout, err)}
		}
		r.layouts[f.Layout] = l
	}
	return r, nil
}

func compileLayout(path string) (*listfile.Layout, error) {
	text, err := os.ReadFile(path)
	if err != nil {
		return nil, fmt.Errorf("reading layout: %w", err)
	}
	l, err := listfile.CompileLayout(text)
	var bad *listfile.LayoutError
	if errors.As(err, &bad) {
		return nil, badLines(fmt.Sprintf("layout %s", path), bad.Lines, bad.Total)
	}
	return l, err
}

// layoutFor returns the layout of the folder that holds a file; nil for native.
func (r *listReader) layoutFor(path string) *listfile.Layout {
	if r.layout != nil {
		return r.layout
	}
	dir, err := filepath.Abs(filepath.Dir(path))
	if err != nil {
		return nil
	}
	for _, f := range r.folders {
		if f.Layout != "" && filepath.Clean(f.Path) == dir {
			return r.layouts[f.Layout]
		}
	}
	return nil
}

// readList is one file, read.
type readList struct {
	path   string
	list   *closures.List
	report listfile.Report
	lines  []listfile.Taken // what each line was taken for, when a layout read it
	err    error            // a *listfile.Refusal where the text is at fault
}

// read reads one file whole. Explain asks for what each line was taken for.
func (r *listReader) read(path string, explain bool) readList {
	out := readList{path: path}
	f, err := os.Open(path)
	if err != nil {
		out.err = fmt.Errorf("reading list: %w", err)
		return out
	}
	defer f.Close()
	layout := r.layoutFor(path)
	if layout == nil {
		out.list, out.report, out.err = listfile.Load(f, listfile.FormatOf(filepath.Base(path)), listfile.Limits{})
		return out
	}
	if !explain {
		out.list, out.report, out.err = layout.Load(f, listfile.Limits{})
		return out
	}
	var text *closures.ListText
	out.lines, text, out.report, out.err = layout.Explain(f, listfile.Limits{})
	if out.err == nil {
		out.list, err = closures.Index(text)
		out.err = listfile.Explained(text, err)
	}
	return out
}

// badLines makes one error of every bad line: where, what stands there, the
// cause and the mend.
func badLines(what string, lines []listfile.LineError, total int) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: refused whole: %d bad in all", what, total)
	for _, l := range lines {
		b.WriteString("\n" + what)
		if l.Line > 0 {
			fmt.Fprintf(&b, ": line %d", l.Line)
		}
		b.WriteString(": " + l.Cause)
		if l.Mend != "" {
			b.WriteString(": " + l.Mend)
		}
		if l.Text != "" {
			b.WriteString(": " + l.Text)
		}
	}
	if rest := total - len(lines); rest > 0 {
		fmt.Fprintf(&b, "\n%s: and %d more", what, rest)
	}
	return errors.New(b.String())
}

// told turns what reading a list came to into an error with every bad line.
func (l *readList) told() error {
	var bad *listfile.Refusal
	if errors.As(l.err, &bad) {
		return badLines("list "+l.path, bad.Lines, bad.Total)
	}
	if l.err != nil {
		return fmt.Errorf("list %s: %w", l.path, l.err)
	}
	return nil
}

// filesOf returns the files of a folder that can be lists, in order of name:
// not those that are being written (hidden, or ending in .tmp or .part).
func filesOf(dir string) ([]string, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, err
	}
	var out []string
	for _, e := range entries {
		name := e.Name()
		if e.IsDir() || strings.HasPrefix(name, ".") || strings.HasSuffix(name, ".tmp") || strings.HasSuffix(name, ".part") || strings.HasSuffix(name, "~") {
			continue
		}
		out = append(out, filepath.Join(dir, name))
	}
	return out, nil
}
