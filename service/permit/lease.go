package permit

import (
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// lease turns a decision into a permit. wall and boot are now; issued is the
// latest instant at which the permit is handed out, not before now.
func (i *Issuer) lease(s *Sight, wall time.Time, boot time.Duration, issued time.Time, nonce string) wire.Permit {
	d := s.Decision
	p := wire.Permit{
		Beam: d.Beam, Seq: d.Seq, BootID: s.BootID, IssuedAt: ceil(issued), Nonce: nonce, Simulated: i.simulated,
		RulesDigest: d.Rules.String(), ListsDigest: d.Lists.String(),
		ClosesAt: wire.Instant(d.ClosesAt), OpensAt: wire.Instant(d.OpensAt),
		Reasons: make([]wire.Reason, 0, len(d.Reasons)+1), Cautions: make([]wire.Caution, 0, len(d.Cautions)), Inputs: make([]wire.Input, 0, len(d.Inputs)),
	}
	for j := range d.Reasons {
		p.Reasons = append(p.Reasons, wire.ReasonOf(&d.Reasons[j]))
	}
	for j := range d.Cautions {
		p.Cautions = append(p.Cautions, wire.CautionOf(&d.Cautions[j]))
	}
	age := max(boot-s.Boot, 0)
	for j := range d.Inputs {
		in := d.Inputs[j]
		if in.Age >= 0 {
			in.Age += age // since the decision
		}
		p.Inputs = append(p.Inputs, wire.InputOf(&in))
	}

	until := validUntil(d, s.At, s.Rules.Permit.Lease)
	old, stale := staleness(s.At, s.Boot, s.Rules.Permit.DecisionInterval, wall, boot)
	// Positive: open only if every one of these holds.
	if open := d.Open && len(d.Reasons) == 0 && !stale && until.After(p.IssuedAt); open {
		p.State, p.ValidUntil = wire.Open, until
		p.LeaseMS = until.Sub(p.IssuedAt).Milliseconds()
		return p
	}
	p.State, p.ValidUntil, p.LeaseMS = wire.Shuttered, p.IssuedAt, 0
	switch {
	case stale:
		p.OpensAt = nil
		p.Reasons = append(p.Reasons, wire.ReasonOf(&old))
	case d.Open && len(d.Coming) > 0:
		p.Reasons = append(p.Reasons, wire.ReasonOf(&d.Coming[0]))
	case len(p.Reasons) == 0:
		p.Reasons = append(p.Reasons, wire.ReasonOf(&closures.Finding{Code: closures.CodeFault, Margin: closures.UnknownMargin(), Detail: "the decision gives no time to be open in"}))
	}
	return p
}

// validUntil is min(decided_at + lease, open_until), rounded down to the
// millisecond.
func validUntil(d *closures.Decision, at time.Time, lease time.Duration) time.Time {
	until := at.Add(lease)
	if !d.OpenUntil.IsZero() && d.OpenUntil.Before(until) {
		until = d.OpenUntil
	}
	return until.Truncate(time.Millisecond)
}

func ceil(t time.Time) time.Time {
	down := t.Truncate(time.Millisecond)
	if down.Equal(t) {
		return down
	}
	return down.Add(time.Millisecond)
}

// staleness reports whether a decision made at an instant of two clocks is
// believed now, and if not, why.
func staleness(at time.Time, made, interval time.Duration, wall time.Time, boot time.Duration) (why closures.Finding, stale bool) {
	limit := StaleAfter * interval
	believed := func(age time.Duration) bool { return age >= 0 && age <= limit }
	byWall, byBoot := believed(wall.Sub(at)), believed(boot-made)
	if byWall && byBoot {
		return why, false
	}
	why = closures.Finding{Code: closures.CodeFault, Verdict: closures.Unknown, Margin: closures.UnknownMargin(), Detail: "no decision was made for three decision intervals"}
	if byBoot || wall.Before(at) {
		why.Code, why.Detail = closures.CodeClock, "the clock moved since the decision"
	}
	return why, true
}

// Fresh reports whether decisions are being made.
func (i *Issuer) Fresh() bool {
	at, made, r := i.source.Pulse()
	wall, boot := i.clock.Read()
	if r == nil {
		return false
	}
	_, stale := staleness(at, made, r.Permit.DecisionInterval, wall, boot)
	return !stale
}
