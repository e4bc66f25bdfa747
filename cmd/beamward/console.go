package main

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"strings"
	"time"
	"unicode/utf8"

	"github.com/mattn/go-isatty"
)

// console is where a command reads and speaks: what was asked for to out, all
// else to err.
type console struct {
	in       io.Reader
	out, err io.Writer
	json     bool

	broken error // the first error of writing to out
}

// Write writes to stdout and remembers the first error, so that a result which
// nobody received is no success.
func (c *console) Write(p []byte) (int, error) {
	n, err := c.out.Write(p)
	if err != nil && c.broken == nil {
		c.broken = fmt.Errorf("writing to stdout: %w", err)
	}
	return n, err
}

// printf writes to stdout.
func (c *console) printf(format string, args ...any) { fmt.Fprintf(c, format, args...) }

// say speaks to stderr, one line a call.
func (c *console) say(format string, args ...any) { fmt.Fprintf(c.err, format+"\n", args...) }

// complain tells of an error, each of its lines under the program's name.
func (c *console) complain(err error) {
	for _, line := range strings.Split(err.Error(), "\n") {
		c.say("beamward: %s", line)
	}
}

// document writes one JSON document.
func (c *console) document(v any) error {
	e := json.NewEncoder(c)
	e.SetIndent("", "  ")
	e.SetEscapeHTML(false)
	return e.Encode(v)
}

// object writes one JSON object on a line of its own.
func (c *console) object(v any) error {
	e := json.NewEncoder(c)
	e.SetEscapeHTML(false)
	return e.Encode(v)
}

// table writes rows in columns, two blanks apart; the first row is the head.
func (c *console) table(rows [][]string) error {
	var wide []int
	for _, r := range rows {
		for i, cell := range r {
			if i == len(wide) {
				wide = append(wide, 0)
			}
			wide[i] = max(wide[i], utf8.RuneCountInString(cell))
		}
	}
	var b strings.Builder
	for _, r := range rows {
		line := ""
		for i, cell := range r {
			line += cell + strings.Repeat(" ", wide[i]-utf8.RuneCountInString(cell)+2)
		}
		b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
	_, err := io.WriteString(c, b.String())
	return err
}

// terminal reports whether somebody looks at stderr.
func (c *console) terminal() bool {
	f, is := c.err.(*os.File)
	return is && isatty.IsTerminal(f.Fd())
}

// progress shows how far long work has come, on a terminal only: after a
// second, and at most five times a second.
type progress struct {
	c     *console
	what  string
	shown time.Time
	wrote bool
}

const (
	progressAfter = time.Second
	progressEvery = 200 * time.Millisecond
)

// watch begins to tell of some work.
func (c *console) watch(what string) *progress {
	return &progress{c: c, what: what, shown: time.Now().Add(progressAfter - progressEvery)}
}

// at tells how much of all is done.
func (p *progress) at(done, all int) {
	if now := time.Now(); p.c.terminal() && now.Sub(p.shown) >= progressEvery {
		p.shown, p.wrote = now, true
		fmt.Fprintf(p.c.err, "\r\x1b[K%s: %d of %d", p.what, done, all)
	}
}

// end clears the line.
func (p *progress) end() {
	if p.wrote {
		fmt.Fprint(p.c.err, "\r\x1b[K")
	}
}
