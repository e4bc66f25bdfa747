package journal

import (
	"fmt"
	"slices"
	"sort"
	"time"
)

// Bounds of a block and of one transaction.
const (
	MaxBlockEntries = 1000
	maxBlockBytes   = 1 << 20 // before compression; a single larger entry has a block of its own
	// maxBlockSpan bounds how far an entry's time may lie from its block's
	// first, so that a search by time need not look far around. Time may go
	// back between entries.
	maxBlockSpan = 10 * time.Second

	maxTxBlocks = 128
	maxTxBytes  = 16 << 20
)

// pending is a block that waits for the store.
type pending struct {
	header
	firstAt int64 // of the first entry, microseconds since 1970
	raw     []byte
	kinds   []string
	blobs   []Blob
	urgent  bool
	born    time.Duration // boot time of the first entry
	gap     *gap          // set: this block is one gap entry, not yet written out
	cost    int
}

// gap counts the entries lost in a row.
type gap struct {
	first, last, count uint64
	at                 time.Time // of the last
}

// queue holds the pending blocks in order. Its owner locks.
type queue struct {
	capacity, reserve int
	blocks            []*pending
	bytes             int // of everything not yet durable, what the writer has taken included
	gaps              int // gap blocks among that
}

func (q *queue) tail() *pending {
	if len(q.blocks) == 0 {
		return nil
	}
	return q.blocks[len(q.blocks)-1]
}

// fits says whether cost more bytes may be queued. While a gap is open it
// needs the reserve to be free, so that one stall leaves one gap and not one
// for each time a little room turned up.
func (q *queue) fits(cost int) bool {
	room := q.capacity - q.bytes
	if t := q.tail(); t != nil && t.gap != nil {
		room -= q.reserve
	}
	return cost <= room
}

// add queues entries with the texts that they name.
func (q *queue) add(entries []Entry, blobs []Blob, now time.Duration) {
	if len(blobs) > 0 {
		// In front of the entries: into the block that the first of them opens
		// or joins.
		t := q.open(firstOf(entries))
		t.blobs = append(t.blobs, blobs...)
		for _, b := range blobs {
			t.cost += b.cost()
			q.bytes += b.cost()
		}
	}
	for i := range entries {
		e := &entries[i]
		t := q.open(e)
		if t.count == 0 {
			t.born, t.firstAt = now, e.At.UnixMicro()
		}
		t.header.add(e)
		t.raw = appendEntry(t.raw, e)
		t.urgent = t.urgent || e.Urgent
		if !slices.Contains(t.kinds, e.Kind) {
			t.kinds = append(t.kinds, e.Kind)
		}
		t.cost += e.size()
		q.bytes += e.size()
	}
}

func firstOf(entries []Entry) *Entry {
	if len(entries) == 0 {
		return nil
	}
	return &entries[0]
}

// open is the block that e goes into: the tail, or a new one.
func (q *queue) open(e *Entry) *pending {
	if t := q.tail(); t != nil && t.takes(e) {
		return t
	}
	t := &pending{}
	q.blocks = append(q.blocks, t)
	return t
}

func (p *pending) takes(e *Entry) bool {
	switch {
	case p.gap != nil:
		return false
	case p.count == 0 || e == nil:
		return true
	}
	off := time.Duration(e.At.UnixMicro()-p.firstAt) * time.Microsecond
	return p.count < MaxBlockEntries && len(p.raw)+e.size() <= maxBlockBytes &&
		off >= -maxBlockSpan && off <= maxBlockSpan
}

// lose counts entries that do not fit into the gap at the tail.
func (q *queue) lose(entries []Entry, now time.Duration) {
	t := q.tail()
	switch {
	case t != nil && t.gap != nil:
	case t != nil && t.count == 0:
		// Texts that wait for an entry travel with the gap.
		t.gap, t.born = &gap{first: entries[0].Seq}, now
		q.gaps++
	default:
		q.blocks = append(q.blocks, &pending{gap: &gap{first: entries[0].Seq}, born: now})
		q.gaps++
	}
	g := q.tail().gap
	last := entries[len(entries)-1]
	g.count += uint64(len(entries))
	g.last, g.at = last.Seq, last.At
}

// take removes from the front what is ripe at now: all closed blocks, and the
// tail when it is urgent, old enough, or everything is asked for. It stops at
// the bounds of a transaction.
func (q *queue) take(now, age time.Duration, all bool) []*pending {
	n, size := 0, 0
	for i, p := range q.blocks {
		if i == maxTxBlocks || (i > 0 && size+p.cost > maxTxBytes) {
			break
		}
		if i == len(q.blocks)-1 && !p.ripe(now, age, all) {
			break
		}
		n, size = i+1, size+p.cost
	}
	taken := slices.Clone(q.blocks[:n])
	q.blocks = slices.Delete(q.blocks, 0, n)
	return taken
}

func (p *pending) ripe(now, age time.Duration, all bool) bool {
	switch {
	case p.gap != nil:
		return true
	case p.count == 0:
		return false // texts wait for their entry
	}
	return all || p.urgent || now-p.born >= age ||
		p.count >= MaxBlockEntries || len(p.raw) >= maxBlockBytes
}

// done drops the accounts of blocks that are durable.
func (q *queue) done(taken []*pending) {
	for _, p := range taken {
		q.bytes -= p.cost
		if p.gap != nil {
			q.gaps--
		}
	}
}

// write turns a gap into its entry. The counts are final from here on.
func (p *pending) write() {
	if p.gap == nil || p.count > 0 {
		return
	}
	e := Entry{
		Seq: p.gap.last, At: p.gap.at, Kind: KindGap,
		Body: fmt.Appendf(nil, `{"count":%d,"first":%d,"last":%d}`, p.gap.count, p.gap.first, p.gap.last),
	}
	p.header.add(&e)
	p.raw, p.kinds = appendEntry(nil, &e), []string{KindGap}
}

// sealed is a block as it goes into the store.
type sealed struct {
	header
	kinds  []string
	size   int // before compression
	body   []byte
	digest Digest
	blobs  []Blob
}

func (p *pending) seal(prev Digest, c *codec) (*sealed, error) {
	p.write()
	sort.Slice(p.blobs, func(a, b int) bool { return p.blobs[a].digest < p.blobs[b].digest })
	p.lists = nil
	for _, b := range p.blobs {
		p.lists = append(p.lists, listRef{digest: b.digest, sum: b.sum})
	}
	h, content, err := walk(p.raw, prev, nil)
	if err != nil {
		return nil, fmt.Errorf("sealing a block: %w", err)
	}
	h.lists = p.lists
	return &sealed{
		header: h, kinds: p.kinds, size: len(p.raw), body: c.pack(p.raw),
		digest: h.seal(prev, content), blobs: p.blobs,
	}, nil
}
