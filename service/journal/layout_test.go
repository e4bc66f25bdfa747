package journal

import (
	"bytes"
	"testing"
	"time"
)

// Whatever walk takes for a block's entries is what appendEntry writes for
// them: there is one way to write an entry.
func FuzzWalk(f *testing.F) {
	var some []byte
	for _, e := range []Entry{entry(1, "aim"), entry(2, KindDurable), {Seq: 9, At: time.Time{}, Kind: "x"}} {
		some = appendEntry(some, &e)
	}
	f.Add(some)
	f.Add(some[:len(some)-1])
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, raw []byte) {
		var again []byte
		n := 0
		h, _, err := walk(raw, Digest{}, func(e Entry, _ Digest) error {
			again = appendEntry(again, &e)
			n++
			return nil
		})
		if !bytes.HasPrefix(raw, again) || (err == nil && len(again) != len(raw)) {
			t.Fatalf("read %x, wrote %x", raw, again)
		}
		if h.count != n {
			t.Fatalf("counted %d of %d", h.count, n)
		}
	})
}

func FuzzUnpack(f *testing.F) {
	c, err := newCodec()
	must(f, err)
	f.Cleanup(c.close)
	f.Add(c.pack([]byte("some text some text some text")), int64(29))
	f.Add([]byte{}, int64(0))
	f.Fuzz(func(t *testing.T, b []byte, size int64) {
		plain, err := c.unpack(b, size)
		if err != nil {
			return
		}
		if int64(len(plain)) != size {
			t.Fatalf("%d bytes instead of %d", len(plain), size)
		}
		if again, err := c.unpack(c.pack(plain), size); err != nil || !bytes.Equal(again, plain) {
			t.Fatalf("packed again: %v", err)
		}
	})
}
