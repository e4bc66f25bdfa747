package closures

import (
	"cmp"
	"crypto/sha256"
	"slices"
	"time"

	"beamward/geometry/span"
)

// ListStatus says where a list of the book stands.
type ListStatus uint8

// The statuses. A waiting list closes and does not open.
const (
	ListWaiting ListStatus = iota
	ListInForce
	ListReplaced
	ListGone // withdrawn
)

var listStatuses = [...]string{"waiting", "in-force", "replaced", "withdrawn"}

// String returns the status's word.
func (s ListStatus) String() string {
	if int(s) < len(listStatuses) {
		return listStatuses[s]
	}
	return "waiting"
}

// ParseListStatus reads what String writes.
func ParseListStatus(s string) (ListStatus, bool) {
	i := slices.Index(listStatuses[:], s)
	return ListStatus(max(i, 0)), i >= 0
}

// Entry is one list of the book.
type Entry = DurableList

// Book is every list that is known, in order of authority and identifier. It
// is never changed; a change makes a new one.
type Book []Entry

// Find returns the entry of a list, or nil.
func (b Book) Find(a AuthorityID, id ListID) *Entry {
	i, ok := slices.BinarySearchFunc(b, [2]string{string(a), string(id)}, func(e Entry, k [2]string) int {
		return cmp.Or(cmp.Compare(string(e.List.Authority()), k[0]), cmp.Compare(string(e.List.ID()), k[1]))
	})
	if !ok {
		return nil
	}
	return &b[i]
}

// with returns the book with e put in or changed.
func (b Book) with(e Entry) Book {
	out := slices.Clone(b)
	if old := out.Find(e.List.Authority(), e.List.ID()); old != nil {
		*old = e
		return out
	}
	out = append(out, e)
	slices.SortFunc(out, func(x, y Entry) int {
		return cmp.Or(cmp.Compare(x.List.Authority(), y.List.Authority()), cmp.Compare(x.List.ID(), y.List.ID()))
	})
	return out
}

// Listed returns the lists that close, in the book's order.
func (b Book) Listed() []Listed {
	var out []Listed
	for _, e := range b {
		if e.Status == ListWaiting || e.Status == ListInForce {
			out = append(out, Listed{List: e.List, Waiting: e.Status == ListWaiting})
		}
	}
	return out
}

// Digest sums what is in force: each list's identity, digest and status.
func (b Book) Digest() Digest {
	h := sha256.New()
	for _, e := range b {
		if e.Status == ListWaiting || e.Status == ListInForce {
			d := e.List.Digest()
			h.Write([]byte(e.List.Authority()))
			h.Write([]byte{0})
			h.Write([]byte(e.List.ID()))
			h.Write([]byte{0, byte(e.Status)})
			h.Write(d[:])
		}
	}
	return Digest(h.Sum(nil))
}

// keepPast is how long a list that is over stays in the book.
const keepPast = 48 * time.Hour

// prune drops lists whose coverage ended long ago; ok is false when there were
// none.
func (b Book) prune(at time.Time) (Book, bool) {
	over := func(e Entry) bool { return e.List.Covers().Until.Add(keepPast).Before(at) }
	if !slices.ContainsFunc(b, over) {
		return b, false
	}
	return slices.DeleteFunc(slices.Clone(b), over), true
}

// Offer says what a list would do to the book: the error tells why it cannot
// be taken; same is true when the identical list is there already; tightens is
// true only when it is proven that it opens nothing.
func (b Book) Offer(r *Rules, l *List) (same, tightens bool, err error) {
	t := l.Text()
	a := r.Authority(t.Authority)
	if a == nil {
		return false, false, Errorf(NotFound, "name one of the configured authorities", "list %s: its authority is not configured", l)
	}
	for _, beam := range t.Beams {
		if r.Beam(beam) == nil {
			return false, false, Errorf(Invalid, "name configured beams, or leave beams out", "list %s: beam %s is not configured", l, beam)
		}
	}
	switch a.Integrity {
	case IntegrityDigest:
		if !t.Proof.Digest {
			return false, false, Errorf(Invalid, "ask the authority for a digest line, or set integrity for it", "list %s: it carries no digest, which its authority's rule asks for", l)
		}
	case IntegrityCount:
		if !t.Proof.Count && !t.Proof.Digest {
			return false, false, Errorf(Invalid, "ask the authority for a window_count line, or set integrity for it", "list %s: it carries no window count, which its authority's rule asks for", l)
		}
	}
	if old := b.Find(t.Authority, t.ID); old != nil {
		if old.List.Digest() == l.Digest() && old.Status != ListGone {
			return true, false, nil
		}
		return false, false, Errorf(Conflict, "give the list an id of its own and name the old one in replaces", "list %s: another list has this id", l)
	}
	var replaced []*List
	for _, id := range t.Replaces {
		old := b.Find(t.Authority, id)
		if old == nil {
			return false, false, Errorf(Invalid, "send the older list first, or leave replaces out", "list %s: it replaces %s, which is not known", l, id)
		}
		if !old.List.Text().Issued.Before(t.Issued) {
			return false, false, Errorf(Invalid, "issued must be after the replaced list's", "list %s: it replaces %s, which is not older", l, id)
		}
		if old.Status == ListInForce {
			replaced = append(replaced, old.List)
		}
	}
	return false, b.tightens(r, l, replaced), nil
}

// tightens reports whether it is proven that taking l opens no instant for
// any aim of any beam: it adds no time that its authority did not cover, and
// what it replaces it closes at least as much.
func (b Book) tightens(r *Rules, l *List, replaced []*List) bool {
	for i := range r.Beams {
		beam := r.Beams[i].ID
		var covered []span.Span
		for _, e := range b {
			if e.Status == ListInForce && e.List.Authority() == l.Authority() && e.List.For(beam) {
				covered = append(covered, e.List.Covers())
			}
		}
		if l.For(beam) && !span.Make(covered...).Covers(l.Covers()) {
			return false
		}
	}
	for _, old := range replaced {
		if !contains(l, old) {
			return false
		}
	}
	return true
}
