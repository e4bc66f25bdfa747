package wire

import (
	"bytes"
	"iter"
)

// Lines walks the lines of a body of facts: each with its number from 1,
// without its line end, LF or CR LF. Blank lines are counted and passed over.
func Lines(data []byte) iter.Seq2[int, []byte] {
	return func(yield func(int, []byte) bool) {
		for n := 1; len(data) > 0; n++ {
			var line []byte
			line, data, _ = bytes.Cut(data, []byte{'\n'})
			line = bytes.TrimSuffix(line, []byte{'\r'})
			if len(line) > 0 && !yield(n, line) {
				return
			}
		}
	}
}
