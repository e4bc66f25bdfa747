// Package journal keeps the record: every entry that the engine numbers, in
// order, in one SQLite file (write-ahead log, synchronous FULL), in blocks that
// are chained so that a change shows.
//
// It deals in entries of bytes. What an entry's body means is the business of
// whoever wrote it; the journal gives meaning to two kinds only, KindDurable
// (a body from which the service restarts) and KindGap (written by the journal
// itself where entries were lost to a full queue).
//
// # Who owns what
//
// Append puts entries into a bounded queue and never waits for the disk. One
// writer, Run or a caller of Flush, moves them to the store in order. What is
// on disk is told by State.Durable, Notify and Wait; only then may the service
// act on it. The journal has no clock of its own and starts no goroutine: its
// owner runs Run and lends it a Clock.
//
// # Which way it fails
//
// An error of the store never loses an entry: the whole transaction is tried
// again, from a freshly opened file, until it is through; State tells of it
// meanwhile. What the queue cannot hold becomes one counted gap entry, and the
// Append that lost something says so. State.Sound is true only while nothing
// is wrong. A record that is found damaged is opened all the same, with
// State.Damage set, so that the service can start, shuttered, and say what is
// to be done. A torn last block is cut off, set aside in the table cut, and
// told in Journal.Cut.
//
// # Layout
//
// All numbers are big endian; times are UTC. An entry is
//
//	seq      uint64
//	seconds  int64   since 1970-01-01T00:00:00Z, leap seconds not counted
//	nanos    uint32  0 to 999,999,999
//	kind     uint16 length, then that many bytes
//	body     uint32 length, then that many bytes
//
// A block is 1 to 1,000 entries in this form, one after the other, compressed
// with Zstandard and followed by the CRC-32C of the compressed bytes.
//
// # Chain
//
// prev is the digest of the block before, 32 zero bytes for the first block.
// Within a block, starting with c = prev, each entry in turn gives
//
//	c = SHA-256(0x01 || c || entry)
//
// The last c is the block's content digest. The block's digest is
//
//	SHA-256(0x02 || prev || first uint64 || last uint64 || count uint32
//	     || at_min int64 || at_max int64 || lists uint32 || lists × L || content)
//
// where first and last are the numbers of its first and last entry, at_min and
// at_max the least and greatest time of its entries in microseconds since 1970,
// rounded down, and L stands for each text that was recorded with the block, in
// the order of the digests' bytes:
//
//	digest uint16 length, then that many bytes
//	sum    32 bytes, SHA-256 of the text
//
// A pruned block keeps all of this but its entries, so its digest still proves
// itself and a copy of the entries kept elsewhere can be held against it.
package journal
