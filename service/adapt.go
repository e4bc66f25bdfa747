package service

import (
	"context"
	"errors"
	"time"

	"beamward/closures"
	"beamward/service/api"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/permit"
)

// The adapters below let each part see another as it declared it. None of them
// decides anything.

// apiEngine is the engine as the API sees it.
type apiEngine struct{ s *Service }

func (e apiEngine) View() *api.View { return apiView(e.s.engine.View()) }

// apiView shows a view in the API's terms. What it points to is shared, since
// nothing changes it.
func apiView(v *engine.View) *api.View {
	out := &api.View{
		At: v.At, Boot: v.Boot, BootID: v.BootID, Seq: v.Seq, Rules: v.Rules, Foreseen: v.Foreseen, Book: v.Book, Holds: v.Holds,
		Nights: v.Nights, Known: v.Known, Record: api.Condition(v.Record), Started: v.Started, Stopped: v.Stopped, Simulated: v.Simulated,
		Beams: make([]api.BeamView, len(v.Beams)),
	}
	for i := range v.Beams {
		out.Beams[i] = api.BeamView(v.Beams[i])
	}
	return out
}

func (e apiEngine) Offer(from closures.Source, body closures.Body) (superseded bool, err error) {
	in, err := e.s.engine.Offer(from, body)
	return in == engine.Superseded, err
}

func (e apiEngine) SubmitDurable(ctx context.Context, from closures.Source, body closures.Body) error {
	_, err := e.s.submit(ctx, from, body)
	return err
}

func (e apiEngine) Watch(buffer int) (next func(ctx context.Context) (api.Update, bool), cancel func()) {
	updates, cancel := e.s.engine.Watch(buffer)
	return func(ctx context.Context) (api.Update, bool) {
		select {
		case <-ctx.Done():
			return api.Update{}, false
		case u, more := <-updates:
			if !more {
				return api.Update{}, false
			}
			return api.Update{View: apiView(u.View), Beams: u.Beams, Kept: u.Kept}, true
		}
	}, cancel
}

// sights is the engine as the permit issuer sees it.
type sights struct{ *engine.Engine }

func (e sights) Sight(id closures.BeamID) (permit.Sight, bool) {
	v := e.View()
	b := v.Beam(id)
	if b == nil {
		return permit.Sight{}, false
	}
	return permit.Sight{Decision: b.Decision, Rules: v.Rules, At: v.At, Boot: v.Boot, BootID: v.BootID, Number: v.Number}, true
}

func (e sights) Pulse() (at time.Time, boot time.Duration, r *closures.Rules) {
	v := e.View()
	return v.At, v.Boot, v.Rules
}

// permits is the issuer as the API sees it.
type permits struct{ *permit.Issuer }

func (p permits) Permit(beam closures.BeamID, nonce string) ([]byte, error) {
	return p.Issuer.Answer(beam, nonce)
}

func (p permits) Key() []byte { return p.Issuer.Key().JWK() }

// entries is the record as the API sees it.
type entries struct{ *journal.Journal }

func (j entries) Read(ctx context.Context, q api.RecordQuery) ([]api.RecordEntry, error) {
	var out []api.RecordEntry
	query := journal.Query{From: q.After + 1, Since: q.Since, Until: q.Until, Kinds: q.Kinds, NewestFirst: q.NewestFirst}
	if q.Before > 0 {
		query.To = q.Before - 1
		if query.To < query.From {
			return nil, nil
		}
	}
	query.Pruned = func(uint64, uint64, int) error { return nil } // what is gone is told by its absence of numbers
	err := j.Journal.Read(ctx, query, func(e journal.Entry) error {
		out = append(out, api.RecordEntry{Seq: e.Seq, At: e.At, Kind: e.Kind, Body: e.Body})
		if q.Limit > 0 && len(out) == q.Limit {
			return journal.ErrStop
		}
		return nil
	})
	if errors.Is(err, journal.ErrStop) {
		err = nil
	}
	return out, err
}
