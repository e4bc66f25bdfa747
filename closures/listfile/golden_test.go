package listfile

import (
	"bytes"
	"crypto/sha256"
	"flag"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"beamward/closures"
)

var update = flag.Bool("update", false, "write the golden files anew")

const goldenList = "../../testdata/lists/orbital-desk_2031-045-B"

// native are the native formats with their writers.
var native = []struct {
	format Format
	write  func(io.Writer, *closures.ListText) error
}{{YAML, WriteYAML}, {JSON, WriteJSON}, {CSV, WriteCSV}}

func golden(t testing.TB, f Format) []byte {
	t.Helper()
	b, err := os.ReadFile(goldenList + "." + f.String())
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func mustRead(t testing.TB, text []byte, f Format) *closures.ListText {
	t.Helper()
	l, _, err := Read(bytes.NewReader(text), f, Limits{})
	if err != nil {
		t.Fatalf("%v: %v\n%.2000s", f, err, text)
	}
	return l
}

// meaning compares lists but for the lines they stood on.
var meaning = cmp.Options{cmpopts.IgnoreFields(closures.ListText{}, "Lines"), cmpopts.IgnoreFields(closures.Region{}, "Line")}

func TestGoldenListIsTheSameInEveryFormat(t *testing.T) {
	first := mustRead(t, golden(t, YAML), YAML)
	if !first.Proof.Digest || !first.Proof.Count {
		t.Errorf("proof %+v, want both", first.Proof)
	}
	for _, n := range native {
		text := golden(t, n.format)
		for _, f := range []Format{n.format, Auto} {
			l, report, err := Load(bytes.NewReader(text), f, Limits{})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(first, l.Text(), meaning); diff != "" {
				t.Errorf("%v differs from YAML:\n%s", n.format, diff)
			}
			want := Report{Format: n.format, Bytes: int64(len(text)), Lines: bytes.Count(text, []byte("\n"))}
			if report != want {
				t.Errorf("report %+v, want %+v", report, want)
			}
		}
		var again bytes.Buffer
		if err := n.write(&again, first); err != nil {
			t.Fatal(err)
		}
		if *update {
			if err := os.WriteFile(goldenList+"."+n.format.String(), again.Bytes(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		if !bytes.Equal(again.Bytes(), text) {
			t.Errorf("%v is written as\n%s", n.format, again.Bytes())
		}
	}
}

// TestCanonicalForm holds the form and the digest against a file whose SHA-256
// was taken with sha256sum(1).
func TestCanonicalForm(t *testing.T) {
	l := mustRead(t, golden(t, CSV), CSV)
	text, err := os.ReadFile("testdata/canonical.json")
	if err != nil {
		t.Fatal(err)
	}
	const sum = "sha256:34f45e9578ac5a0c5dabaf3f45de268b58099fc9189a0b8925b6b094506c3f3b"
	if d := closures.Digest(sha256.Sum256(text)); d.String() != sum || l.Digest != d {
		t.Errorf("digest %v of the list, %v of the file, want %v", l.Digest, d, sum)
	}
	bare := *l
	bare.Proof = closures.Proof{}
	var b bytes.Buffer
	if err := Canonical(&b, &bare); err != nil {
		t.Fatal(err)
	}
	if b.String() != string(text) {
		t.Errorf("canonical form\n%s\nwant\n%s", b.String(), text)
	}
}

func TestLinesAreWhereThingsStand(t *testing.T) {
	for _, n := range native {
		text := golden(t, n.format)
		lines := strings.Split(string(text), "\n")
		l := mustRead(t, text, n.format)
		for i, r := range l.Regions {
			if !strings.Contains(lines[r.Line-1], r.ID) {
				t.Errorf("%v: region %d, %s, is said to stand on line %d: %s", n.format, i, r.ID, r.Line, lines[r.Line-1])
			}
		}
		for i, w := range l.Windows {
			line := lines[l.Lines[i]-1]
			if !strings.Contains(line, l.Regions[w.Region].ID) || !strings.Contains(line, w.Span().From.Format("15:04:05")) {
				t.Errorf("%v: window %d is said to stand on line %d: %s", n.format, i, l.Lines[i], line)
			}
		}
	}
}

func TestSummaryText(t *testing.T) {
	s := Summarise(mustRead(t, golden(t, CSV), CSV))
	var b bytes.Buffer
	if err := s.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	file := filepath.Join("testdata", "summary.txt")
	if *update {
		if err := os.WriteFile(file, b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), b.String()); diff != "" {
		t.Error(diff)
	}
}

// TestClosedTimeAgainstCounting takes the closed time of each region second by
// second.
func TestClosedTimeAgainstCounting(t *testing.T) {
	l := mustRead(t, golden(t, YAML), YAML)
	const step = 125 * time.Millisecond // every edge of the golden list lies on it
	for i, r := range Summarise(l).Regions {
		var closed time.Duration
		opens := false
		for _, w := range l.Windows {
			opens = opens || int(w.Region) == i && w.Open
		}
		for at := l.Covers.From; at.Before(l.Covers.Until); at = at.Add(step) {
			shut := opens || r.Throughout == closures.ThroughoutClosed
			for _, w := range l.Windows {
				if int(w.Region) == i && w.Open && w.Span().Contains(at) {
					shut = false
				}
			}
			for _, w := range l.Windows {
				if int(w.Region) == i && !w.Open && w.Span().Contains(at) {
					shut = true
				}
			}
			if shut {
				closed += step
			}
		}
		if closed != r.Closed {
			t.Errorf("region %s closed for %v, counted %v", r.ID, r.Closed, closed)
		}
	}
}
