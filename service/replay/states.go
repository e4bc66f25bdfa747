package replay

import (
	"context"
	"errors"
	"fmt"
	"iter"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// Step is one step of a replay with what is on record about it. Facts, State
// and Decisions belong to the replay: they are to be read only, and only until
// the next step.
type Step struct {
	Run       *Run
	First     bool      // of its run
	Seq       uint64    // number of the tick, which is that of the decisions
	At        time.Time // of the step
	Facts     []closures.Fact
	Refused   []closures.Refused // of these, with why
	Decisions []closures.Decision
	State     *closures.State // as the step left it
	Recorded  []Recorded      // the decisions that were put on record, and the openings that were granted
	Lost      uint64          // entries that are not on record between the step before and this one
}

// Recorded is one recorded decision or grant of a step.
type Recorded struct {
	Seq     uint64 // of the entry
	Beam    closures.BeamID
	Granted bool   // else a decision
	Opening uint64 // of a grant: the entry of the decision that opened
}

// States goes through the steps of a range in order, each run from its
// beginning, which may lie long before the range. What follows the first error
// is left out: see Replay for what it can be. It compares nothing.
func States(ctx context.Context, src Source, part Range, opt Options) iter.Seq2[*Step, error] {
	return func(yield func(*Step, error) bool) {
		if err := states(ctx, src, part, opt, yield); err != nil && !errors.Is(err, journal.ErrStop) {
			yield(nil, err)
		}
	}
}

func states(ctx context.Context, src Source, part Range, opt Options, yield func(*Step, error) bool) error {
	shelf, err := newShelf(opt.Texts)
	if err != nil {
		return err
	}
	first, last, empty, err := part.numbers(ctx, src)
	if err != nil || empty {
		return err
	}
	begin, err := beginning(ctx, src, first)
	if err != nil || begin == 0 {
		return err
	}
	w := walker{player: player{shelf: shelf, other: opt.Beside}, begin: first, yield: yield}
	read := uint64(0)
	err = src.Read(ctx, journal.Query{From: begin, To: last}, func(e journal.Entry) error {
		if read++; opt.Progress != nil && read%progressEvery == 0 {
			opt.Progress(e.Seq, e.At)
		}
		return w.see(&e)
	})
	if err != nil {
		return refusal(ctx, src, err)
	}
	return w.flush()
}

// walker gathers what belongs to a step and hands it out once it is whole.
type walker struct {
	player
	begin uint64 // steps before are not handed out
	yield func(*Step, error) bool
	now   *Run
	held  Step
	whole bool // held waits to be handed out
	first bool // the next step is its run's first
	gone  uint64
}

func (w *walker) see(e *journal.Entry) error {
	before := w.last
	// A step is whole once an entry comes that does not trail it, and the state
	// is as it was until the next tick.
	if !trails(e.Kind) {
		if err := w.flush(); err != nil {
			return err
		}
	}
	ev, err := w.take(e)
	if err != nil {
		return err
	}
	switch ev {
	case started, lost, missing:
		if err := w.flush(); err != nil {
			return err
		}
		return w.lose(ev, e, before)
	case failed:
		return fmt.Errorf("replaying entry %d: the core failed: %s", e.Seq, firstLine(w.cause))
	case restored:
		run := w.run
		w.now, w.first = &run, true
	case stepped:
		w.held = Step{
			Run: w.now, First: w.first, Seq: w.step.Seq, At: w.step.At, Facts: w.facts, Refused: w.state.Refused(),
			Decisions: w.out, State: w.state, Recorded: w.held.Recorded[:0], Lost: w.gone,
		}
		w.first, w.gone, w.whole = false, 0, true
	case decided:
		d, err := wire.DecodeDecision(e.Body)
		if err != nil {
			return unread(e, err)
		}
		w.held.Recorded = append(w.held.Recorded, Recorded{Seq: e.Seq, Beam: d.Beam})
	case published:
		g, err := form[granted](e)
		if err != nil {
			return err
		}
		w.held.Recorded = append(w.held.Recorded, Recorded{Seq: e.Seq, Beam: g.Beam, Granted: true, Opening: g.Opening})
	}
	return nil
}

// lose counts what is not on record.
func (w *walker) lose(ev event, e *journal.Entry, before uint64) error {
	switch ev {
	case lost:
		g, err := form[gap](e)
		if err != nil {
			return err
		}
		w.gone += g.Count
	case missing:
		w.gone += e.Seq - before - 1
	}
	return nil
}

// flush hands out the step that waits.
func (w *walker) flush() error {
	if !w.whole {
		return nil
	}
	w.whole = false
	if w.held.Seq < w.begin {
		return nil
	}
	if !w.yield(&w.held, nil) {
		return journal.ErrStop
	}
	return nil
}
