package replay

import (
	"context"
	"errors"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// look reads what stands on record about the step, where no replay came to it.
func (x *explainer) look(ctx context.Context) error {
	x.from = 0
	if x.target == 0 {
		return nil
	}
	if x.note == "" {
		x.note = "entries before it were lost, so nothing can be replayed up to it"
	}
	err := x.src.Read(ctx, journal.Query{From: x.target}, func(e journal.Entry) error {
		switch {
		case e.Seq == x.target:
		case !trails(e.Kind), e.Kind == KindBegun, e.Kind == journal.KindGap:
			return journal.ErrStop
		case e.Kind == wire.KindDecision:
			x.reached = true
			return x.keepDecision(&e)
		}
		return nil
	})
	var gone *journal.PrunedError
	if errors.As(err, &gone) {
		return nil
	}
	return err
}

// fill finds on record the decision before the step, of the beams for which
// none was met on the way: one beam, or all of them where none is given.
func (x *explainer) fill(ctx context.Context, beam closures.BeamID) error {
	want := map[closures.BeamID]bool{}
	if beam != "" {
		want[beam] = true
	} else if x.state != nil {
		for i := range x.out {
			want[x.out[i].Beam] = true
		}
	}
	for id := range want {
		if _, met := x.recorded[id]; met {
			delete(want, id)
		}
	}
	if len(want) == 0 || x.whole || !x.reached {
		return nil
	}
	tick := x.target
	if tick == 0 {
		tick = x.step.Seq
	}
	n := 0
	err := x.src.Read(ctx, journal.Query{From: x.begin, To: tick - 1, Kinds: []string{wire.KindDecision}, NewestFirst: true}, func(e journal.Entry) error {
		d, err := wire.DecodeDecision(e.Body)
		if err != nil {
			return unread(&e, err)
		}
		if want[d.Beam] {
			x.recorded[d.Beam] = onRecord{seq: e.Seq, d: d}
			delete(want, d.Beam)
		}
		if n++; len(want) == 0 || n >= mostBack {
			return journal.ErrStop
		}
		return nil
	})
	var gone *journal.PrunedError
	if errors.As(err, &gone) {
		return nil
	}
	return err
}
