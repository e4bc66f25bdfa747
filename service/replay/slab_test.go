package replay_test

import (
	"context"
	"encoding/json"
	"errors"
	"slices"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
	"beamward/service/replay"
)

// slab is a record in memory.
type slab []journal.Entry

// Read gives the entries that match.
func (s slab) Read(_ context.Context, q journal.Query, yield func(journal.Entry) error) error {
	all := slices.Clone(s)
	if q.NewestFirst {
		slices.Reverse(all)
	}
	for _, e := range all {
		switch {
		case e.Seq < q.From, q.To != 0 && e.Seq > q.To,
			!q.Since.IsZero() && e.At.Before(q.Since), !q.Until.IsZero() && !e.At.Before(q.Until),
			len(q.Kinds) > 0 && !slices.Contains(q.Kinds, e.Kind):
			continue
		}
		if err := yield(e); err == journal.ErrStop {
			return nil
		} else if err != nil {
			return err
		}
	}
	return nil
}

// taken copies a record into memory.
func taken(t testing.TB, r *journal.Reader) slab {
	t.Helper()
	var s slab
	if err := r.Read(context.Background(), journal.Query{}, func(e journal.Entry) error {
		e.Body = slices.Clone(e.Body)
		s = append(s, e)
		return nil
	}); err != nil {
		t.Fatal(err)
	}
	return s
}

// with returns the record with one entry changed.
func (s slab) with(i int, change func(*journal.Entry)) slab {
	out := slices.Clone(s)
	out[i].Body = slices.Clone(out[i].Body)
	change(&out[i])
	return out
}

// last returns the index of the newest entry that pick picks, before a number.
func (s slab) last(t testing.TB, before uint64, pick func(*journal.Entry) bool) int {
	t.Helper()
	for i := len(s) - 1; i >= 0; i-- {
		if s[i].Seq < before && pick(&s[i]) {
			return i
		}
	}
	t.Fatal("the record holds no such entry")
	return 0
}

func ofKind(kind string) func(*journal.Entry) bool {
	return func(e *journal.Entry) bool { return e.Kind == kind }
}

func decoded(t testing.TB, e *journal.Entry) closures.Decision {
	t.Helper()
	d, err := wire.DecodeDecision(e.Body)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func mustEncode(t testing.TB, e *journal.Entry, d *closures.Decision) {
	t.Helper()
	var err error
	if e.Body, err = wire.EncodeDecision(nil, d); err != nil {
		t.Fatal(err)
	}
}

// scribe records a state as the engine does, but for what a test leaves out or
// puts otherwise.
type scribe struct {
	t       testing.TB
	rules   *closures.Rules
	state   *closures.State
	seq     uint64
	entries slab
	said    map[closures.BeamID]closures.Decision
	alter   func(*closures.Decision) bool // changes what is recorded; false leaves it out
}

func newScribe(t testing.TB, rules *closures.Rules, build string, at time.Time) *scribe {
	t.Helper()
	s := &scribe{t: t, rules: rules}
	s.begin("boot-1", build, at, closures.Durable{})
	return s
}

func (s *scribe) put(at time.Time, kind string, body []byte) uint64 {
	s.seq++
	s.entries = append(s.entries, journal.Entry{Seq: s.seq, At: at, Kind: kind, Body: body})
	return s.seq
}

func (s *scribe) begin(boot, build string, at time.Time, d closures.Durable) {
	s.t.Helper()
	var err error
	if s.state, err = closures.New(s.rules, closures.Boot{ID: boot, At: at}, d); err != nil {
		s.t.Fatal(err)
	}
	body, err := json.Marshal(map[string]any{"boot_id": boot, "at": wire.FormatTime(at), "build": build, "rules": s.rules.Digest.String()})
	if err != nil {
		s.t.Fatal(err)
	}
	s.put(at, replay.KindBegun, body)
	kept, _ := s.state.Durable()
	if body, err = wire.EncodeDurable(nil, &kept); err != nil {
		s.t.Fatal(err)
	}
	s.put(at, journal.KindDurable, body)
	s.said = map[closures.BeamID]closures.Decision{}
}

// step records facts, a tick and the decisions that changed.
func (s *scribe) step(at time.Time, bodies ...closures.Body) []closures.Decision {
	s.t.Helper()
	facts := s.facts(at, append(bodies, closures.Tick{})...)
	out := s.state.Step(facts, at, nil)
	for i := range out {
		d := out[i]
		old, any := s.said[d.Beam]
		if any && old.Open == d.Open && old.Codes == d.Codes && old.OpenUntil.Sub(d.OpenUntil).Abs() <= 100*time.Millisecond {
			continue
		}
		if s.alter != nil && !s.alter(&d) {
			continue
		}
		s.record(&d)
	}
	return out
}

func (s *scribe) facts(at time.Time, bodies ...closures.Body) []closures.Fact {
	s.t.Helper()
	var facts []closures.Fact
	for _, b := range bodies {
		f := closures.Fact{At: at, From: "feed", Body: b}
		kind, body, err := wire.EncodeBody(nil, f)
		if err != nil {
			s.t.Fatal(err)
		}
		f.Seq = s.put(at, kind, body)
		facts = append(facts, f)
	}
	return facts
}

// given knows some rules and no lists.
func given(rules ...*closures.Rules) replay.Texts {
	return replay.Texts{
		Rules: func(d closures.Digest) (*closures.Rules, error) {
			for _, r := range rules {
				if r.Digest == d {
					return r, nil
				}
			}
			return nil, errors.New("no such rules")
		},
		List: func(closures.Digest) (*closures.List, error) { return nil, errors.New("no such list") },
	}
}

// keep records what a restart would rest on.
func (s *scribe) keep(at time.Time) {
	s.t.Helper()
	d, _ := s.state.Durable()
	body, err := wire.EncodeDurable(nil, &d)
	if err != nil {
		s.t.Fatal(err)
	}
	s.put(at, journal.KindDurable, body)
}

// record puts a decision on record.
func (s *scribe) record(d *closures.Decision) {
	s.t.Helper()
	body, err := wire.EncodeDecision(nil, d)
	if err != nil {
		s.t.Fatal(err)
	}
	s.said[d.Beam] = *d
	s.put(d.At, wire.KindDecision, body)
}

// made decides a beam at an instant from what the last step left.
func (s *scribe) made(id closures.BeamID, at time.Time) closures.Decision {
	var sheet closures.Sheet
	var d closures.Decision
	s.state.Decide(id, at, &sheet, &d)
	return d
}
