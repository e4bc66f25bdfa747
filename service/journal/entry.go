package journal

import (
	"errors"
	"fmt"
	"time"
)

// The kinds that the journal knows of.
const (
	// KindDurable is an entry whose body is all that a restart needs, together
	// with the entries after it. Neither it nor anything after the newest of
	// its kind is ever pruned.
	KindDurable = "durable"
	// KindGap stands for entries that were lost to a full queue. Its number is
	// that of the last of them; its body is {"count":n,"first":n,"last":n}.
	// Only the journal writes it.
	KindGap = "gap"
)

// Bounds of one entry. A body as large as MaxBody is far beyond any fact; it
// keeps one entry from filling the queue.
const (
	MaxKind = 64       // bytes
	MaxBody = 16 << 20 // bytes
)

// Entry is one line of the record.
type Entry struct {
	Seq  uint64    // rises strictly; at most the largest int64
	At   time.Time // UTC; any instant, it may go back
	Kind string    // 1 to MaxKind bytes of a-z, 0-9, '-', '.' and '_'
	Body []byte    // opaque; at most MaxBody

	// Urgent asks for the store at once instead of within Options.BlockAge. It
	// is not recorded.
	Urgent bool
}

var (
	// ErrFull is returned by an Append none of whose entries will be on record:
	// they are counted in a gap entry. The caller must not tell anybody that
	// they were recorded, and stays shuttered until the gap is durable.
	ErrFull = errors.New("recording entries: the record queue is full")
	// ErrOrder is returned for numbers that do not rise. Nothing was queued.
	ErrOrder = errors.New("recording entries: the numbers do not rise")
	// ErrConflict is returned for a text under a digest that has another text
	// already. Nothing was queued.
	ErrConflict = errors.New("recording a text: its digest is on record with another text")
	// ErrClosed is returned after Close.
	ErrClosed = errors.New("recording entries: the record is closed")
)

// check says whether the entry can be recorded as it is.
func (e *Entry) check() error {
	switch {
	case e.Seq == 0 || e.Seq > 1<<63-1:
		return fmt.Errorf("recording entry %d: the number must be 1 to 2^63-1", e.Seq)
	case !validKind(e.Kind):
		return fmt.Errorf("recording entry %d: kind %q is not 1 to %d bytes of a-z, 0-9, '-', '.', '_'", e.Seq, e.Kind, MaxKind)
	case len(e.Body) > MaxBody:
		return fmt.Errorf("recording entry %d: a body of %d bytes is over the limit of %d", e.Seq, len(e.Body), MaxBody)
	}
	return nil
}

func validKind(kind string) bool {
	if kind == "" || len(kind) > MaxKind {
		return false
	}
	for i := range len(kind) {
		c := kind[i]
		switch {
		case c >= 'a' && c <= 'z', c >= '0' && c <= '9', c == '-', c == '.', c == '_':
		default:
			return false
		}
	}
	return true
}
