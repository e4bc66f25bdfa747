package wire

import (
	"fmt"

	"beamward/closures"
)

var (
	verdictWords = []string{"unknown", "violated", "clear"}
	unitWords    = []string{"none", "rad", "m", "s"}
	statusWords  = []string{"waiting", "in-force", "replaced", "withdrawn"}
)

// EncodeDecision appends the record's form of a decision, whole, with its
// margins to the last bit, so that a replay can be held against it.
func EncodeDecision(dst []byte, d *closures.Decision) ([]byte, error) {
	a := archive{out: dst}
	object(&a, d, decision)
	if a.err != nil {
		return dst, fmt.Errorf("writing a decision for the record: %w", a.err)
	}
	return a.out, nil
}

// DecodeDecision reads what EncodeDecision wrote. With an error the decision is
// the zero one, which is shuttered.
func DecodeDecision(body []byte) (closures.Decision, error) {
	a := reader(body)
	var d closures.Decision
	object(&a, &d, decision)
	if err := a.end(); err != nil {
		return closures.Decision{}, fmt.Errorf("reading a decision of the record: %w", err)
	}
	return d, nil
}

func decision(a *archive, d *closures.Decision) {
	whole(a, "seq", &d.Seq)
	text(a, "beam", &d.Beam)
	instant(a, "at", &d.At)
	flag(a, "open", &d.Open)
	instant(a, "open_until", &d.OpenUntil)
	instant(a, "closes_at", &d.ClosesAt)
	instant(a, "opens_at", &d.OpensAt)
	many(a, "reasons", &d.Reasons, finding)
	many(a, "coming", &d.Coming, finding)
	many(a, "cautions", &d.Cautions, caution)
	many(a, "inputs", &d.Inputs, input)
	codes(a, "codes", &d.Codes)
	digest(a, "rules", &d.Rules)
	digest(a, "lists", &d.Lists)
}

func finding(a *archive, f *closures.Finding) {
	object(a, f, func(a *archive, f *closures.Finding) {
		code(a, "code", &f.Code)
		text(a, "source", &f.Source)
		word(a, "verdict", &f.Verdict, verdictWords)
		instant(a, "from", &f.Over.From)
		instant(a, "until", &f.Over.Until)
		number(a, "margin", &f.Margin.Value)
		word(a, "unit", &f.Margin.Unit, unitWords)
		text(a, "detail", &f.Detail)
		text(a, "list", &f.List)
		text(a, "region", &f.Region)
		text(a, "ref", &f.Ref)
	})
}

func caution(a *archive, c *closures.Caution) {
	object(a, c, func(a *archive, c *closures.Caution) {
		code(a, "code", &c.Code)
		text(a, "source", &c.Source)
		text(a, "detail", &c.Detail)
	})
}

func input(a *archive, in *closures.Input) {
	object(a, in, func(a *archive, in *closures.Input) {
		text(a, "source", &in.Source)
		whole(a, "age_ns", &in.Age)
		whole(a, "limit_ns", &in.Limit)
	})
}

// EncodeDurable appends the record's form of what outlives a restart. Lists are
// named by their digest.
func EncodeDurable(dst []byte, d *closures.Durable) ([]byte, error) {
	a := archive{out: dst}
	object(&a, d, func(a *archive, d *closures.Durable) { durable(a, d, nil) })
	if a.err != nil {
		return dst, fmt.Errorf("writing what outlives a restart: %w", a.err)
	}
	return a.out, nil
}

// DecodeDurable reads what EncodeDurable wrote, whole or not at all: a restart
// that lost a hold would be one that could open.
func DecodeDurable(body []byte, r Resolver) (closures.Durable, error) {
	a := reader(body)
	var d closures.Durable
	object(&a, &d, func(a *archive, d *closures.Durable) { durable(a, d, &r) })
	if err := a.end(); err != nil {
		return closures.Durable{}, fmt.Errorf("reading what outlives a restart: %w", err)
	}
	return d, nil
}

func durable(a *archive, d *closures.Durable, r *Resolver) {
	many(a, "lists", &d.Lists, func(a *archive, l *closures.DurableList) {
		object(a, l, func(a *archive, l *closures.DurableList) {
			list(a, &l.List, r)
			text(a, "by", &l.By)
			text(a, "confirmed", &l.Confirmed)
			word(a, "status", &l.Status, statusWords)
			text(a, "asked", &l.Asked)
		})
	})
	many(a, "holds", &d.Holds, within(holdPlaced))
	many(a, "latches", &d.Latches, within(func(a *archive, l *closures.DurableLatch) {
		text(a, "beam", &l.Beam)
		codes(a, "need", &l.Need)
		whole(a, "shutter_time_ns", &l.ShutterTime)
	}))
	many(a, "sightings", &d.Sightings, within(sighted))
	many(a, "detectors", &d.Detectors, within(detectorSeen))
	many(a, "tracks", &d.Tracks, within(func(a *archive, t *closures.DurableTrack) {
		nested(a, "seen", &t.Seen, aircraftSeen)
		instant(a, "heard", &t.Heard)
	}))
}

// within makes an element of an array of a struct's fields.
func within[T any](fields func(*archive, *T)) func(*archive, *T) {
	return func(a *archive, p *T) { object(a, p, fields) }
}
