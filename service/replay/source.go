package replay

import (
	"context"
	"errors"
	"fmt"
	"time"

	"beamward/closures/wire"
	"beamward/service/journal"
)

// Source gives the entries of a record that match, as journal.Reader does: in
// order, pruned ranges refused with a *journal.PrunedError. A *journal.Reader
// is one, and an *Export.
type Source interface {
	Read(ctx context.Context, q journal.Query, yield func(journal.Entry) error) error
}

// Range is a part of the record: by numbers, by the instants of the steps, or
// by both. Its zero value is the whole.
type Range struct {
	From, To     uint64    // both included; To 0: to the end
	Since, Until time.Time // of the steps, [Since, Until); zero: without bound
}

// find is the first or the last entry that matches; false when there is none.
func find(ctx context.Context, src Source, q journal.Query) (journal.Entry, bool, error) {
	var found journal.Entry
	any := false
	err := src.Read(ctx, q, func(e journal.Entry) error {
		found, any = e, true
		return journal.ErrStop
	})
	return found, any, err
}

// numbers brings the range to numbers. empty says that no step lies in it.
func (r Range) numbers(ctx context.Context, src Source) (first, last uint64, empty bool, err error) {
	first, last = r.From, r.To
	if r.Since.IsZero() && r.Until.IsZero() {
		return first, last, last != 0 && last < first, nil
	}
	q := journal.Query{From: r.From, To: r.To, Since: r.Since, Until: r.Until, Kinds: []string{wire.KindTick}}
	low, any, err := find(ctx, src, q)
	if err != nil || !any {
		return 0, 0, true, refusal(ctx, src, err)
	}
	q.NewestFirst = true
	high, _, err := find(ctx, src, q)
	if err != nil {
		return 0, 0, true, refusal(ctx, src, err)
	}
	return low.Seq, high.Seq, false, nil
}

// beginning is the number of the entry that begins the run which holds the
// entry seq; the first run's where seq lies before it, and zero where there is
// none at all.
func beginning(ctx context.Context, src Source, seq uint64) (uint64, error) {
	if seq > 0 {
		e, any, err := find(ctx, src, journal.Query{To: seq, Kinds: []string{KindBegun}, NewestFirst: true})
		if err != nil || any {
			return e.Seq, refusal(ctx, src, err)
		}
	}
	e, _, err := find(ctx, src, journal.Query{From: seq, Kinds: []string{KindBegun}})
	return e.Seq, refusal(ctx, src, err)
}

// RefusedError says that a part of the record cannot be replayed because its
// entries are past their keeping.
type RefusedError struct {
	Pruned *journal.PrunedError
	Next   uint64 // where the first run after it begins; 0: there is none
}

// Error names what is gone and what is left.
func (e *RefusedError) Error() string {
	s := fmt.Sprintf("replaying the record: %v", e.Pruned)
	if e.Next == 0 {
		return s + ": no run begins after them, so nothing that is left can be replayed"
	}
	return s + fmt.Sprintf(": ask for entries from %d on, where the next run begins", e.Next)
}

// Unwrap gives the *journal.PrunedError.
func (e *RefusedError) Unwrap() error { return e.Pruned }

// refusal makes a pruned range a *RefusedError and leaves other errors alone.
func refusal(ctx context.Context, src Source, err error) error {
	var gone *journal.PrunedError
	if err == nil || !errors.As(err, &gone) {
		return err
	}
	out := &RefusedError{Pruned: gone}
	last := gone.Last
	for {
		e, any, err := find(ctx, src, journal.Query{From: last + 1, Kinds: []string{KindBegun}})
		var more *journal.PrunedError
		switch {
		case errors.As(err, &more) && more.Last > last:
			last = more.Last
			continue
		case err == nil && any:
			out.Next = e.Seq
		}
		return out
	}
}
