package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
)

// block is a row as it was read. prev is the digest of the row before it.
type block struct {
	header
	mask    uint64
	nlists  int
	size    int64
	digest  Digest
	prev    Digest
	content Digest // once pruned
	body    []byte // packed; nil once pruned
	flaw    string // what is wrong with the row's own shape
}

const columns = `b.first, b.last, b.count, b.at_min, b.at_max, b.kinds, b.lists, b.size, b.digest, b.content, b.body,
	(SELECT p.digest FROM block p WHERE p.first < b.first ORDER BY p.first DESC LIMIT 1)`

func scan(rows interface{ Scan(...any) error }) (*block, error) {
	b := &block{}
	var first, last, mask int64
	var digest, content, prev []byte
	err := rows.Scan(&first, &last, &b.count, &b.atMin, &b.atMax, &mask, &b.nlists, &b.size, &digest, &content, &b.body, &prev)
	if err != nil {
		return nil, err
	}
	b.first, b.last, b.mask = uint64(first), uint64(last), uint64(mask)
	for _, f := range []struct {
		name     string
		from     []byte
		to       *Digest
		optional bool
	}{
		{"digest", digest, &b.digest, false}, {"content digest", content, &b.content, b.body != nil}, {"digest before it", prev, &b.prev, true},
	} {
		if len(f.from) == 0 && f.optional {
			continue
		}
		if copy(f.to[:], f.from) != len(f.to) || len(f.from) != len(f.to) {
			b.flaw = "the " + f.name + " has the wrong length"
		}
	}
	return b, nil
}

// one reads the first block, by number, that where picks; nil when there is
// none.
func (r *Reader) one(ctx context.Context, where string, args ...any) (*block, error) {
	blocks, err := r.page(ctx, where, `b.first LIMIT 1`, args...)
	if err != nil || len(blocks) == 0 {
		return nil, err
	}
	return blocks[0], nil
}

// page reads blocks with the texts recorded with them. Each page is a read
// transaction of its own, so that a long walk does not keep the log from being
// written back.
func (r *Reader) page(ctx context.Context, where, order string, args ...any) ([]*block, error) {
	tx, err := r.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return nil, err
	}
	defer func() { _ = tx.Rollback() }()
	return pageOf(ctx, tx, where, order, args...)
}

func pageOf(ctx context.Context, tx *sql.Tx, where, order string, args ...any) ([]*block, error) {
	blocks, err := rowsOf(ctx, tx, where, order, args...)
	if err != nil {
		return nil, err
	}
	for _, b := range blocks {
		if b.nlists == 0 {
			continue
		}
		if b.lists, err = listsOf(ctx, tx, b.first); err != nil {
			return nil, err
		}
	}
	return blocks, nil
}

func rowsOf(ctx context.Context, tx *sql.Tx, where, order string, args ...any) ([]*block, error) {
	rows, err := tx.QueryContext(ctx, `SELECT `+columns+` FROM block b WHERE `+where+` ORDER BY `+order, args...)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var blocks []*block
	for rows.Next() {
		b, err := scan(rows)
		if err != nil {
			return nil, err
		}
		blocks = append(blocks, b)
	}
	return blocks, rows.Err()
}

func listsOf(ctx context.Context, tx *sql.Tx, first uint64) ([]listRef, error) {
	rows, err := tx.QueryContext(ctx, `SELECT digest, sum FROM list WHERE block = ? ORDER BY digest`, int64(first))
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var refs []listRef
	for rows.Next() {
		var l listRef
		var sum []byte
		if err := rows.Scan(&l.digest, &sum); err != nil {
			return nil, err
		}
		if copy(l.sum[:], sum) != len(l.sum) || len(sum) != len(l.sum) {
			return nil, &Damage{First: first, Last: first, What: "the sum of list " + l.digest + " has the wrong length", Mend: mendDamage}
		}
		refs = append(refs, l)
	}
	return refs, rows.Err()
}

var errChain = errors.New("the block does not match its digest")

// prove checks a block against its digest and the digest before it, and shows
// its entries. Bodies of entries may be kept: nothing else uses their memory.
func (b *block) prove(c *codec, see func(Entry, Digest) error) error {
	switch {
	case b.flaw != "":
		return errors.New(b.flaw)
	case b.nlists != len(b.lists):
		return fmt.Errorf("%d texts were recorded with it and %d are there", b.nlists, len(b.lists))
	case b.count < 1 || b.first > b.last:
		return errors.New("its numbers make no sense")
	}
	if b.body == nil {
		if b.seal(b.prev, b.content) != b.digest {
			return errChain
		}
		return nil
	}
	raw, err := c.unpack(b.body, b.size)
	if err != nil {
		return err
	}
	// The digest comes first: nobody sees an entry of a block that is wrong.
	h, content, err := walk(raw, b.prev, nil)
	if err != nil {
		return err
	}
	h.lists = b.lists
	switch {
	case h.seal(b.prev, content) != b.digest:
		return errChain
	case h.first != b.first, h.last != b.last, h.count != b.count, h.atMin != b.atMin, h.atMax != b.atMax:
		return errors.New("its columns do not match its entries")
	}
	if see == nil {
		return nil
	}
	_, _, err = walk(raw, b.prev, see)
	return err
}

// each shows the entries of a block that proves itself; *Damage where it does
// not, *PrunedError where they are gone. An error of see is returned as it is.
func (r *Reader) each(b *block, see func(Entry, Digest) error) error {
	var stopped error
	err := b.prove(r.codec, func(e Entry, c Digest) error {
		if stopped = see(e, c); stopped != nil {
			return stopped
		}
		return nil
	})
	switch {
	case stopped != nil:
		return stopped
	case err != nil:
		return r.damaged(&Damage{First: b.first, Last: b.last, What: err.Error()})
	case b.body == nil:
		return &PrunedError{First: b.first, Last: b.last}
	}
	return nil
}
