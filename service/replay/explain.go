package replay

import (
	"bytes"
	"context"
	"encoding/json"

	"fmt"
	"slices"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// Explain tells what the entry seq rested on, or did.
//
// A decision is told whole: each check with its verdict and margin, the age of
// each input, the aim, the lists and holds in force, and what changed. So is a
// tick, for every beam, and a grant. A fact is told with what became of it.
//
// What the record holds by itself is taken from it: the verdicts and reasons
// of a decision that is on record are never anything else. The rest comes from
// a replay, from the beginning of the run where that is near enough (see
// Options.Near), so that it can be held against the record to the last bit.
// Else it begins at what was kept for a restart some minutes before: then
// whatever a state learns anew within these minutes is as it was, and what the
// latch, the shutter's watch and the start remember from longer ago is told
// from the record alone, or not at all. Explanation.Replayed says which.
//
// The error is ErrNoEntry where no entry has the number, a *RefusedError where
// it was pruned, or that of the record.
func Explain(ctx context.Context, src Source, seq uint64, opt Options) (*Explanation, error) {
	e, any, err := find(ctx, src, journal.Query{From: seq, To: seq})
	switch {
	case err != nil:
		return nil, refusal(ctx, src, err)
	case !any:
		return nil, absent(ctx, src, seq)
	}
	shelf, err := newShelf(opt.Texts)
	if err != nil {
		return nil, err
	}
	x := explainer{player: player{shelf: shelf, other: opt.Beside}, build: opt.Build, src: src, entry: e, newest: newest{}, recorded: map[closures.BeamID]onRecord{}}
	if x.near = opt.Near; x.near == 0 {
		x.near = nearEnough
	}
	return x.explain(ctx)
}

// absent says why no entry has a number.
func absent(ctx context.Context, src Source, seq uint64) error {
	e, any, err := find(ctx, src, journal.Query{From: seq, Kinds: []string{journal.KindGap}})
	if err == nil && any {
		if g, err := form[gap](&e); err == nil && g.First <= seq && seq <= g.Last {
			return fmt.Errorf("entry %d: %w: it is one of %d, %d to %d, that did not fit the record's queue", seq, ErrNoEntry, g.Count, g.First, g.Last)
		}
	}
	return fmt.Errorf("entry %d: %w: see the newest with record show --newest-first", seq, ErrNoEntry)
}

// explainer plays the record up to the step that an entry belongs to. It has
// one owner.
type explainer struct {
	player
	src   Source
	entry journal.Entry
	build string
	near  uint64

	begin  uint64 // entry of the run's beginning; 0: it is not on record
	life   Run    // which it begins
	from   uint64 // entry from which on it is played; 0: it is not
	whole  bool   // which is the run's beginning
	note   string
	target uint64 // number of the step's tick; 0: of the first after the entry
	read   uint64

	newest   newest
	recorded map[closures.BeamID]onRecord // before the step
	mine     map[closures.BeamID]onRecord // of the step
	before   prior
	reached  bool // the step was made
}

// onRecord is one decision as it stands on record.
type onRecord struct {
	seq  uint64
	body []byte
	d    closures.Decision
}

// prior is what held before the step.
type prior struct {
	decisions []closures.Decision
	durable   closures.Durable
	rules     *closures.Rules
}

func (x *explainer) explain(ctx context.Context) (*Explanation, error) {
	out := &Explanation{Seq: x.entry.Seq, At: x.entry.At, Kind: x.entry.Kind}
	if json.Valid(x.entry.Body) {
		out.Body = x.entry.Body
	}
	beam, told, err := x.aimAt(out)
	if err != nil || told {
		return out, err
	}
	if err := x.choose(ctx); err != nil {
		return nil, err
	}
	if x.from > 0 {
		if err := x.play(ctx); err != nil {
			return nil, err
		}
	}
	if !x.reached {
		if err := x.look(ctx); err != nil {
			return nil, err
		}
	}
	if err := x.fill(ctx, beam); err != nil {
		return nil, err
	}
	x.tell(out, beam)
	return out, nil
}

// aimAt finds the step that the entry belongs to. told says that there is none
// and the entry tells all by itself; beam is whom the entry is about, empty for
// every one.
func (x *explainer) aimAt(out *Explanation) (beam closures.BeamID, told bool, err error) {
	switch e := &x.entry; e.Kind {
	case wire.KindDecision:
		d, err := wire.DecodeDecision(e.Body)
		if err != nil {
			return "", true, unread(e, err)
		}
		out.What = fmt.Sprintf("the decision of step %d that beam %s is %s", d.Seq, d.Beam, stateWord(d.Open))
		x.target = d.Seq
		return d.Beam, false, nil
	case KindGranted:
		g, err := form[granted](e)
		if err != nil {
			return "", true, err
		}
		out.What = fmt.Sprintf("the opening of beam %s, on record as entry %d, was granted by step %d", g.Beam, g.Opening, g.Seq)
		x.target = g.Seq
		return g.Beam, false, nil
	case wire.KindTick:
		out.What = "the tick that ended a batch: every beam was decided"
		x.target = e.Seq
		return "", false, nil
	case KindBegun, KindEnded, KindTallied, journal.KindGap, journal.KindDurable:
		out.What, err = plain(e)
		return "", true, err
	default:
		if slices.Contains(x.other, e.Kind) {
			out.What = "an entry that changes no decision"
			return "", true, nil
		}
	}
	return "", false, nil
}

// plain tells an entry that no step applied.
func plain(e *journal.Entry) (string, error) {
	switch e.Kind {
	case KindBegun:
		b, err := form[begun](e)
		if err != nil {
			return "", err
		}
		if b.Cause != "" {
			return fmt.Sprintf("start %s: the state began anew, because %s, from the entry after this one; every beam is shuttered", b.BootID, b.Cause), nil
		}
		return fmt.Sprintf("start %s of the service (%s): the state begins, from the entry after this one; every beam is shuttered", b.BootID, b.Build), nil
	case KindTallied:
		t, err := form[tallied](e)
		if err != nil {
			return "", err
		}
		return fmt.Sprintf("the sum of all %d decisions from step %d to step %d, whether they changed or not; a replay makes the same", t.Count, t.From, t.To), nil
	case journal.KindGap:
		g, err := form[gap](e)
		if err != nil {
			return "", err
		}
		return fmt.Sprintf("%d entries, %d to %d, did not fit the record's queue and are lost; every beam was shuttered until this was on disk", g.Count, g.First, g.Last), nil
	case journal.KindDurable:
		return "all that a restart would rest on: lists, holds, latches, sightings, detectors and tracks", nil
	}
	return "the service ended in good order", nil
}

// play reads from the beginning that was chosen until the step is whole.
func (x *explainer) play(ctx context.Context) error {
	q := journal.Query{From: x.from}
	if !x.whole {
		q.From++ // it is what the state was made of
	}
	err := x.src.Read(ctx, q, func(e journal.Entry) error {
		if x.reached && (e.Kind != wire.KindDecision && e.Kind != KindGranted || e.Seq != x.last+1) {
			return journal.ErrStop
		}
		x.read++
		return x.see(&e)
	})
	return refusal(ctx, x.src, err)
}

func (x *explainer) see(e *journal.Entry) error {
	if e.Kind == wire.KindTick && x.state != nil && x.isTarget(e.Seq) {
		x.before.decisions = append(x.before.decisions[:0], x.out...)
		x.before.durable, _ = x.state.Durable()
		x.before.rules = x.state.Rules()
	}
	ev, err := x.take(e)
	if err != nil {
		return err
	}
	switch ev {
	case gathered:
		x.newest.see(&x.batch[len(x.batch)-1])
	case stepped:
		x.reached = x.isTarget(e.Seq)
	case decided:
		return x.keepDecision(e)
	case started, lost, missing, failed:
		if e.Seq > x.entry.Seq {
			return journal.ErrStop // the run ends here: what comes is another's
		}
		clear(x.recorded)
		clear(x.newest)
	}
	return nil
}

// isTarget reports whether a tick ends the batch that the entry belongs to.
func (x *explainer) isTarget(tick uint64) bool {
	if x.target == 0 {
		return tick > x.entry.Seq
	}
	return tick == x.target
}

// keepDecision keeps a decision as it stands on record.
func (x *explainer) keepDecision(e *journal.Entry) error {
	d, err := wire.DecodeDecision(e.Body)
	if err != nil {
		return unread(e, err)
	}
	one := onRecord{seq: e.Seq, body: bytes.Clone(e.Body), d: d}
	if x.reached {
		if x.mine == nil {
			x.mine = map[closures.BeamID]onRecord{}
		}
		x.mine[d.Beam] = one
		return nil
	}
	x.recorded[d.Beam] = one
	return nil
}
