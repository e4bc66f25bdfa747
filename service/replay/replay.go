package replay

import (
	"context"
	"errors"
	"time"

	"beamward/closures"
	"beamward/service/journal"
)

// Options say how to replay. Texts is needed.
type Options struct {
	Texts Texts
	// Build is what this program says of its build, as it would record it. Runs
	// of another are held against the record less strictly: see Report.
	Build string
	// Most is how many differences are told, one a run; 0: 100.
	Most int
	// Near is how many entries Explain goes back at most for the sake of being
	// exact; 0: 300,000.
	Near uint64
	// Progress, where not nil, is called now and then with the newest entry.
	Progress func(seq uint64, at time.Time)
}

const (
	mostDifferences = 100
	mostCalls       = 1000
	mostGaps        = 1000
	progressEvery   = 20000
	nearEnough      = 300_000
)

// CloseCall is a decision that came out otherwise by another build, because it
// hung on a margin that is as good as zero, or followed from one that did.
type CloseCall struct {
	Seq      uint64 // the recorded decision's entry
	At       time.Time
	Beam     closures.BeamID
	Code     string          // of the margin; empty: it follows from one before
	Margin   closures.Margin // rad or m; s where an edge in time moved
	Recorded string          // the state, and the codes
	Replayed string
}

// Gap is a run of entries that did not fit the record's queue. What followed
// them is not replayed until the next run began.
type Gap struct{ First, Last, Count uint64 }

// Report is what a replay found.
type Report struct {
	First, Last  uint64    // numbers of the first and last entry that was read; 0: none
	From, Until  time.Time // their instants
	Entries      uint64    // that were read
	Runs         []Run     // that were replayed
	Facts        uint64    // of these runs
	Steps        uint64
	Decisions    uint64 // that were made
	Compared     uint64 // of these, with one on record by itself
	Granted      uint64 // openings that the replay gives as well
	Tallies      uint64 // sums of all decisions that were compared
	Kept         uint64 // entries of what a restart would rest on that were compared
	Unapplied    uint64 // facts of batches that no tick ended
	Skipped      uint64 // entries outside a run that could be replayed
	Gaps         []Gap  // the first of them
	GapCount     uint64
	LostEntries  uint64 // in gaps
	OtherBuild   uint64 // runs that another build recorded
	Rounded      uint64 // entries of these that differ in their last digits and mean the same
	Close        uint64 // decisions of these that hung on a margin as good as zero
	Calls        []CloseCall
	Different    uint64 // runs in which something differs
	Differences  []Difference
	WholeLastRun bool // the last run ended in good order
}

// Identical reports whether everything that was compared is what was recorded,
// and something was.
func (r *Report) Identical() bool { return r.Different == 0 && r.Steps > 0 }

func (r *Report) lose(e *journal.Entry) error {
	g, err := form[gap](e)
	if err != nil {
		return err
	}
	r.GapCount++
	r.LostEntries += g.Count
	if len(r.Gaps) < mostGaps {
		r.Gaps = append(r.Gaps, Gap(struct{ First, Last, Count uint64 }{g.First, g.Last, g.Count}))
	}
	return nil
}

// Replay replays the runs that hold the range, from the beginning of the first
// to the range's end, and compares everything on record with what comes out.
// After a difference the rest of its run is skipped, since two states that
// differ say nothing more.
//
// The error tells why the replay could not be done, or not to its end: a
// *RefusedError where entries were pruned, a *journal.Damage, an entry that
// cannot be understood, a text that is not there. The report tells how far it
// came.
func Replay(ctx context.Context, src Source, part Range, opt Options) (Report, error) {
	var rep Report
	shelf, err := newShelf(opt.Texts)
	if err != nil {
		return rep, err
	}
	first, last, empty, err := part.numbers(ctx, src)
	if err != nil || empty {
		return rep, err
	}
	begin, err := beginning(ctx, src, first)
	if err != nil {
		return rep, err
	}
	if begin == 0 {
		begin = first
	}
	c := comparer{player: player{shelf: shelf}, build: opt.Build, most: opt.Most, report: &rep}
	if c.most <= 0 {
		c.most = mostDifferences
	}
	c.sum.reset()
	err = src.Read(ctx, journal.Query{From: begin, To: last}, func(e journal.Entry) error {
		if rep.Entries == 0 {
			rep.First, rep.From = e.Seq, e.At
		}
		rep.Last, rep.Until = e.Seq, e.At
		rep.Entries++
		rep.WholeLastRun = e.Kind == KindEnded
		if opt.Progress != nil && rep.Entries%progressEvery == 0 {
			opt.Progress(e.Seq, e.At)
		}
		return c.see(&e)
	})
	rep.Unapplied += uint64(c.waiting())
	return rep, refusal(ctx, src, err)
}

// ErrNoEntry is returned for a number that no entry of the record has.
var ErrNoEntry = errors.New("no such entry is on record")
