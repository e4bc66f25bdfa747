package replay

import (
	"context"
	"errors"
	"time"

	"beamward/service/journal"
)

// Options say how to replay. Texts is needed.
type Options struct {
	Texts Texts
	// Build is what this program says of its build, as it would record it. Runs
	// of another are held against the record less strictly: see Report.
	Build string
	// Beside are kinds of entries that are no facts and change no decision, such
	// as people's notes. Any other kind that is not known is refused.
	Beside []string
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
	rep := Report{Runs: []Run{}}
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
	c := comparer{player: player{shelf: shelf, other: opt.Beside}, build: opt.Build, most: opt.Most, report: &rep}
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
		rep.Ended = e.Kind == KindEnded
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
