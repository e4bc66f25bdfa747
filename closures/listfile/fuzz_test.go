package listfile

import (
	"bytes"
	"testing"

	"github.com/google/go-cmp/cmp"

	"beamward/closures"
)

// roundTrip reads any text; what is accepted is ready for use, and comes back
// the same from its canonical form and from every format.
func roundTrip(t *testing.T, text []byte, f Format) {
	l, _, err := Read(bytes.NewReader(text), f, Limits{})
	if err != nil {
		return
	}
	if _, err := closures.Index(l); err != nil {
		t.Fatalf("accepted, and then not: %v", err)
	}
	same := func(text []byte, f Format) {
		again, _, err := Read(bytes.NewReader(text), f, Limits{})
		if err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		again.Proof = l.Proof
		if diff := cmp.Diff(l, again, meaning); diff != "" {
			t.Fatalf("%s\n%s", diff, text)
		}
	}
	var b bytes.Buffer
	if err := Canonical(&b, l); err != nil {
		t.Fatal(err)
	}
	same(b.Bytes(), JSON)
	for _, n := range native {
		b.Reset()
		if err := n.write(&b, l); err != nil {
			t.Fatal(err)
		}
		same(b.Bytes(), n.format)
	}
	s := Summarise(l)
	if err := s.WriteText(&b); err != nil {
		t.Fatal(err)
	}
}

func fuzz(f *testing.F, format Format) {
	f.Add(golden(f, format))
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, text []byte) { roundTrip(t, text, format) })
}

func FuzzYAML(f *testing.F) { fuzz(f, YAML) }
func FuzzJSON(f *testing.F) { fuzz(f, JSON) }
func FuzzCSV(f *testing.F)  { fuzz(f, CSV) }

// FuzzLayoutText reads any text by each of the invented layouts.
func FuzzLayoutText(f *testing.F) {
	var all []*Layout
	for i, name := range invented {
		all = append(all, compiled(f, file(f, name+".yaml")))
		f.Add(byte(i), file(f, name+".txt"))
	}
	f.Fuzz(func(t *testing.T, which byte, text []byte) {
		l := all[int(which)%len(all)]
		list, _, err := l.Read(bytes.NewReader(text), Limits{})
		lines, again, _, err2 := l.Explain(bytes.NewReader(text), Limits{})
		if (err == nil) != (err2 == nil) || err == nil && !sameBytes(t, list, again) {
			t.Fatalf("explained as something else: %v, %v", err, err2)
		}
		if err := WriteExplanation(&bytes.Buffer{}, lines); err != nil {
			t.Fatal(err)
		}
		if err != nil {
			return
		}
		var b bytes.Buffer
		if err := Canonical(&b, list); err != nil {
			t.Fatal(err)
		}
		roundTrip(t, b.Bytes(), JSON)
		if native, _, err := Read(bytes.NewReader(b.Bytes()), JSON, Limits{}); err != nil || !sameBytes(t, list, native) {
			t.Fatalf("%v\n%s", err, b.Bytes())
		}
	})
}

// FuzzCompileLayout compiles any text; what compiles reads without a panic.
func FuzzCompileLayout(f *testing.F) {
	text := file(f, "report.txt")
	for _, name := range invented {
		f.Add(file(f, name+".yaml"))
	}
	f.Add([]byte(rowLayout))
	f.Fuzz(func(t *testing.T, layout []byte) {
		l, err := CompileLayout(layout)
		if err != nil {
			return
		}
		_, _, _, _ = l.Explain(bytes.NewReader(text), Limits{})
	})
}
