package replay_test

import (
	"bytes"
	"context"
	"encoding/json"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/closures/wire"
	"beamward/service/config"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/replay"
)

// textsOf finds rules and lists where the service puts them.
func textsOf(r *journal.Reader) replay.Texts {
	text := func(d closures.Digest) ([]byte, error) { return r.List(context.Background(), d.String()) }
	return replay.Texts{
		Rules: func(d closures.Digest) (*closures.Rules, error) {
			b, err := text(d)
			if err != nil {
				return nil, err
			}
			c, err := config.Parse(b, "/")
			if err != nil {
				return nil, err
			}
			return c.Rules, nil
		},
		List: func(d closures.Digest) (*closures.List, error) {
			b, err := text(d)
			if err != nil {
				return nil, err
			}
			l, _, err := listfile.Load(bytes.NewReader(b), listfile.JSON, listfile.Limits{})
			return l, err
		},
	}
}

// record puts the engine's entries into the journal, in the service's forms.
type record struct{ *journal.Journal }

func (r *record) Append(entries []engine.Entry) error {
	out := make([]journal.Entry, len(entries))
	for i := range entries {
		var err error
		if out[i], err = encoded(&entries[i]); err != nil {
			return err
		}
	}
	return r.Journal.Append(out)
}

func encoded(e *engine.Entry) (journal.Entry, error) {
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
		out.Body, err = json.Marshal(map[string]any{"boot_id": w.Boot.ID, "at": wire.FormatTime(w.Boot.At), "build": w.Build, "rules": w.Rules.Digest.String(), "cause": w.Cause})
	case engine.Granted:
		out.Kind = replay.KindGranted
		out.Body, err = json.Marshal(map[string]any{"beam": w.Beam, "opening": w.Opening, "seq": w.Seq})
	case engine.Tallied:
		out.Kind = replay.KindTallied
		out.Body, err = json.Marshal(map[string]any{"from": w.From, "to": w.To, "count": w.Count, "sum": w.Sum.String()})
	case engine.Ended:
		out.Kind, out.Body = replay.KindEnded, []byte("{}")
	}
	return out, err
}

func (r *record) Condition() engine.Condition {
	s := r.State()
	return engine.Condition{Durable: s.Durable, Behind: s.Behind, Half: s.Half, Full: s.Full, Gap: s.Gap, Failed: s.Err != nil, Damaged: s.Damage != nil}
}

func (r *record) Flush(ctx context.Context) error { return r.Journal.Flush(ctx) }
