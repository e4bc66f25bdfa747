package replay

import (
	"bufio"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"fmt"
	"io"
	"time"

	"beamward/closures/wire"
	"beamward/service/journal"
)

// mostLine bounds one line of an export: a body of journal.MaxBody whose every
// byte is escaped, and the rest.
const mostLine = 6*journal.MaxBody + 1<<20

// The lines of an export, as the journal writes them.

type blockLine struct {
	First   uint64     `json:"first_seq"`
	Last    uint64     `json:"last_seq"`
	Count   int        `json:"count"`
	AtMin   int64      `json:"at_min_us"`
	AtMax   int64      `json:"at_max_us"`
	Prev    string     `json:"prev"`
	Lists   []listLine `json:"lists"`
	Content string     `json:"content"`
	Digest  string     `json:"digest"`
	Pruned  bool       `json:"pruned"`
}

type listLine struct {
	Digest string `json:"digest"`
	Sum    string `json:"sha256"`
}

type entryLine struct {
	Seq   uint64  `json:"seq"`
	At    string  `json:"at"`
	Kind  string  `json:"kind"`
	Body  *string `json:"body"`
	Bytes []byte  `json:"body_base64"`
	Chain string  `json:"chain"`
}

type endLine struct {
	Blocks  int    `json:"end_blocks"`
	Entries uint64 `json:"entries"`
	Head    string `json:"head"`
}

// lines reads an export line by line from an offset.
type lines struct {
	in     *bufio.Scanner
	offset int64 // of the next line
	n      int   // number of the newest line, from 1
}

func (x *Export) lines(offset int64, n int) (*lines, error) {
	if _, err := x.in.Seek(offset, io.SeekStart); err != nil {
		return nil, fmt.Errorf("reading the export: %w", err)
	}
	s := bufio.NewScanner(x.in)
	s.Buffer(make([]byte, 0, 64<<10), mostLine)
	return &lines{in: s, offset: offset, n: n}, nil
}

func (l *lines) next() ([]byte, error) {
	if !l.in.Scan() {
		if err := l.in.Err(); err != nil {
			return nil, fmt.Errorf("reading the export, line %d: %w", l.n+1, err)
		}
		return nil, fmt.Errorf("reading the export, line %d: it ends before its totals: copy it again", l.n+1)
	}
	b := l.in.Bytes()
	l.n++
	l.offset += int64(len(b)) + 1
	return b, nil
}

func (l *lines) bad(what string) error {
	return fmt.Errorf("reading the export, line %d: %s", l.n, what)
}

func (l *lines) read(line []byte, into any) error {
	if err := wire.Strict(line, into); err != nil {
		return l.bad(err.Error())
	}
	return nil
}

// block reads a block's entries and proves them. The chain is that of the
// journal's package comment.
func (l *lines) block(b *blockLine, see func(*journal.Entry) error) error {
	c, err := hex.DecodeString(b.Prev)
	if err != nil || len(c) != sha256.Size {
		return l.bad("prev is no digest")
	}
	if b.Pruned {
		if c, err = hex.DecodeString(b.Content); err != nil || len(c) != sha256.Size {
			return l.bad("content is no digest")
		}
		return l.seal(b, c)
	}
	if b.Count < 1 || b.Count > journal.MaxBlockEntries {
		return l.bad(fmt.Sprintf("a block of %d entries", b.Count))
	}
	last := uint64(0)
	for i := range b.Count {
		e, linked, err := l.entry()
		if err != nil {
			return err
		}
		c = chained(c, e)
		switch {
		case hex.EncodeToString(c) != linked:
			return l.bad("the entry does not match its value in the chain")
		case i == 0 && e.Seq != b.First, e.Seq <= last, i == b.Count-1 && e.Seq != b.Last:
			return l.bad("the entries' numbers are not the block's")
		}
		last = e.Seq
		if err := see(e); err != nil {
			return err
		}
	}
	if hex.EncodeToString(c) != b.Content {
		return l.bad("the entries are not the block's")
	}
	return l.seal(b, c)
}

func (l *lines) entry() (*journal.Entry, string, error) {
	line, err := l.next()
	if err != nil {
		return nil, "", err
	}
	var x entryLine
	if err := l.read(line, &x); err != nil {
		return nil, "", err
	}
	e := &journal.Entry{Seq: x.Seq, Kind: x.Kind, Body: x.Bytes}
	if x.Body != nil {
		e.Body = []byte(*x.Body)
	}
	if e.At, err = time.Parse(time.RFC3339Nano, x.At); err != nil {
		return nil, "", l.bad("at: it is no instant")
	}
	e.At = e.At.UTC()
	return e, x.Chain, nil
}

func chained(c []byte, e *journal.Entry) []byte {
	b := append([]byte{0x01}, c...)
	b = binary.BigEndian.AppendUint64(b, e.Seq)
	b = binary.BigEndian.AppendUint64(b, uint64(e.At.Unix()))
	b = binary.BigEndian.AppendUint32(b, uint32(e.At.Nanosecond()))
	b = binary.BigEndian.AppendUint16(b, uint16(len(e.Kind)))
	b = append(b, e.Kind...)
	b = binary.BigEndian.AppendUint32(b, uint32(len(e.Body)))
	sum := sha256.Sum256(append(b, e.Body...))
	return sum[:]
}

// seal holds a block against its digest.
func (l *lines) seal(b *blockLine, content []byte) error {
	prev, _ := hex.DecodeString(b.Prev)
	s := append([]byte{0x02}, prev...)
	s = binary.BigEndian.AppendUint64(s, b.First)
	s = binary.BigEndian.AppendUint64(s, b.Last)
	s = binary.BigEndian.AppendUint32(s, uint32(b.Count))
	s = binary.BigEndian.AppendUint64(s, uint64(b.AtMin))
	s = binary.BigEndian.AppendUint64(s, uint64(b.AtMax))
	s = binary.BigEndian.AppendUint32(s, uint32(len(b.Lists)))
	for _, x := range b.Lists {
		sum, err := hex.DecodeString(x.Sum)
		if err != nil || len(sum) != sha256.Size {
			return l.bad("the sum of list " + x.Digest + " is no digest")
		}
		s = binary.BigEndian.AppendUint16(s, uint16(len(x.Digest)))
		s = append(append(s, x.Digest...), sum...)
	}
	sum := sha256.Sum256(append(s, content...))
	if hex.EncodeToString(sum[:]) != b.Digest {
		return l.bad("the block does not match its digest")
	}
	return nil
}
