package journal

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
)

// Report is what Verify found.
type Report struct {
	Blocks  int    // that prove themselves, pruned ones included
	Pruned  int    // of these, without their entries
	Entries uint64 // that were checked
	Gone    uint64 // entries of pruned blocks
	Gaps    uint64 // entries lost to a full queue, as gap entries count them
	Lists   int    // texts that match their sums
	Cuts    int    // torn last blocks that were cut off at some start

	First, Last uint64 // numbers of the first and last entry
	Head        Digest // of the newest block

	Damage *Damage // the first, by number; nil: none
}

// Verify walks the whole record as it is at the call: each block against its
// digest, the digest before it and its own columns, each text against its sum,
// and the index of kinds against the entries. It stops at the first damage,
// which is part of the report; an error means that it could not look.
// Progress, where not nil, is called now and then with blocks done and all.
func (r *Reader) Verify(ctx context.Context, progress func(done, all int)) (Report, error) {
	v := verifier{r: r, newest: map[string]uint64{}, progress: progress}
	err := v.run(ctx)
	if d := (*Damage)(nil); errors.As(err, &d) {
		v.rep.Damage = d
		return v.rep, nil
	}
	return v.rep, err
}

type verifier struct {
	r        *Reader
	rep      Report
	all      int
	prev     Digest
	newest   map[string]uint64 // kind to first of its newest block
	kinds    map[string]kindRow
	progress func(done, all int)
}

func (v *verifier) run(ctx context.Context) error {
	if err := v.structure(ctx); err != nil {
		return err
	}
	e, err := v.r.end(ctx)
	if err != nil {
		return err
	}
	if err := v.r.counts(ctx, &e); err != nil {
		return err
	}
	v.kinds, v.all, v.rep.Cuts = e.kinds, e.blocks, e.cuts
	if e.last != nil {
		if err := v.r.blocks(ctx, Query{To: e.last.first}, v.block); err != nil {
			return err
		}
	}
	if err := v.index(); err != nil {
		return err
	}
	return v.texts(ctx)
}

// structure lets SQLite look over its own pages.
func (v *verifier) structure(ctx context.Context) error {
	var said string
	if err := v.r.db.QueryRowContext(ctx, `PRAGMA integrity_check(1)`).Scan(&said); err != nil {
		return v.r.failed("verifying the record", err)
	}
	if said != "ok" {
		return v.r.damaged(&Damage{What: "the file's pages: " + said})
	}
	return nil
}

func (v *verifier) block(b *block) error {
	bad := func(what string) error {
		return v.r.damaged(&Damage{First: b.first, Last: b.last, What: what})
	}
	switch {
	case b.prev != v.prev:
		return bad("the block before it is not the one it follows")
	case v.rep.Blocks > 0 && b.first <= v.rep.Last:
		return bad("its numbers overlap those of the block before")
	}
	var mask, unknown = uint64(0), ""
	err := v.r.each(b, func(e Entry, _ Digest) error {
		k, known := v.kinds[e.Kind]
		if !known {
			unknown = e.Kind
		}
		mask |= k.bit()
		v.newest[e.Kind] = b.first
		v.rep.Entries++
		if e.Kind == KindGap {
			v.rep.Gaps += gapCount(e.Body)
		}
		return nil
	})
	var gone *PrunedError
	switch {
	case errors.As(err, &gone):
		v.rep.Pruned++
		v.rep.Gone += uint64(b.count)
		for name, k := range v.kinds {
			if k.newest == b.first && b.mask&k.bit() != 0 {
				v.newest[name] = b.first
			}
		}
	case err != nil:
		return err
	case unknown != "":
		return bad(fmt.Sprintf("its kind %q is not in the index", unknown))
	case mask != b.mask:
		return bad("its kinds do not match its entries")
	}
	if v.rep.Blocks == 0 {
		v.rep.First = b.first
	}
	v.rep.Blocks++
	v.rep.Last, v.rep.Head, v.prev = b.last, b.digest, b.digest
	if v.progress != nil && (v.rep.Blocks%pageBlocks == 0 || v.rep.Blocks == v.all) {
		v.progress(v.rep.Blocks, v.all)
	}
	return nil
}

// index compares where each kind was last seen with what LastOf goes by.
func (v *verifier) index() error {
	for name, k := range v.kinds {
		if k.newest != v.newest[name] {
			return v.r.damaged(&Damage{First: v.newest[name], Last: k.newest,
				What: fmt.Sprintf("the newest %s is in block %d and the index says %d", name, v.newest[name], k.newest)})
		}
	}
	return nil
}

// texts checks every recorded text against its sum, and that it belongs to a
// block: that a block has all its texts is part of the block's proof.
func (v *verifier) texts(ctx context.Context) error {
	const op = "verifying the recorded texts"
	var stray int
	err := v.r.db.QueryRowContext(ctx, `SELECT count(*) FROM list WHERE NOT EXISTS (SELECT 1 FROM block WHERE first = list.block AND lists > 0)`).Scan(&stray)
	if err != nil {
		return v.r.failed(op, err)
	}
	if stray > 0 {
		return v.r.damaged(&Damage{What: fmt.Sprintf("%d texts belong to no block", stray)})
	}
	after, afterBlock := "", int64(0)
	for {
		var name string
		var block, size int64
		var sum, packed []byte
		rows, err := v.r.db.QueryContext(ctx, `SELECT digest, block, size, sum, text FROM list
			WHERE (block, digest) > (?, ?) ORDER BY block, digest LIMIT 1`, afterBlock, after)
		if err != nil {
			return v.r.failed(op, err)
		}
		found := rows.Next()
		if found {
			err = rows.Scan(&name, &block, &size, &sum, &packed)
		}
		if err = errors.Join(err, rows.Err(), rows.Close()); err != nil {
			return v.r.failed(op, err)
		}
		if !found {
			return nil
		}
		after, afterBlock = name, block
		if packed == nil || uint64(block) > v.rep.Last { // pruned, or recorded after the walk began
			continue
		}
		text, err := v.r.codec.unpack(packed, size)
		if got := sha256.Sum256(text); err == nil && string(got[:]) != string(sum) {
			err = errSum
		}
		if err != nil {
			return v.r.damaged(&Damage{First: uint64(block), Last: uint64(block), What: "list " + name + ": " + err.Error()})
		}
		v.rep.Lists++
	}
}

// gapCount reads the count that queue.go wrote into a gap's body.
func gapCount(body []byte) uint64 {
	var count, first, last uint64
	if _, err := fmt.Sscanf(string(body), `{"count":%d,"first":%d,"last":%d}`, &count, &first, &last); err != nil {
		return 0
	}
	return count
}
