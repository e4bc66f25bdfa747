package listfile

import (
	"bytes"
	"strings"
	"testing"

	"beamward/closures"
)

// TestNoDamageChangesTheMeaning flips every bit and cuts at every byte of the
// golden list in each format. What is still accepted as carrying its digest
// says the same; what no longer carries one is refused where a digest is asked
// for.
func TestNoDamageChangesTheMeaning(t *testing.T) {
	for _, n := range native {
		text := golden(t, n.format)
		want := mustRead(t, text, n.format)
		accepted, unproven := 0, 0
		check := func(damaged []byte, what string, at int) {
			l, _, err := Read(bytes.NewReader(damaged), n.format, Limits{})
			if err != nil {
				return
			}
			if !l.Proof.Digest {
				unproven++
				return
			}
			accepted++
			if !sameBytes(t, want, l) {
				t.Errorf("%v: %s %d is accepted with another meaning:\n%s", n.format, what, at, damaged)
			}
		}
		for i := range text {
			for bit := range 8 {
				text[i] ^= 1 << bit
				check(text, "a flip at byte", i)
				text[i] ^= 1 << bit
			}
			check(text[:i], "a cut at byte", i)
		}
		t.Logf("%v: of %d flips and %d cuts %d were accepted with the same meaning, %d without proof", n.format, 8*len(text), len(text), accepted, unproven)
		if unproven > 0 {
			t.Errorf("%v: %d variants dropped the digest itself: look whether that is meant", n.format, unproven)
		}
	}
}

func sameBytes(t *testing.T, a, b *closures.ListText) bool {
	t.Helper()
	var x, y bytes.Buffer
	if err := Canonical(&x, a); err != nil {
		t.Fatal(err)
	}
	if err := Canonical(&y, b); err != nil {
		t.Fatal(err)
	}
	return bytes.Equal(x.Bytes(), y.Bytes())
}

// TestDamageWithoutADigestIsMostlyRefused does the same without the digest, for
// every fourth byte and for every cut, and shows how much the format's
// strictness and the count alone catch.
func TestDamageWithoutADigestIsMostlyRefused(t *testing.T) {
	for _, n := range native {
		text := []byte(undigested(t, n.format))
		want := mustRead(t, text, n.format)
		no, same, other := 0, 0, 0
		for i := range text {
			for bit := range 8 {
				if i%4 != 0 {
					break
				}
				text[i] ^= 1 << bit
				l, _, err := Read(bytes.NewReader(text), n.format, Limits{})
				switch {
				case err != nil:
					no++
				case l.Digest == want.Digest:
					same++
				default:
					other++
				}
				text[i] ^= 1 << bit
			}
			if l, _, err := Read(bytes.NewReader(text[:i]), n.format, Limits{}); err == nil && l.Digest != want.Digest {
				t.Errorf("%v: cut at byte %d is accepted with another meaning, though it carries its count", n.format, i)
			}
		}
		t.Logf("%v: of %d flips %d refused, %d the same, %d another list", n.format, no+same+other, no, same, other)
	}
}

// TestLinesTakenOutOrDoubled loses or repeats each line in turn: the window
// count alone must notice, unless the line says nothing.
func TestLinesTakenOutOrDoubled(t *testing.T) {
	for _, n := range native {
		lines := strings.SplitAfter(undigested(t, n.format), "\n")
		want := mustRead(t, []byte(strings.Join(lines, "")), n.format)
		for i, line := range lines {
			if line == "" || strings.Contains(line, "window_count") || strings.Contains(line, "replaces: ") || strings.Contains(line, "beams: ") {
				continue // optional keys, which only a digest guards
			}
			without := strings.Join(lines[:i], "") + strings.Join(lines[i+1:], "")
			double := strings.Join(lines[:i+1], "") + strings.Join(lines[i:], "")
			for _, text := range []string{without, double} {
				l, _, err := Read(strings.NewReader(text), n.format, Limits{})
				// A region may go, with nothing but the sky outside it in its
				// place, or a point of a track: these too only a digest guards.
				if err == nil && l.Digest != want.Digest && len(l.Windows) != len(want.Windows) {
					t.Errorf("%v: accepted without or with two of line %d: %s", n.format, i+1, line)
				}
			}
		}
	}
}
