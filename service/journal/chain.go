package journal

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"errors"
)

// Digest is a SHA-256 of the chain.
type Digest [sha256.Size]byte

// String is the digest in lower-case hexadecimal.
func (d Digest) String() string { return hex.EncodeToString(d[:]) }

const (
	tagEntry = 0x01
	tagBlock = 0x02
)

// next is the chain's value after one more entry.
func next(c Digest, raw []byte) Digest {
	h := sha256.New()
	h.Write([]byte{tagEntry})
	h.Write(c[:])
	h.Write(raw)
	var d Digest
	h.Sum(d[:0])
	return d
}

// header is what a block's digest covers besides its entries.
type header struct {
	first, last  uint64
	count        int
	atMin, atMax int64 // microseconds since 1970
	lists        []listRef
}

// listRef names a text recorded with a block.
type listRef struct {
	digest string
	sum    Digest
}

func (h *header) seal(prev, content Digest) Digest {
	b := make([]byte, 0, 160)
	b = append(b, tagBlock)
	b = append(b, prev[:]...)
	b = binary.BigEndian.AppendUint64(b, h.first)
	b = binary.BigEndian.AppendUint64(b, h.last)
	b = binary.BigEndian.AppendUint32(b, uint32(h.count))
	b = binary.BigEndian.AppendUint64(b, uint64(h.atMin))
	b = binary.BigEndian.AppendUint64(b, uint64(h.atMax))
	b = binary.BigEndian.AppendUint32(b, uint32(len(h.lists)))
	for _, l := range h.lists {
		b = binary.BigEndian.AppendUint16(b, uint16(len(l.digest)))
		b = append(b, l.digest...)
		b = append(b, l.sum[:]...)
	}
	b = append(b, content[:]...)
	return sha256.Sum256(b)
}

// add takes one more entry into the header's figures.
func (h *header) add(e *Entry) {
	us := e.At.UnixMicro()
	if h.count == 0 {
		h.first, h.atMin, h.atMax = e.Seq, us, us
	}
	h.last = e.Seq
	h.count++
	h.atMin, h.atMax = min(h.atMin, us), max(h.atMax, us)
}

var errNumbers = errors.New("the entries' numbers do not rise")

// walk reads a block's entries in order, with the chain's value after each,
// and gives the header's figures and the content digest that they make.
func walk(raw []byte, prev Digest, see func(Entry, Digest) error) (header, Digest, error) {
	var h header
	c := prev
	for len(raw) > 0 {
		e, own, rest, err := cutEntry(raw)
		if err != nil {
			return h, c, err
		}
		if h.count > 0 && e.Seq <= h.last {
			return h, c, errNumbers
		}
		c = next(c, own)
		h.add(&e)
		if see != nil {
			if err := see(e, c); err != nil {
				return h, c, err
			}
		}
		raw = rest
	}
	return h, c, nil
}
