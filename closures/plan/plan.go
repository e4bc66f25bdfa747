package plan

import (
	"cmp"
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Planner answers for one beam over one span of time.
type Planner struct {
	foreseen *closures.Foreseen
	beam     *closures.BeamRules
	over     span.Span
	near     span.Span // over, and as far beyond as a closure can reach in
	nights   []*sky.Night
	shared   *closures.Shared
	dark     span.Set
}

// MaxLength is the longest span that one plan answers for.
const MaxLength = 14 * 24 * time.Hour

// Prepare makes a planner for a beam over a span that nights cover. The error
// is a *closures.Error.
func Prepare(f *closures.Foreseen, beam closures.BeamID, over span.Span, nights []*sky.Night) (*Planner, error) {
	b := f.Rules.Beam(beam)
	if b == nil {
		return nil, closures.Errorf(closures.NotFound, "name a configured beam", "plan: beam %.64q is not configured", beam)
	}
	if over.Empty() {
		return nil, closures.Errorf(closures.Invalid, "until must be after from", "plan: the span is empty")
	}
	if over.Length() > MaxLength {
		return nil, closures.Errorf(closures.Invalid, "plan at most 14 days at a time", "plan: the span is too long")
	}
	clockError := f.Rules.PlanClockError()
	near := over.Widen(clockError, f.Rules.MarginTime(b)+clockError)
	at := near.From
	for at.Before(near.Until) {
		i := slices.IndexFunc(nights, func(n *sky.Night) bool { return sky.Bin(at) == closures.BinOf(n) })
		if i < 0 {
			return nil, closures.Errorf(closures.Internal, "prepare every night of the span", "plan: the sky at %s is not prepared", at.Format(time.RFC3339))
		}
		at = sky.Bin(at).Until
	}
	p := &Planner{foreseen: f, beam: b, over: over, near: near, nights: nights}
	p.shared = closures.Share(f, p.question(nil))
	p.dark = p.shared.Daylight().Widen(f.Rules.MarginTime(b)+clockError, clockError).Complement(over)
	return p, nil
}

// Over returns the span that the plan is for.
func (p *Planner) Over() span.Span { return p.over }

// Dark returns when the Sun is below the beam's limit: all of the span for a
// beam without one. An empty set says that the night has no dark time.
func (p *Planner) Dark() span.Set { return slices.Clone(p.dark) }

// Nights prepares every night that a plan over a span needs, in order.
func Nights(r *closures.Rules, over span.Span) ([]*sky.Night, error) {
	var out []*sky.Night
	near := over.Widen(aside, aside)
	for at := sky.Bin(near.From).From; at.Before(near.Until); at = sky.Bin(at).Until {
		n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
		if err != nil {
			return nil, closures.Errorf(closures.Invalid, "choose a time within 1900 to 2100", "plan: the sky at %s cannot be prepared: %v", at.Format(time.RFC3339), err)
		}
		out = append(out, n)
	}
	return out, nil
}

// aside is more than any margin time and clock error.
const aside = 2 * time.Minute

// Allowed is what one target can have.
type Allowed struct {
	Spans    span.Set           // when nothing foreseeable stands against it
	Blocked  []closures.Finding // every closure, each begun earlier by the margin time and widened by the clock's error, in order of time
	Cautions []closures.Caution
	LeftOut  closures.Codes // what only a decision can tell
}

// Scratch is one caller's memory, used again for each target.
type Scratch struct {
	sheet  closures.Sheet
	hits   closures.Hits
	closed span.Set
	order  []int32
}

func (p *Planner) question(a *closures.Aim) closures.Question {
	return closures.Question{Beam: p.beam, Aim: a, Over: p.near, Nights: p.nights, Edge: closures.EdgePlan, Slack: closures.PlanSlack}
}

// One returns when the aim is allowed. An aim that is not valid is refused.
// What is returned is the caller's own.
func (p *Planner) One(a *closures.Aim, scratch *Scratch) (Allowed, error) {
	a, ok := p.foreseen.Prepared(a, p.nights)
	if !ok {
		return Allowed{}, closures.Errorf(closures.Invalid, "give a whole aim with finite numbers, whose instant the plan's nights hold", "plan: the aim cannot be used")
	}
	q := p.question(a)
	q.Hits, q.Shared = scratch.hits.Along(p.foreseen, &q), p.shared
	sh := &scratch.sheet
	sh.Reset()
	p.foreseen.Look(&q, sh)
	if len(p.dark) == 0 {
		sh.Cautions = append(sh.Cautions, closures.Caution{Code: closures.CodeDaylight, Detail: "the Sun is at no time of the span below the beam's limit"})
	}
	clockError := p.foreseen.Rules.PlanClockError()
	scratch.closed = p.foreseen.AppendClosed(scratch.closed, &q, sh, clockError)
	return Allowed{
		Spans:    scratch.closed.Complement(p.over),
		Blocked:  p.blocked(scratch, clockError),
		Cautions: slices.Clone(sh.Cautions),
		LeftOut:  closures.AllCodes &^ closures.ForeseeableCodes(),
	}, nil
}

// blocked returns the findings as closures of the plan's span, in order of
// time.
func (p *Planner) blocked(scratch *Scratch, clockError time.Duration) []closures.Finding {
	early := p.foreseen.Rules.MarginTime(p.beam) + clockError
	found := scratch.sheet.Found
	order := scratch.order[:0]
	for i := range found {
		f := &found[i]
		if f.Over = f.Over.Widen(early, clockError).Intersect(p.over); !f.Over.Empty() {
			order = append(order, int32(i))
		}
	}
	scratch.order = order
	slices.SortFunc(order, func(i, j int32) int { return cmp.Or(found[i].Over.From.Compare(found[j].Over.From), cmp.Compare(i, j)) })
	out := make([]closures.Finding, len(order))
	for k, i := range order {
		out[k] = found[i]
	}
	return out
}
