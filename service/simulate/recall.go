package simulate

import (
	"context"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/replay"
)

// Texts finds the rules and lists that a night's record names.
func Texts(ctx context.Context, r *journal.Reader) replay.Texts {
	return service.Texts(ctx, r)
}

// recall reads what must outlive a restart, as the service does: the newest
// durable entry and what came after it, and the newest number.
func recall(ctx context.Context, j *journal.Journal, rules *closures.Rules) (d closures.Durable, after uint64, err error) {
	last, any, err := j.Last(ctx)
	if err != nil || !any {
		return d, 0, err
	}
	texts := Texts(ctx, j.Reader)
	resolve := wire.Resolver{Rules: texts.Rules, List: texts.List}
	kept, any, err := j.LastOf(ctx, journal.KindDurable)
	if err != nil {
		return d, 0, err
	}
	from := uint64(1)
	if any {
		if d, err = wire.DecodeDurable(kept.Body, resolve); err != nil {
			return d, 0, err
		}
		from = kept.Seq + 1
	}
	var tail []engine.Entry
	err = j.Read(ctx, journal.Query{From: from}, func(e journal.Entry) error {
		one := engine.Entry{Seq: e.Seq, At: e.At}
		switch e.Kind {
		case replay.KindBegun, replay.KindGranted, replay.KindTallied, replay.KindEnded, journal.KindGap, journal.KindDurable, wire.KindRules, wire.KindNight:
			return nil // a restart rests on none of these
		case wire.KindDecision:
			decided, err := wire.DecodeDecision(e.Body)
			if err != nil {
				return err
			}
			one.What = engine.Decided{Decision: decided}
		default:
			f, err := wire.DecodeBody(e.Kind, e.Body, resolve)
			if err != nil {
				return err
			}
			f.Seq, f.At = e.Seq, e.At
			one.What = engine.Admitted{Fact: f}
		}
		tail = append(tail, one)
		return nil
	})
	if err != nil {
		return d, 0, err
	}
	d, err = engine.Restore(rules, d, tail)
	return d, last.Seq, err
}
