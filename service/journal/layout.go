package journal

import (
	"encoding/binary"
	"errors"
	"time"
)

// entryHead is the size of an entry without its kind and body.
const entryHead = 8 + 8 + 4 + 2 + 4

func (e *Entry) size() int { return entryHead + len(e.Kind) + len(e.Body) }

// appendEntry writes e, which check passed, in the layout of the package
// comment.
func appendEntry(b []byte, e *Entry) []byte {
	b = binary.BigEndian.AppendUint64(b, e.Seq)
	b = binary.BigEndian.AppendUint64(b, uint64(e.At.Unix()))
	b = binary.BigEndian.AppendUint32(b, uint32(e.At.Nanosecond()))
	b = binary.BigEndian.AppendUint16(b, uint16(len(e.Kind)))
	b = append(b, e.Kind...)
	b = binary.BigEndian.AppendUint32(b, uint32(len(e.Body)))
	return append(b, e.Body...)
}

var errLayout = errors.New("the entries are not in the layout of a block")

// cutEntry reads the first entry of b. The body shares b's memory. It takes
// nothing that appendEntry would not write.
func cutEntry(b []byte) (e Entry, raw, rest []byte, err error) {
	if len(b) < entryHead {
		return Entry{}, nil, nil, errLayout
	}
	e.Seq = binary.BigEndian.Uint64(b)
	sec, nanos := int64(binary.BigEndian.Uint64(b[8:])), binary.BigEndian.Uint32(b[16:])
	if nanos >= 1e9 {
		return Entry{}, nil, nil, errLayout
	}
	e.At = time.Unix(sec, int64(nanos)).UTC()
	k := int(binary.BigEndian.Uint16(b[20:]))
	if len(b) < entryHead+k {
		return Entry{}, nil, nil, errLayout
	}
	e.Kind = string(b[22 : 22+k])
	n := int64(binary.BigEndian.Uint32(b[22+k:]))
	if n > MaxBody || int64(len(b)) < int64(entryHead+k)+n {
		return Entry{}, nil, nil, errLayout
	}
	end := entryHead + k + int(n)
	e.Body = b[entryHead+k : end : end]
	if e.check() != nil {
		return Entry{}, nil, nil, errLayout
	}
	return e, b[:end], b[end:], nil
}
