package closures

import "time"

// applyShutter takes in where the shutter is, and measures how long it took
// since the last withdrawal.
func (s *State) applyShutter(f ShutterSeen, at time.Time) *Error {
	b := s.beam(f.Beam)
	if b == nil {
		return Errorf(NotFound, "name a configured beam", "shutter: beam %.64q is not configured", f.Beam)
	}
	if f.Said.Before(b.shutter.Said) {
		return nil
	}
	b.shutter, b.shutterHeard = f, at
	if f.Position == ShutterClosed && !b.open && !b.withdrawn.IsZero() && !b.sawClosed {
		b.sawClosed = true
		// By its own word, as far as its clock may be wrong, so that a service that
		// was held up does not blame the shutter.
		seen := f.Said.Add(s.rules.Permit.ConsumerClockError)
		if at.Before(seen) {
			seen = at
		}
		if took := seen.Sub(b.withdrawn) - s.rules.toldWithin(); took > b.rules.ShutterTime && took > b.longestShutter && b.withdrawn.After(s.boot.At) {
			b.longestShutter = took
			s.durable++
		}
	}
	return nil
}

func (s *State) applyLaser(f LaserSeen, at time.Time) *Error {
	b := s.beam(f.Beam)
	if b == nil {
		return Errorf(NotFound, "name a configured beam", "laser: beam %.64q is not configured", f.Beam)
	}
	if f.Said.Before(b.laser.Said) {
		return nil
	}
	b.laser, b.laserHeard = f, at
	return nil
}

// toldWithin bounds how long after a withdrawal a reader that asks on
// schedule has been told.
func (r *Rules) toldWithin() time.Duration { return r.Permit.Renew + r.Permit.ConsumerClockError }

// shutterFault is the check that the shutter does what it is told: closed
// within shutter_time of a reader on schedule being told, not silent where
// feedback is required, and no light without a permit or through a shutter
// that says it is closed.
type shutterFault struct{}

func (shutterFault) Code() Code { return CodeShutterFault }

func (shutterFault) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	b, r := c.Beam, c.Beam.rules
	violated := func(detail string) {
		sh.add(Finding{Code: CodeShutterFault, Source: Source(r.ID), Verdict: Violated, Detail: detail})
	}
	heard := !b.shutterHeard.IsZero()
	fresh := heard && age(c.At, b.shutter.Said, b.shutterHeard) <= r.FeedbackStale
	if r.FeedbackRequired && !fresh {
		sh.add(Finding{Code: CodeShutterFault, Source: Source(r.ID), Verdict: Unknown, Margin: UnknownMargin(), Detail: "the shutter is silent"})
	}
	if !r.FeedbackRequired && !fresh {
		sh.Cautions = append(sh.Cautions, Caution{Code: CodeShutterFault, Source: Source(r.ID), Detail: "the shutter does not say where it is"})
	}
	least := Margin{}
	if !b.open {
		// Before the first opening nothing was withdrawn: a shutter that is open
		// at the start has had its time from the start on.
		since := b.withdrawn
		if since.IsZero() {
			since = c.boot
		}
		deadline := since.Add(c.Rules.toldWithin() + r.ShutterTime)
		late := c.At.After(deadline)
		least = Margin{Value: deadline.Sub(c.At).Seconds(), Unit: Second}
		if late && heard && (b.shutter.Position == ShutterOpen || b.shutter.Position == ShutterMoving) {
			violated("the shutter is not closed in time after the permit was withdrawn")
		}
		if late && b.laser.Emitting {
			violated("the laser emits without a permit")
		}
	}
	if fresh && b.shutter.Position == ShutterClosed && b.laser.Emitting && age(c.At, b.laser.Said, b.laserHeard) <= r.FeedbackStale &&
		b.laser.Said.Sub(b.shutter.Said).Abs() > r.ShutterTime {
		violated("the laser emits through a shutter that says it is closed")
	}
	if b.longestShutter > r.ShutterTime {
		violated("the shutter was slower than its shutter_time")
	}
	sh.finish(CodeShutterFault, first, least)
}
