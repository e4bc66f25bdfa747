package wire

import (
	"encoding/binary"

	"beamward/closures"
)

// AppendDecision appends the form of a decision that the record's tally of all
// decisions sums: big endian, the number (8 bytes), the instant in Unix
// nanoseconds (8), open (1), the codes (4), the end of the opening in Unix
// nanoseconds or all ones where there is none (8), the lengths of the beam's
// name and the reasons (4 each), and the name. It leaves the margins out, which
// change with every decision and would make the form long.
func AppendDecision(dst []byte, d *closures.Decision) []byte {
	dst = binary.BigEndian.AppendUint64(dst, d.Seq)
	dst = binary.BigEndian.AppendUint64(dst, uint64(d.At.UnixNano()))
	open := byte(0)
	if d.Open {
		open = 1
	}
	dst = append(dst, open)
	dst = binary.BigEndian.AppendUint32(dst, uint32(d.Codes))
	until := ^uint64(0)
	if !d.OpenUntil.IsZero() {
		until = uint64(d.OpenUntil.UnixNano())
	}
	dst = binary.BigEndian.AppendUint64(dst, until)
	dst = binary.BigEndian.AppendUint32(dst, uint32(len(d.Beam)))
	dst = binary.BigEndian.AppendUint32(dst, uint32(len(d.Reasons)))
	return append(dst, d.Beam...)
}
