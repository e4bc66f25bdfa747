package recheck

import (
	"time"

	"beamward/closures"
)

// Ahead is how far the checker looks for closures to come. A permit reaches no
// further than a lease, which is seconds.
const Ahead = 2 * time.Minute

// instants is the tolerance of comparisons of instants: twice how finely a
// decision places the edges that it searches for.
const instants = 2 * time.Millisecond

// Checker is the second opinion. The zero Checker is ready. It keeps what lies
// near each beam's aim, and has one owner.
type Checker struct {
	beams map[closures.BeamID]*memory
}

// Check is a look by a Checker that keeps nothing.
func Check(d *closures.Decision, k *closures.Known, f *closures.Foreseen, rules *closures.Rules, at time.Time) (closures.Veto, bool) {
	var c Checker
	return c.Check(d, k, f, rules, at)
}

// Check works out anew whether an open decision may stand: ok is true when it
// may not, with the veto. A shuttered decision is never vetoed.
//
// The decision must be of the instant at, and what is known, lists and rules
// those that it was made from: Known(at) and Foreseen after the same step. Of
// others there is no judging, which is a veto too, so that a mistake in the
// asking shows. It fails shuttered: a panic is a veto.
func (c *Checker) Check(d *closures.Decision, k *closures.Known, f *closures.Foreseen, rules *closures.Rules, at time.Time) (v closures.Veto, vetoed bool) {
	if d == nil || !d.Open {
		return closures.Veto{}, false
	}
	defer func() {
		if recover() != nil {
			v, vetoed = closures.Veto{Beam: d.Beam, Detail: "second opinion: it failed"}, true
		}
	}()
	if detail := c.judge(d, k, f, rules, at); detail != "" {
		return closures.Veto{Beam: d.Beam, Detail: detail}, true
	}
	return closures.Veto{}, false
}

// look is one look at one open decision.
type look struct {
	d     *closures.Decision
	k     *closures.Known
	f     *closures.Foreseen
	rules *closures.Rules
	beam  *closures.BeamRules
	known *closures.BeamKnown
	at    time.Time
	aim   aim
	now   point         // the aim's azimuth and elevation
	off   time.Duration // from the end of a permit to the beam being off
	guard time.Duration // from the decision to the beam being off at the latest
}

// judge returns why the decision may not stand; empty when nothing speaks
// against it.
func (c *Checker) judge(d *closures.Decision, k *closures.Known, f *closures.Foreseen, rules *closures.Rules, at time.Time) string {
	l := look{d: d, k: k, f: f, rules: rules, at: at}
	for _, part := range [...]func() string{
		l.whole, l.heard, l.people, l.shutter, l.pointing, l.held, l.covered, l.sky, l.fields, l.aircraft,
	} {
		if detail := part(); detail != "" {
			return detail
		}
	}
	return l.listed(c.memory(&l))
}

// whole checks that there is something to judge and that it is of one piece.
// BW-001, BW-008.
func (l *look) whole() string {
	d := l.d
	if l.k == nil || l.f == nil || l.rules == nil {
		return "second opinion: it was not given what is known"
	}
	if l.f.Rules == nil || l.f.Rules.Digest != l.rules.Digest || d.Rules != l.rules.Digest {
		return "second opinion: the decision was made by other rules"
	}
	if !d.At.Equal(l.at) || !l.k.At.Equal(l.at) {
		return "second opinion: the decision is of another instant"
	}
	if d.Codes != 0 || len(d.Reasons) != 0 {
		return "second opinion: open with a reason against it"
	}
	for i := range l.rules.Beams {
		if l.rules.Beams[i].ID == d.Beam {
			l.beam = &l.rules.Beams[i]
		}
	}
	for i := range l.k.Beams {
		if l.k.Beams[i].Beam == d.Beam {
			l.known = &l.k.Beams[i]
		}
	}
	if l.beam == nil || l.known == nil {
		return "second opinion: the beam is not known"
	}
	l.off = l.beam.ShutterTime + l.rules.Permit.ConsumerClockError
	l.guard = l.off + l.rules.Permit.Lease
	switch {
	case !(l.beam.ShutterTime > 0 && l.rules.Permit.Lease > 0 && l.rules.Permit.ConsumerClockError >= 0):
		return "second opinion: the rules give no time to shutter"
	case d.OpenUntil.IsZero() != d.ClosesAt.IsZero():
		return "second opinion: open with one end and not the other"
	case !d.OpenUntil.IsZero() && !l.at.Before(d.OpenUntil):
		return "second opinion: open past its own end"
	case !d.OpenUntil.IsZero() && d.ClosesAt.Sub(d.OpenUntil) < l.off:
		return "second opinion: too little time to shutter before the closure"
	}
	return ""
}

// ends reports whether the decision ends in time for what closes at an instant
// from now on: nothing that closes now may be open, and what closes later must
// find the beam off. BW-008.
func (l *look) ends(t time.Time) bool {
	return t.After(l.at) && !l.d.OpenUntil.IsZero() && !l.d.OpenUntil.After(t.Add(instants-l.off))
}

// samples are the instants at which standing closures are looked at: now, when
// a permit given now is over at the latest, and some way ahead.
func (l *look) samples() [4]time.Time {
	return [...]time.Time{l.at, l.at.Add(l.guard), l.at.Add(Ahead / 2), l.at.Add(Ahead)}
}
