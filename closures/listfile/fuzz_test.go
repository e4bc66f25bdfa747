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
