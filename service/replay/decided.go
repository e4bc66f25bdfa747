package replay

import (
	"bytes"
	"slices"
	"strconv"
	"strings"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// decided holds one recorded decision against the replay's.
func (c *comparer) decided(e *journal.Entry) error {
	d, err := wire.DecodeDecision(e.Body)
	if err != nil {
		return unread(e, err)
	}
	c.report.Compared++
	mine := c.decision(d.Beam)
	switch {
	case d.Seq != c.step.Seq || mine == nil:
		diff := c.differs(e, d.Beam, "a decision of a step that is not the newest")
		diff.Field, diff.Recorded, diff.Replayed = "seq", strconv.FormatUint(d.Seq, 10), strconv.FormatUint(c.step.Seq, 10)
		return nil
	}
	if c.buf, err = wire.EncodeDecision(c.buf[:0], mine); err != nil {
		return unread(e, err)
	}
	if !bytes.Equal(c.buf, e.Body) && !c.excused(e, &d, mine) {
		field, a, b := apart(e.Body, c.buf)
		diff := c.differs(e, d.Beam, "the decision")
		diff.Field, diff.Recorded, diff.Replayed = field, a, b
		return nil
	}
	if d.Open != mine.Open {
		mine = &d // what the engine goes on from
	}
	c.recorded[d.Beam] = *mine
	if i := slices.Index(c.owed, d.Beam); i >= 0 {
		c.owed = slices.Delete(c.owed, i, i+1)
	}
	o := c.openings[d.Beam]
	switch {
	case !d.Open:
		o = openings{}
	case o.first == 0:
		o = openings{e.Seq, e.Seq}
	default:
		o.last = e.Seq
	}
	c.openings[d.Beam] = o
	return nil
}

// excused reports whether another build's rounding explains that two decisions
// differ, and notes where.
func (c *comparer) excused(e *journal.Entry, recorded, mine *closures.Decision) bool {
	if c.exact || recorded.Rules != mine.Rules || recorded.Lists != mine.Lists || !recorded.At.Equal(mine.At) {
		return false
	}
	if recorded.Open == mine.Open && recorded.Codes == mine.Codes {
		c.report.Rounded++
		return true
	}
	return c.hung(e, recorded, mine)
}

// hung reports whether the replay's decision differs from what was recorded
// because it hung on a margin as good as zero, or followed from one that did,
// and notes it. By the same build nothing does.
func (c *comparer) hung(e *journal.Entry, recorded, mine *closures.Decision) bool {
	if c.exact {
		return false
	}
	var scratch closures.Decision
	c.state.Decide(mine.Beam, mine.At, &c.sheet, &scratch)
	why := hangsOn(recorded, mine, &c.sheet)
	if why == nil && !(c.close[mine.Beam] && latched(recorded, mine)) {
		return false
	}
	c.close[mine.Beam] = true
	c.report.Close++
	if len(c.report.Calls) < mostCalls {
		call := CloseCall{Seq: e.Seq, At: e.At, Beam: mine.Beam, Recorded: stateOf(recorded), Replayed: stateOf(mine)}
		if why != nil {
			call.Code, call.Margin = why.Code.String(), margin(why.Margin)
		}
		c.report.Calls = append(c.report.Calls, call)
	}
	return true
}

func stateOf(d *closures.Decision) string {
	if d.Open {
		return "open"
	}
	return "shuttered: " + strings.Join(d.Codes.Names(), ", ")
}
