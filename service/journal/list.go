package journal

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
)

// MaxDigest is the longest name, in bytes, under which a text is recorded.
const MaxDigest = 256

// Blob is a text to be recorded once under its digest: a closure list, a
// configuration. It is packed by whoever makes it, so that the engine's
// goroutine does not compress.
type Blob struct {
	digest string
	sum    Digest
	size   int
	packed []byte
}

// Pack compresses text for recording under digest, which the journal does not
// interpret: 1 to MaxDigest printable ASCII characters. It refuses texts over
// 512 MiB.
func Pack(digest string, text []byte) (Blob, error) {
	if digest == "" || len(digest) > MaxDigest {
		return Blob{}, fmt.Errorf("packing a text: its digest must have 1 to %d characters", MaxDigest)
	}
	for i := range len(digest) {
		if digest[i] <= ' ' || digest[i] > '~' {
			return Blob{}, errors.New("packing a text: its digest must be printable ASCII without spaces")
		}
	}
	if len(text) > maxUnpacked {
		return Blob{}, fmt.Errorf("packing a text: %d bytes are over the limit of %d", len(text), maxUnpacked)
	}
	c, err := newCodec()
	if err != nil {
		return Blob{}, err
	}
	defer c.close()
	return Blob{digest: digest, sum: sha256.Sum256(text), size: len(text), packed: c.pack(text)}, nil
}

// Digest is the name under which the text will be recorded.
func (b Blob) Digest() string { return b.digest }

func (b Blob) cost() int { return len(b.packed) + len(b.digest) + len(b.sum) }

// PutList queues a text. It becomes durable together with the next entry, so
// never after an entry that names it. A text that is on record or queued
// already is not queued again.
func (j *Journal) PutList(digest string, text []byte) error {
	b, err := Pack(digest, text)
	if err != nil {
		return err
	}
	return j.Append(nil, b)
}

// ErrNoList is returned for a digest under which nothing is on record.
var ErrNoList = errors.New("reading a text: nothing is on record under its digest")

// List reads a text back, checked against its sum. A pruned text is a
// *PrunedError.
func (r *Reader) List(ctx context.Context, digest string) ([]byte, error) {
	var block uint64
	var size int64
	var sum, packed []byte
	row := r.db.QueryRowContext(ctx, `SELECT block, size, sum, text FROM list WHERE digest = ? ORDER BY block DESC LIMIT 1`, digest)
	err := r.fault("read")
	if err == nil {
		err = row.Scan(&block, &size, &sum, &packed)
	}
	switch {
	case errors.Is(err, sql.ErrNoRows):
		return nil, ErrNoList
	case err != nil:
		return nil, r.failed("reading a text", err)
	case packed == nil:
		return nil, &PrunedError{First: block, Last: block}
	}
	text, err := r.codec.unpack(packed, size)
	if got := sha256.Sum256(text); err == nil && string(got[:]) != string(sum) {
		err = errSum
	}
	if err != nil {
		return nil, r.damaged(&Damage{First: block, Last: block, What: "list " + digest + ": " + err.Error()})
	}
	return text, nil
}

var errSum = errors.New("the text does not match its sum")
