package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"strings"
	"testing"
)

// refusing takes nothing, as a pipe whose reader is gone.
type refusing struct{}

func (refusing) Write([]byte) (int, error) { return 0, errors.New("nobody reads") }

// A result that nobody received is no success.
func TestOutputThatCannotBeWritten(t *testing.T) {
	var said bytes.Buffer
	for _, args := range [][]string{{"version"}, {"config", "schema"}, {"version", "--json"}} {
		said.Reset()
		if got := run(t.Context(), args, strings.NewReader(""), refusing{}, &said); got != failed {
			t.Errorf("%v ended with %d", args, got)
		}
		if !strings.Contains(said.String(), "nobody reads") {
			t.Errorf("%v said %q", args, said.String())
		}
	}
}

func TestTable(t *testing.T) {
	var out bytes.Buffer
	c := &console{out: &out}
	if err := c.table([][]string{{"A", "LONG", "C"}, {"Ω1", "x", ""}, {"two", "", "y"}}); err != nil {
		t.Fatal(err)
	}
	if want := "A    LONG  C\nΩ1   x\ntwo        y\n"; out.String() != want {
		t.Errorf("got\n%swant\n%s", out.String(), want)
	}
}

// Progress is for somebody who looks at a terminal, and for nobody else.
func TestProgressIsForTerminals(t *testing.T) {
	var said bytes.Buffer
	p := (&console{err: &said}).watch("blocks")
	p.shown = p.shown.Add(-progressAfter)
	p.at(1, 2)
	p.end()
	if said.Len() > 0 {
		t.Errorf("it said %q to a file", said.String())
	}
}

// What the start had to say comes after the line that was to be first.
func TestAddressesComeFirst(t *testing.T) {
	var out bytes.Buffer
	held := &heldWriter{to: &out}
	log := slog.New(logHandler(held, false, "info"))
	log.Error("the record lost its end")
	log.Debug("not told")
	held.first(func() { log.Info("listening") })
	log.Info("running")
	held.release()
	var got []string
	for _, line := range strings.Split(strings.TrimSpace(out.String()), "\n") {
		_, msg, _ := strings.Cut(line, "msg=")
		got = append(got, msg)
	}
	if want := `[listening "the record lost its end" running]`; fmt.Sprint(got) != want {
		t.Errorf("the log is %v, not %s", got, want)
	}
	var early bytes.Buffer
	held = &heldWriter{to: &early}
	_, _ = io.WriteString(held, "why it did not start\n")
	held.release()
	if early.String() != "why it did not start\n" {
		t.Errorf("a start that failed told %q", early.String())
	}
}
