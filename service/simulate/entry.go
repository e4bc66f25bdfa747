package simulate

import (
	"context"
	"encoding/json"
	"fmt"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/replay"
)

// record is the journal as the engine sees it. The forms are those that the
// service writes, which the replay of a night's record proves: it takes no
// others.
type record struct{ *journal.Journal }

// Append encodes and queues the entries: all of them, or none.
func (r record) Append(entries []engine.Entry) error {
	out := make([]journal.Entry, len(entries))
	for i := range entries {
		var err error
		if out[i], err = form(&entries[i]); err != nil {
			return err
		}
	}
	return r.Journal.Append(out)
}

// Condition tells how the record stands.
func (r record) Condition() engine.Condition {
	s := r.State()
	return engine.Condition{Durable: s.Durable, Behind: s.Behind, Half: s.Half, Full: s.Full, Gap: s.Gap, Failed: s.Err != nil, Damaged: s.Damage != nil}
}

// Flush writes everything that is queued.
func (r record) Flush(ctx context.Context) error { return r.Journal.Flush(ctx) }

// form brings one of the engine's entries to its form on record.
func form(e *engine.Entry) (journal.Entry, error) {
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
		out.Body, err = json.Marshal(struct {
			BootID string `json:"boot_id"`
			At     string `json:"at"`
			Build  string `json:"build"`
			Rules  string `json:"rules"`
			Cause  string `json:"cause,omitempty"`
		}{w.Boot.ID, wire.FormatTime(w.Boot.At), w.Build, w.Rules.Digest.String(), w.Cause})
	case engine.Granted:
		out.Kind = replay.KindGranted
		out.Body, err = json.Marshal(struct {
			Beam    closures.BeamID `json:"beam"`
			Opening uint64          `json:"opening"`
			Seq     uint64          `json:"seq"`
		}{w.Beam, w.Opening, w.Seq})
	case engine.Tallied:
		out.Kind = replay.KindTallied
		out.Body, err = json.Marshal(struct {
			From  uint64 `json:"from"`
			To    uint64 `json:"to"`
			Count uint64 `json:"count"`
			Sum   string `json:"sum"`
		}{w.From, w.To, w.Count, w.Sum.String()})
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
