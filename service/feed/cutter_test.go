package feed

import (
	"bytes"
	"strings"
	"testing"

	"beamward/closures/wire"

	"pgregory.net/rapid"
)

// However a text comes in pieces, the same lines are cut from it; those that
// are too long are told once each, and nothing else is lost.
func TestCutterAgreesWithCuttingTheWhole(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var text []byte
		var want []string
		for range rapid.IntRange(0, 12).Draw(t, "lines") {
			n := rapid.SampledFrom([]int{0, 1, 7, wire.MaxFactLine - 1, wire.MaxFactLine, wire.MaxFactLine + 1, wire.MaxFactLine + 2, 3 * wire.MaxFactLine}).Draw(t, "length")
			line := strings.Repeat(rapid.SampledFrom([]string{"a", "b", "\r", " "}).Draw(t, "letter"), n)
			text = append(text, line...)
			text = append(text, rapid.SampledFrom([]string{"\n", "\r\n"}).Draw(t, "end")...)
			whole := bytes.TrimSuffix(text[bytes.LastIndexByte(text[:len(text)-1], '\n')+1:len(text)-1], []byte{'\r'})
			if len(whole) > wire.MaxFactLine {
				want = append(want, "long")
			} else {
				want = append(want, string(whole))
			}
		}
		text = append(text, "unfinished"...)
		var c cutter
		var got []string
		for rest := text; len(rest) > 0; {
			n := min(len(rest), rapid.SampledFrom([]int{1, 2, 1000, wire.MaxFactLine, 1 << 20}).Draw(t, "piece"))
			if n < 3 && len(rest) > 1<<16 {
				n = 777
			}
			if err := c.cut(rest[:n], func(line []byte, long bool) error {
				if long {
					got = append(got, "long")
				} else {
					got = append(got, string(line))
				}
				return nil
			}); err != nil {
				t.Fatal(err)
			}
			rest = rest[n:]
		}
		if len(got) != len(want) {
			t.Fatalf("%d lines, want %d", len(got), len(want))
		}
		for i := range got {
			if got[i] != want[i] {
				t.Fatalf("line %d: %.20q, want %.20q", i, got[i], want[i])
			}
		}
		if cap(c.rest) > 8*wire.MaxFactLine {
			t.Fatalf("%d bytes are kept", cap(c.rest))
		}
	})
}
