package service

import (
	"context"
	"encoding/json"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/replay"
)

// begunEntry starts a state anew.
type begunEntry struct {
	BootID string `json:"boot_id"`
	At     string `json:"at"`
	Build  string `json:"build"`
	Rules  string `json:"rules"`
	Cause  string `json:"cause,omitempty"`
}

// grantedEntry says that an opening was published.
type grantedEntry struct {
	Beam    closures.BeamID `json:"beam"`
	Opening uint64          `json:"opening"`
	Seq     uint64          `json:"seq"`
}

// talliedEntry sums the decisions of about a minute.
type talliedEntry struct {
	From  uint64 `json:"from"`
	To    uint64 `json:"to"`
	Count uint64 `json:"count"`
	Sum   string `json:"sum"`
}

// encodeEntry brings one of the engine's entries to its form on record.
func encodeEntry(e *engine.Entry) (journal.Entry, error) {
	out := journal.Entry{Seq: e.Seq, At: e.At, Urgent: e.Urgent}
	var err error
	switch w := e.What.(type) {
	case engine.Admitted:
		out.Kind, out.Body, err = wire.EncodeBody(nil, w.Fact)
	case engine.Decided:
		out.Kind = wire.KindDecision
		out.Body, err = wire.EncodeDecision(nil, &w.Decision)
	case engine.Kept:
		out.Kind = journal.KindDurable
		out.Body, err = wire.EncodeDurable(nil, &w.Durable)
	case engine.Begun:
		out.Kind = replay.KindBegun
		out.Body, err = json.Marshal(begunEntry{w.Boot.ID, wire.FormatTime(w.Boot.At), w.Build, w.Rules.Digest.String(), w.Cause})
	case engine.Granted:
		out.Kind = replay.KindGranted
		out.Body, err = json.Marshal(grantedEntry{w.Beam, w.Opening, w.Seq})
	case engine.Tallied:
		out.Kind = replay.KindTallied
		out.Body, err = json.Marshal(talliedEntry{w.From, w.To, w.Count, w.Sum.String()})
	case engine.Ended:
		out.Kind, out.Body = replay.KindEnded, []byte("{}")
	default:
		err = fmt.Errorf("no form for a %T", e.What)
	}
	if err != nil {
		return journal.Entry{}, fmt.Errorf("recording entry %d: %w", e.Seq, err)
	}
	return out, nil
}

// record is the journal as the engine sees it.
type record struct {
	*journal.Journal
	cut bool // entries that were acknowledged may be gone: until somebody looks, damaged
}

// Append encodes and queues the entries. An entry that cannot be encoded loses
// all of them, which the engine answers by shuttering.
func (r *record) Append(entries []engine.Entry) error {
	out := make([]journal.Entry, len(entries))
	for i := range entries {
		var err error
		if out[i], err = encodeEntry(&entries[i]); err != nil {
			return err
		}
	}
	return r.Journal.Append(out)
}

// Condition tells how the record stands.
func (r *record) Condition() engine.Condition {
	s := r.Journal.State()
	return engine.Condition{
		Durable: s.Durable, Behind: s.Behind, Half: s.Half, Full: s.Full, Gap: s.Gap,
		Failed: s.Err != nil, Damaged: s.Damage != nil || r.cut,
	}
}

// Flush waits until everything queued is durable.
func (r *record) Flush(ctx context.Context) error {
	// Written at once rather than waited for: a clock that stands still would
	// never ripen the last block.
	if err := r.Journal.Flush(ctx); err != nil {
		return err
	}
	return r.Journal.Wait(ctx, r.Journal.State().Queued)
}

// past is what a start finds on the record.
type past struct {
	durable closures.Durable
	after   uint64 // the newest number on record
}

// recall reads what must outlive a restart: the newest durable entry and what
// came after it.
func recall(ctx context.Context, j *journal.Journal, rules *closures.Rules, resolve wire.Resolver) (past, error) {
	var p past
	last, any, err := j.Last(ctx)
	if err != nil || !any {
		return p, err
	}
	p.after = last.Seq
	kept, any, err := j.LastOf(ctx, journal.KindDurable)
	if err != nil {
		return p, err
	}
	from := uint64(1)
	if any {
		if p.durable, err = wire.DecodeDurable(kept.Body, resolve); err != nil {
			return p, err
		}
		from = kept.Seq + 1
	}
	var tail []engine.Entry
	err = j.Read(ctx, journal.Query{From: from}, func(e journal.Entry) error {
		one := engine.Entry{Seq: e.Seq, At: e.At}
		switch e.Kind {
		case replay.KindBegun, replay.KindGranted, replay.KindTallied, replay.KindEnded, journal.KindGap, journal.KindDurable, wire.KindRules:
			return nil // a restart rests on none of these
		case wire.KindDecision:
			d, err := wire.DecodeDecision(e.Body)
			if err != nil {
				return err
			}
			one.What = engine.Decided{Decision: d}
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
		return p, err
	}
	p.durable, err = engine.Restore(rules, p.durable, tail)
	return p, err
}

// startLimit is how long a start may read the record.
const startLimit = time.Minute
