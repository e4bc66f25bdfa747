package replay

import (
	"bytes"
	"strconv"
	"strings"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// comparer holds what is on record against the player's state. It has one
// owner.
type comparer struct {
	player
	build  string
	most   int
	report *Report

	exact    bool                                  // the run is of this build
	recorded map[closures.BeamID]closures.Decision // newest on record in this run, as replayed
	owed     []closures.BeamID                     // of the newest step: decisions that must be on record
	openings map[closures.BeamID]openings
	sum      tally
	close    map[closures.BeamID]bool // a decision of the run hung on a margin that is as good as zero
	sheet    closures.Sheet
	buf      []byte
}

// openings are the entries of a beam's open decisions since it was last
// shuttered.
type openings struct{ first, last uint64 }

// see takes in one entry and holds it against what was expected.
func (c *comparer) see(e *journal.Entry) error {
	if len(c.owed) > 0 && e.Seq == c.last+1 && !trails(e.Kind) && c.overdue(e) {
		c.report.Skipped++
		return nil
	}
	waiting := uint64(c.waiting())
	ev, err := c.take(e)
	if err != nil {
		return err
	}
	r := c.report
	switch ev {
	case skipped:
		r.Skipped++
	case started, lost, missing, failed:
		// What a kill, a loss or a panic cut short is not owed any more.
		r.Unapplied += waiting
		c.owed = c.owed[:0]
	case restored:
		r.Runs = append(r.Runs, c.run)
		c.fresh()
	case gathered:
		r.Facts++
	case stepped:
		c.stepped()
	case decided:
		return c.decided(e)
	case published:
		return c.published(e)
	case summed:
		return c.summed(e)
	case kept:
		return c.kept(e)
	}
	switch ev {
	case lost:
		return r.lose(e)
	case missing:
		c.differs(e, "", "entries before it are not on record: from "+strconv.FormatUint(c.from, 10)+" on")
	case failed:
		c.differs(e, "", "the core failed: "+firstLine(c.cause))
	}
	return nil
}

// trails reports whether an entry of a kind can follow a tick before all of
// the step's decisions are on record: one of them, or what cuts a run short.
func trails(kind string) bool {
	return kind == wire.KindDecision || kind == KindGranted || kind == KindBegun || kind == journal.KindGap
}

// overdue answers for the decisions that should have come before an entry and
// did not, and reports whether that ends the run.
func (c *comparer) overdue(e *journal.Entry) bool {
	for _, id := range c.owed {
		mine := c.decision(id)
		if old, any := c.recorded[id]; !any || mine == nil || !c.hung(e, &old, mine) {
			c.last = e.Seq
			c.differs(e, id, "a decision that changed is not on record")
			return true
		}
	}
	c.owed = c.owed[:0]
	return false
}

func firstLine(s string) string {
	s, _, _ = strings.Cut(s, "\n")
	return s
}

// fresh forgets what belonged to the last run.
func (c *comparer) fresh() {
	c.exact = c.run.Build == c.build
	if !c.exact {
		c.report.OtherBuild++
	}
	c.recorded, c.openings = map[closures.BeamID]closures.Decision{}, map[closures.BeamID]openings{}
	c.close = map[closures.BeamID]bool{}
	c.owed = c.owed[:0]
	c.sum.reset()
}

// differs notes a difference and leaves the run: from here on the two states
// are not the same.
func (c *comparer) differs(e *journal.Entry, beam closures.BeamID, what string) *Difference {
	d := Difference{Seq: e.Seq, At: e.At, Step: c.step.Seq, Beam: beam, What: what}
	c.leave()
	c.owed = c.owed[:0]
	c.report.Different++
	if len(c.report.Differences) >= c.most {
		return &d
	}
	c.report.Differences = append(c.report.Differences, d)
	return &c.report.Differences[len(c.report.Differences)-1]
}

func (c *comparer) stepped() {
	c.report.Steps++
	rules := c.state.Rules()
	for id := range c.recorded {
		if rules.Beam(id) == nil { // should it come back, it is recorded anew
			delete(c.recorded, id)
			delete(c.openings, id)
		}
	}
	for i := range c.out {
		d := &c.out[i]
		c.report.Decisions++
		c.sum.add(d)
		if old, any := c.recorded[d.Beam]; !any || changed(&old, d, c.exact) {
			c.owed = append(c.owed, d.Beam)
		}
	}
}

// changed reports whether the engine records a decision after another. By
// another build the end of an opening may have moved a little less.
func changed(old, d *closures.Decision, exact bool) bool {
	if old.Open != d.Open || old.Codes != d.Codes {
		return true
	}
	if !exact {
		return false
	}
	return old.OpenUntil.IsZero() != d.OpenUntil.IsZero() || old.OpenUntil.Sub(d.OpenUntil).Abs() > openUntilStep
}

func (c *comparer) published(e *journal.Entry) error {
	g, err := form[granted](e)
	if err != nil {
		return err
	}
	d, o := c.decision(g.Beam), c.openings[g.Beam]
	switch {
	case d == nil || g.Seq != c.step.Seq:
		c.differs(e, g.Beam, "an opening was granted by a step that is not the newest")
	case o.first == 0 || g.Opening < o.first || g.Opening > o.last:
		c.differs(e, g.Beam, "an opening was granted that is not on record")
	case !d.Open:
		if c.exact || !c.close[g.Beam] {
			diff := c.differs(e, g.Beam, "an opening was granted that the replay does not give")
			diff.Recorded, diff.Replayed = "open", strings.Join(d.Codes.Names(), ", ")
		}
	default:
		c.report.Granted++
	}
	return nil
}

func (c *comparer) kept(e *journal.Entry) error {
	now, _ := c.state.Durable()
	var err error
	if c.buf, err = wire.EncodeDurable(c.buf[:0], &now); err != nil {
		return unread(e, err)
	}
	c.report.Kept++
	if bytes.Equal(c.buf, e.Body) {
		return nil
	}
	field, a, b := apart(e.Body, c.buf)
	if !c.exact && c.anyClose() && strings.HasPrefix(field, "latches") {
		c.report.Rounded++
		return nil
	}
	d := c.differs(e, "", "what a restart would rest on")
	d.Field, d.Recorded, d.Replayed = field, a, b
	return nil
}

func (c *comparer) anyClose() bool {
	for _, yes := range c.close {
		if yes {
			return true
		}
	}
	return false
}
