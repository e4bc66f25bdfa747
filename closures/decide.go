package closures

import (
	"cmp"
	"slices"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// turned bounds how far the sky turns in a time.
func turned(d time.Duration) s1.Angle { return s1.Angle(sky.SkyRate * d.Abs().Seconds()) }

// Step applies a batch of facts, settles the latches and decides each beam
// once at the instant at, in the rules' order. It alone changes the state. The
// decisions are appended to out and are never changed afterwards.
//
// The caller gives facts in the order of their numbers and instants that do
// not go back. Where they do, the clock is at fault and the beams are
// shuttered.
func (s *State) Step(batch []Fact, at time.Time, out []Decision) []Decision {
	s.begin(at)
	for _, f := range batch {
		if f.Seq <= s.seq && f.Seq != 0 {
			s.scene.fault = "facts came out of order"
		}
		s.seq = max(s.seq, f.Seq)
		if err := s.apply(f); err != nil {
			s.refused = append(s.refused, Refused{Seq: f.Seq, Err: err})
		}
	}
	s.expire(at)
	for i := range s.beams {
		b := &s.beams[i]
		s.hit(b)
		sh := &s.sheet
		s.look(b, at, sh)
		if b.latch.settle(s.rules, nonClear(sh), b.asksFor(sh), at) {
			s.durable++
		}
		b.latch.write(b.rules, at, sh)
		if !b.wasStarted && sh.Answers[CodeStarting].Verdict == Clear {
			b.wasStarted = true
		}
		var d Decision
		s.conclude(b, at, sh, &d)
		if b.open && !d.Open {
			b.withdrawn, b.sawClosed = at, false
		}
		b.open = d.Open
		out = append(out, d)
	}
	return out
}

// begin forgets what held for the last step only.
func (s *State) begin(at time.Time) {
	s.refused = nil
	s.scene.fault, s.scene.clock.stepped = "", false
	anyOpen := false
	for i := range s.beams {
		s.beams[i].moved, s.beams[i].fault = "", ""
		anyOpen = anyOpen || s.beams[i].open
	}
	if at.Before(s.at) {
		s.scene.clock.stepped = true
	}
	// A permit lapses by itself within the lease, for which reach looks ahead.
	// A longer silence of the engine while a beam was open is a fault.
	if anyOpen && at.Sub(s.at) > s.rules.Permit.Lease {
		s.scene.fault = "no decision was made for longer than a lease"
	}
	s.at = at
}

// expire drops what has long been over. What is over closes nothing, so that
// keeping it costs little; dropping it at once would lose a person's word for
// good when the clock ran ahead for a while and came back.
func (s *State) expire(at time.Time) {
	s.scene.expire(at)
	if !s.scene.clockSound(at) {
		return
	}
	if book, ok := s.book.prune(at); ok {
		s.book = book
		s.durable++
		s.foresee()
	}
	long := func(h HoldPlaced) bool { return at.Sub(h.Span().Until) > keepPast }
	if slices.ContainsFunc(s.holds, long) {
		s.holds = slices.DeleteFunc(slices.Clone(s.holds), long)
		s.durable++
		s.foresee()
	}
	if s.scene.forget(at) {
		s.durable++
	}
}

// hit renews the regions near a beam's present aim when they no longer serve.
func (s *State) hit(b *beam) {
	a := b.present()
	if a == nil {
		b.hits = nil
		return
	}
	if b.hits.serves(b.rules, a.aim, b.hits0) {
		return
	}
	b.hits = MakeHits(s.scene.Foreseen, b.rules, a.aim)
	b.hits0 = (a.aim.Error + b.rules.Aim.Error + b.rules.Asterism).Radians()
}

// Decide decides one beam at an instant from what the last step left, without
// changing anything. The sheet and the decision are the caller's, used again.
// An unknown beam is shuttered.
func (s *State) Decide(id BeamID, at time.Time, sh *Sheet, d *Decision) {
	b := s.beam(id)
	if b == nil {
		*d = Decision{Beam: id, At: at, Codes: Codes(0).With(CodeFault)}
		return
	}
	s.look(b, at, sh)
	b.latch.write(b.rules, at, sh)
	s.conclude(b, at, sh, d)
}

// look runs every check but the latch's two.
func (s *State) look(b *beam, at time.Time, sh *Sheet) {
	sh.Reset()
	c := s.scene
	c.At, c.Beam, c.Night = at, b, s.night(at)
	// What ended no longer ago than the clock may be wrong still closes.
	over := span.Span{From: at.Add(-s.scene.clockError()), Until: at.Add(Foresight)}
	if a := b.present(); a != nil {
		q := Question{Beam: b.rules, Aim: a.aim, Over: over, Nights: s.nightsAbout(over), Edge: EdgeDecide, Now: at, AimBegan: a.began}
		if b.hits.serves(b.rules, a.aim, b.hits0) {
			q.Hits = b.hits
		}
		s.scene.Look(&q, sh)
	} else {
		s.lookAimless(b, over, at, sh)
	}
	for _, check := range live() {
		check.Now(&c, sh)
	}
	s.now(b, at, sh)
}

// lookAimless answers the foreseeable checks where no aim is known: those that
// need none as ever, the others as unknown. That the aim is not known is a
// reason of its own.
func (s *State) lookAimless(b *beam, over span.Span, at time.Time, sh *Sheet) {
	nowhere := Aim{}
	q := Question{Beam: b.rules, Aim: &nowhere, Over: over, Nights: s.nightsAbout(over), Edge: EdgeDecide, Now: at}
	for _, check := range foreseeable() {
		switch check.(type) {
		case notCovered, daylight, held:
			check.Look(s.scene.Foreseen, &q, sh)
		default:
			first := sh.begin()
			sh.add(Finding{Code: check.Code(), Verdict: Unknown, Over: over, Margin: UnknownMargin(), Detail: "no aim is known"})
			sh.finish(check.Code(), first, UnknownMargin())
		}
	}
}

// present reports whether a foreseeable finding closes at an instant: from
// early before its start until late after its end. An instant that compares
// with nothing is inside.
func present(f *Finding, at time.Time, early, late time.Duration) bool {
	before := at.Before(f.Over.From.Add(-early))
	after := !at.Before(f.Over.Until.Add(late))
	return !before && !after
}

// now turns the foreseeable checks' answers over the coming minutes into their
// answers for the instant: what does not close yet is set aside as coming. A
// check that did not run to its end stays unknown.
func (s *State) now(b *beam, at time.Time, sh *Sheet) {
	late := s.scene.clockError()
	early := s.rules.MarginTime(b.rules) + late
	sh.coming = sh.coming[:0]
	for _, check := range foreseeable() {
		a := &sh.Answers[check.Code()]
		if a.N == 0 {
			continue
		}
		v := Clear
		kept := a.First
		for i := a.First; i < a.First+a.N; i++ {
			f := &sh.Found[i]
			switch {
			case present(f, at, early, late):
				if f.Verdict != Clear && (v == Clear || f.Verdict < v) {
					v = f.Verdict
				}
				sh.Found[kept] = *f
				kept++
			case f.Over.From.After(at):
				sh.coming = append(sh.coming, *f)
			}
		}
		a.Verdict, a.N = v, kept-a.First
	}
	slices.SortStableFunc(sh.coming, func(x, y Finding) int { return x.Over.From.Compare(y.Over.From) })
}

// nonClear returns the codes whose answers are not clear at the sheet's
// instant.
func nonClear(sh *Sheet) Codes {
	var s Codes
	for c := Code(0); c < NumCodes; c++ {
		if c != CodeReopening && c != CodeRearm && sh.Answers[c].Verdict != Clear {
			s = s.With(c)
		}
	}
	return s
}

// asksFor returns which of the closed codes may ask for a person afterwards.
// Until everything required has been heard once since the start, what is only
// unknown belongs to the start, which asks for itself.
func (b *beam) asksFor(sh *Sheet) Codes {
	asks := AllCodes
	if b.wasStarted {
		return asks
	}
	for c := Code(0); c < NumCodes; c++ {
		if c != CodeStarting && sh.Answers[c].Verdict == Unknown {
			asks = asks.Without(c)
		}
	}
	return asks
}

// conclude folds the sheet into a decision, in d's own memory.
func (s *State) conclude(b *beam, at time.Time, sh *Sheet, d *Decision) {
	*d = Decision{
		Seq: s.seq, Beam: b.rules.ID, At: at, Rules: s.rules.Digest, Lists: s.lists,
		Reasons: d.Reasons[:0], Coming: d.Coming[:0], Inputs: d.Inputs[:0], Cautions: append(d.Cautions[:0], sh.Cautions...),
	}
	s.inputs(b, at, d)
	var verdicts [NumCodes]Verdict
	for c := Code(0); c < NumCodes; c++ {
		a := &sh.Answers[c]
		verdicts[c] = a.Verdict
		if a.Verdict == Clear {
			continue
		}
		d.Codes = d.Codes.With(c)
		if a.N == 0 { // the check did not run to its end
			d.Reasons = append(d.Reasons, Finding{Code: CodeFault, Source: Source(c.String()), Verdict: Unknown, Margin: UnknownMargin(), Detail: "a check gave no answer"})
			d.Codes = d.Codes.With(CodeFault)
			continue
		}
		d.Reasons = append(d.Reasons, sh.Found[a.First:a.First+a.N]...)
	}
	slices.SortStableFunc(d.Reasons, func(x, y Finding) int {
		return cmp.Or(cmp.Compare(x.Code, y.Code), cmp.Compare(x.Source, y.Source), x.Over.From.Compare(y.Over.From), cmp.Compare(x.Region, y.Region), cmp.Compare(x.Ref, y.Ref))
	})
	d.Open = Fold(&verdicts)

	early := s.rules.MarginTime(b.rules) + s.scene.clockError()
	if len(sh.coming) > 0 {
		d.ClosesAt = sh.coming[0].Over.From
		d.OpenUntil = d.ClosesAt.Add(-early)
		d.Coming = append(d.Coming, sh.coming...)
	}
	// Belt and braces: nothing is open at or past its own end.
	if !d.OpenUntil.IsZero() && !at.Before(d.OpenUntil) {
		d.Open = false
	}
	if !d.Open {
		d.OpensAt = s.opensAt(b, at, sh, d)
	}
}

// opensAt returns when a shuttered beam can open, if all that closes it is
// foreseen to end within Foresight; else the zero time.
func (s *State) opensAt(b *beam, at time.Time, sh *Sheet, d *Decision) time.Time {
	late := s.scene.clockError()
	early := s.rules.MarginTime(b.rules) + late
	ends := at
	for i := range d.Reasons {
		f := &d.Reasons[i]
		switch {
		case f.Code == CodeReopening:
			if f.Over.Until.After(ends) {
				ends = f.Over.Until
			}
		case !ForeseeableCodes().Has(f.Code) || f.Verdict == Unknown:
			return time.Time{}
		case f.Over.Until.Add(late + b.rules.ReopenAfter).After(ends):
			ends = f.Over.Until.Add(late + b.rules.ReopenAfter)
		}
	}
	for i := range sh.coming { // in order of time: another may have begun by then
		f := &sh.coming[i]
		if !f.Over.From.Add(-early).After(ends) {
			if next := f.Over.Until.Add(late + b.rules.ReopenAfter); next.After(ends) {
				ends = next
			}
		}
	}
	if !ends.Before(at.Add(Foresight)) {
		return time.Time{}
	}
	return ends
}

// inputs lists what the decision rests on.
func (s *State) inputs(b *beam, at time.Time, d *Decision) {
	if a := b.present(); a != nil {
		d.Inputs = append(d.Inputs, Input{Source: Source(b.rules.ID), Age: age(at, a.seen.Said, a.heard), Limit: b.rules.Aim.StaleAfter})
	} else {
		d.Inputs = append(d.Inputs, Input{Source: Source(b.rules.ID), Age: -1, Limit: b.rules.Aim.StaleAfter})
	}
	for i := range s.scene.sources {
		k := &s.scene.sources[i]
		in := Input{Source: k.rules.ID, Age: -1, Limit: k.rules.StaleAfter}
		if !k.heard.IsZero() {
			in.Age = age(at, k.said, k.heard)
		}
		d.Inputs = append(d.Inputs, in)
	}
}
