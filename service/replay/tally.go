package replay

import (
	"crypto/sha256"
	"hash"
	"strconv"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// tally sums all decisions between two entries that say so.
type tally struct {
	from, to, count uint64
	sum             hash.Hash
	buf             []byte
}

func (t *tally) reset() {
	t.from, t.to, t.count = 0, 0, 0
	if t.sum == nil {
		t.sum = sha256.New()
	}
	t.sum.Reset()
}

func (t *tally) add(d *closures.Decision) {
	if t.count == 0 {
		t.from = d.Seq
	}
	t.to = d.Seq
	t.count++
	t.buf = wire.AppendDecision(t.buf[:0], d)
	_, _ = t.sum.Write(t.buf)
}

// summed holds a tally on record against the replay's.
func (c *comparer) summed(e *journal.Entry) error {
	s, err := form[tallied](e)
	if err != nil {
		return err
	}
	defer c.sum.reset()
	got := tallied{From: c.sum.from, To: c.sum.to, Count: c.sum.count, Sum: closures.Digest(c.sum.sum.Sum(nil)).String()}
	if !c.exact && got.Sum != s.Sum {
		c.report.Rounded++ // instants differ by nanoseconds, which the sum holds
		s.Sum = got.Sum
	}
	c.report.Tallies++
	if got == s {
		return nil
	}
	d := c.differs(e, "", "the tally of the decisions "+strconv.FormatUint(s.From, 10)+" to "+strconv.FormatUint(s.To, 10)+", which do not differ where they are on record by themselves")
	switch u := strconv.FormatUint; {
	case got.Count != s.Count:
		d.Field, d.Recorded, d.Replayed = "count", u(s.Count, 10), u(got.Count, 10)
	case got.From != s.From:
		d.Field, d.Recorded, d.Replayed = "from", u(s.From, 10), u(got.From, 10)
	case got.To != s.To:
		d.Field, d.Recorded, d.Replayed = "to", u(s.To, 10), u(got.To, 10)
	default:
		d.Field, d.Recorded, d.Replayed = "sum", s.Sum, got.Sum
	}
	return nil
}
