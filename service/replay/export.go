package replay

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"slices"

	"beamward/service/journal"
)

// Export is an exported part of a record, proved by its own chain: each entry
// against the chain's value beside it, each block against its digest and the
// one before. Who wants to know that it belongs to a record compares Head with
// what is known of that elsewhere.
//
// It holds no texts of rules and lists; those are found another way. It has
// one owner.
type Export struct {
	in     io.ReadSeeker
	blocks []heldBlock
	head   string
}

// heldBlock is where a block lies in the file.
type heldBlock struct {
	line  int64 // its head's offset, bytes
	lines int   // number of that line, from 1
	head  blockLine
	kinds []string
}

// OpenExport reads an export once from its beginning to its end and proves it.
// It keeps where the blocks lie, about 200 bytes for each.
func OpenExport(ctx context.Context, in io.ReadSeeker) (*Export, error) {
	x := &Export{in: in}
	l, err := x.lines(0, 0)
	if err != nil {
		return nil, err
	}
	first, err := l.next()
	var start struct {
		Layout int    `json:"beamward_record"`
		Chain  string `json:"chain"`
	}
	if err == nil {
		err = l.read(first, &start)
	}
	if err == nil && start.Layout != 1 {
		err = l.bad("it is no export of a record that this program can read")
	}
	if err != nil {
		return nil, err
	}
	for {
		if err := ctx.Err(); err != nil {
			return nil, fmt.Errorf("reading the export: %w", err)
		}
		offset := l.offset
		line, err := l.next()
		if err != nil {
			return nil, err
		}
		if ended, err := x.end(l, line); err != nil {
			return nil, err
		} else if ended {
			return x, nil
		}
		h := heldBlock{line: offset, lines: l.n}
		if err := l.read(line, &h.head); err != nil {
			return nil, err
		}
		if n := len(x.blocks); n > 0 && (h.head.Prev != x.head || h.head.First <= x.blocks[n-1].head.Last) {
			return nil, l.bad("the block does not follow the one before it")
		}
		err = l.block(&h.head, func(e *journal.Entry) error {
			if !slices.Contains(h.kinds, e.Kind) {
				h.kinds = append(h.kinds, e.Kind)
			}
			return nil
		})
		if err != nil {
			return nil, err
		}
		x.blocks, x.head = append(x.blocks, h), h.head.Digest
	}
}

// end reports whether a line is the last, and whether it fits.
func (x *Export) end(l *lines, line []byte) (bool, error) {
	if !bytes.HasPrefix(line, []byte(`{"end_blocks":`)) {
		return false, nil
	}
	var e endLine
	if err := l.read(line, &e); err != nil {
		return true, err
	}
	if e.Blocks != len(x.blocks) || e.Head != x.head {
		return true, l.bad("the totals do not fit what came before: blocks are missing")
	}
	return true, nil
}

// Head is the digest of the newest block, which vouches for everything before
// it; empty where the export holds none.
func (x *Export) Head() string { return x.head }

// Read gives the entries that match, in order, and proves each block again. A
// block whose entries were pruned ends it with a *journal.PrunedError, unless
// q.Pruned is set.
func (x *Export) Read(ctx context.Context, q journal.Query, yield func(journal.Entry) error) error {
	blocks := x.blocks
	for i := range blocks {
		h := &blocks[i]
		if q.NewestFirst {
			h = &blocks[len(blocks)-1-i]
		}
		if !h.mayHold(&q) {
			continue
		}
		if err := ctx.Err(); err != nil {
			return fmt.Errorf("reading the export: %w", err)
		}
		if err := x.one(h, &q, yield); err != nil {
			if errors.Is(err, journal.ErrStop) {
				return nil
			}
			return err
		}
	}
	return nil
}

func (h *heldBlock) mayHold(q *journal.Query) bool {
	b := &h.head
	switch {
	case b.Last < q.From, q.To != 0 && b.First > q.To:
		return false
	case !q.Since.IsZero() && b.AtMax < q.Since.UnixMicro(), !q.Until.IsZero() && b.AtMin > q.Until.UnixMicro():
		return false
	case b.Pruned || len(q.Kinds) == 0: // which kinds were in a pruned block is not told
		return true
	}
	return slices.ContainsFunc(q.Kinds, func(k string) bool { return slices.Contains(h.kinds, k) })
}

func (x *Export) one(h *heldBlock, q *journal.Query, yield func(journal.Entry) error) error {
	if h.head.Pruned {
		if q.Pruned != nil {
			return q.Pruned(h.head.First, h.head.Last, h.head.Count)
		}
		return &journal.PrunedError{First: h.head.First, Last: h.head.Last}
	}
	l, err := x.lines(h.line, h.lines-1)
	if err != nil {
		return err
	}
	line, err := l.next()
	if err != nil {
		return err
	}
	var b blockLine
	if err := l.read(line, &b); err != nil {
		return err
	}
	if b.Digest != h.head.Digest {
		return l.bad("the file changed while it was read")
	}
	var found []journal.Entry // nobody sees an entry of a block that is wrong
	err = l.block(&b, func(e *journal.Entry) error {
		if wants(q, e) {
			found = append(found, *e)
		}
		return nil
	})
	if err != nil {
		return err
	}
	if q.NewestFirst {
		slices.Reverse(found)
	}
	for i := range found {
		if err := yield(found[i]); err != nil {
			return err
		}
	}
	return nil
}

func wants(q *journal.Query, e *journal.Entry) bool {
	switch {
	case e.Seq < q.From, q.To != 0 && e.Seq > q.To:
		return false
	case !q.Since.IsZero() && e.At.Before(q.Since), !q.Until.IsZero() && !e.At.Before(q.Until):
		return false
	}
	return len(q.Kinds) == 0 || slices.Contains(q.Kinds, e.Kind)
}
