package closures

import (
	"time"
)

// live returns the checks that only a decision asks. The latch writes
// reopening and rearm.
func live() [13]LiveCheck {
	return [...]LiveCheck{
		aircraft{}, sighting{}, detectorAlarm{}, interlock{}, watchMissing{}, aimUnknown{}, slewing{}, sourceSilent{}, clock{},
		record{}, shutterFault{}, starting{}, fault{},
	}
}

// interlock is the check that each interlock on site says safe. A word that
// is not safe counts until safe is heard; one that is too old is no word.
type interlock struct{}

func (interlock) Code() Code { return CodeInterlock }

func (interlock) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.sources {
		s := &c.sources[i]
		if s.rules.Kind != InterlockSource {
			continue
		}
		never := s.interlock.Said.IsZero()
		f := Finding{Code: CodeInterlock, Source: s.rules.ID, Verdict: Violated, Detail: "the interlock is not safe"}
		switch {
		case !never && !s.interlock.Safe:
			sh.add(f)
		case s.rules.Required && (never || !(age(c.At, s.interlock.Said, s.heard) <= s.rules.StaleAfter)):
			f.Verdict, f.Margin, f.Detail = Unknown, UnknownMargin(), "the interlock has not said that it is safe"
			sh.add(f)
		}
	}
	sh.finish(CodeInterlock, first, Margin{})
}

// aimUnknown is the check that the beam's aim is known: one is fresh, and all
// that are fresh agree.
type aimUnknown struct{}

func (aimUnknown) Code() Code { return CodeAimUnknown }

func (aimUnknown) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	b := c.Beam
	r := &b.rules.Aim
	say := func(v Verdict, detail string) {
		sh.add(Finding{Code: CodeAimUnknown, Source: Source(b.rules.ID), Verdict: v, Margin: UnknownMargin(), Detail: detail})
	}
	newest := b.present()
	least := UnknownMargin()
	switch {
	case newest == nil:
		say(Unknown, "no aim has been heard")
	case !newest.fresh(c.At, r):
		say(Unknown, "the aim is too old")
	case c.Night == nil:
		say(Unknown, "the sky of this night is not prepared")
	default:
		least = Margin{Value: (r.StaleAfter - age(c.At, newest.seen.Said, newest.heard)).Seconds(), Unit: Second}
		if _, _, ok := newest.aim.At(c.Night, c.At); !ok {
			say(Unknown, "the aim does not reach to now")
		}
		if newest.aim.Motion == MotionNotSaid {
			say(Unknown, "the aim does not say how it moves")
		}
		for i := range b.aims {
			o := &b.aims[i]
			if o == newest || !o.fresh(c.At, r) {
				continue
			}
			// Two words of different instants may differ by what the sky turned
			// between them, where either is fixed to the ground.
			extra := 2 * r.Error
			if o.aim.Frame == Horizon || newest.aim.Frame == Horizon {
				extra += turned(newest.seen.Said.Sub(o.seen.Said))
			}
			if beyond := apart(newest.aim, o.aim, extra, c.Night, c.At); !(beyond <= 0) {
				say(Violated, "two senders state aims that disagree")
			}
		}
	}
	if b.moved != "" {
		say(Violated, b.moved)
	}
	sh.finish(CodeAimUnknown, first, least)
}

// slewing is the check that the beam's telescope is not on its way elsewhere.
type slewing struct{}

func (slewing) Code() Code { return CodeSlewing }

func (slewing) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.Beam.aims {
		a := &c.Beam.aims[i]
		if a.aim.Motion == Slewing && (a == c.Beam.present() || a.fresh(c.At, &c.Beam.rules.Aim)) {
			sh.add(Finding{Code: CodeSlewing, Source: Source(c.Beam.rules.ID), Verdict: Violated, Detail: "the telescope slews"})
			break
		}
	}
	sh.finish(CodeSlewing, first, Margin{})
}

// sourceSilent is the check that every required source is heard and, where it
// must prove it, receives. Optional ones that are silent are a caution.
type sourceSilent struct{}

func (sourceSilent) Code() Code { return CodeSourceSilent }

func (sourceSilent) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for i := range c.sources {
		s := &c.sources[i]
		detail := ""
		switch {
		case s.heard.IsZero():
			detail = "the source has not been heard since the start"
		case s.silent(c.At):
			detail = "the source is silent"
		case s.rules.Kind == AircraftSource && !s.receives(c.At):
			detail = "the source does not prove that it receives"
		case !s.warm(c.At):
			detail = "the source has not been received long enough without a break"
		default:
			continue
		}
		if s.rules.Required {
			sh.add(Finding{Code: CodeSourceSilent, Source: s.rules.ID, Verdict: Unknown, Margin: UnknownMargin(), Detail: detail})
		} else {
			sh.Cautions = append(sh.Cautions, Caution{Code: CodeSourceSilent, Source: s.rules.ID, Detail: detail})
		}
	}
	sh.finish(CodeSourceSilent, first, Margin{})
}

// clock is the check that the time is right: no step, no sleep, and within
// what the rules ask of the kernel.
type clock struct{}

func (clock) Code() Code { return CodeClock }

func (clock) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	say := func(v Verdict, detail string) { sh.add(Finding{Code: CodeClock, Verdict: v, Detail: detail}) }
	k := &c.clock
	switch {
	case k.heard.IsZero() || !(age(c.At, k.heard, k.heard) <= clockStale):
		say(Unknown, "the state of the clock is not known")
	case k.stepped:
		say(Violated, "the clock stepped or the machine slept")
	case c.Rules.Clock.Synchronised == SyncAssumed:
	case !k.Synchronised:
		say(Violated, "the kernel says that its clock is not synchronised")
	case !(k.MaxError >= 0 && k.MaxError <= MaxClockError):
		say(Violated, "the kernel's clock may be off by more than is allowed")
	}
	sh.finish(CodeClock, first, Margin{Value: (MaxClockError - c.clockError()).Seconds(), Unit: Second})
}

// clockSound reports whether the clock may be believed at an instant, by what
// the rules ask.
func (c *Scene) clockSound(at time.Time) bool {
	k := &c.clock
	if k.heard.IsZero() || !(age(at, k.heard, k.heard) <= clockStale) || k.stepped {
		return false
	}
	return c.Rules.Clock.Synchronised == SyncAssumed || k.Synchronised && k.MaxError >= 0 && k.MaxError <= MaxClockError
}

// clockError bounds by how much the clock may be wrong; closures are widened
// by it.
func (c *Scene) clockError() time.Duration {
	if c.Rules.Clock.Synchronised == SyncAssumed {
		return min(max(c.Rules.Clock.StepLimit, 0), MaxClockError)
	}
	if c.clock.MaxError < 0 {
		return MaxClockError
	}
	return min(c.clock.MaxError, MaxClockError)
}

// PlanClockError bounds the clock's error at any time that a beam can be open.
func (r *Rules) PlanClockError() time.Duration {
	if r.Clock.Synchronised == SyncAssumed {
		return min(max(r.Clock.StepLimit, 0), MaxClockError)
	}
	return MaxClockError
}

// record is the check that what is decided can be put on record.
type record struct{}

func (record) Code() Code { return CodeRecord }

// maxBehind is how old the oldest entry that is not yet on disk may be.
const maxBehind = time.Second

func (record) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	say := func(v Verdict, detail string) { sh.add(Finding{Code: CodeRecord, Verdict: v, Detail: detail}) }
	k := &c.record
	switch {
	case k.heard.IsZero() || !(age(c.At, k.heard, k.heard) <= recordStale):
		say(Unknown, "the state of the record is not known")
	case k.Damaged:
		say(Violated, "the record is damaged")
	case k.Failed:
		say(Violated, "the record cannot be written")
	case k.Full:
		say(Violated, "the record refused an entry")
	case k.Half:
		say(Violated, "the record's queue is over half full")
	case !(k.Behind <= maxBehind):
		say(Violated, "the record is behind")
	}
	sh.finish(CodeRecord, first, Margin{Value: (maxBehind - k.Behind).Seconds(), Unit: Second})
}

// starting is the check that the durable facts are restored and everything
// required has been heard afresh since the start.
type starting struct{}

func (starting) Code() Code { return CodeStarting }

func (starting) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	if !c.Beam.wasStarted {
		say := func(from Source, detail string) {
			sh.add(Finding{Code: CodeStarting, Source: from, Verdict: Violated, Detail: detail})
		}
		if !c.started {
			say("", "what must outlive a restart is not restored yet")
		}
		if len(c.Beam.aims) == 0 {
			say(Source(c.Beam.rules.ID), "no aim has been heard since the start")
		}
		for i := range c.sources {
			s := &c.sources[i]
			if !s.rules.Required {
				continue
			}
			if s.heard.IsZero() {
				say(s.rules.ID, "the source has not been heard since the start")
			} else if !s.warm(c.At) || s.rules.Kind == AircraftSource && !s.receives(c.At) {
				say(s.rules.ID, "the source has not been received long enough without a break")
			}
		}
	}
	sh.finish(CodeStarting, first, Margin{})
}

// fault is the check that the service has found nothing wrong with itself and
// the second opinion has not vetoed.
type fault struct{}

func (fault) Code() Code { return CodeFault }

func (fault) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	for _, detail := range [...]string{c.fault, c.Beam.fault} {
		if detail != "" {
			sh.add(Finding{Code: CodeFault, Verdict: Violated, Detail: detail})
		}
	}
	sh.finish(CodeFault, first, Margin{})
}
