package engine

import (
	"time"

	"beamward/closures"
)

// ownEvery is how often the clock's and the record's condition are told at
// least. The core's limit is 5 s.
const ownEvery = time.Second

// ownFacts returns what the engine itself has noticed: what waited for this
// turn, then the conditions of the clock and the record, where they changed or
// are due.
func (e *Engine) ownFacts(boot time.Duration) []closures.Body {
	own := append([]closures.Body(nil), e.own...)
	e.own = e.own[:0]
	own = append(own, e.nights0.ready()...)
	own = e.clockFacts(own, boot)
	return e.recordFacts(own, boot)
}

func (e *Engine) clockFacts(own []closures.Body, boot time.Duration) []closures.Body {
	said, last := e.opt.Health(), e.clockSaid
	stepped := said.Step != 0 || said.Suspended
	changed := said.Synchronised != last.Synchronised || said.MaxErrorSaid != last.MaxErrorSaid ||
		(said.MaxError > closures.MaxClockError) != (last.MaxError > closures.MaxClockError)
	e.clockSaid = said
	e.reanchor = stepped
	if said.Fault != "" {
		own = append(own, closures.Fault{Beam: closures.EveryBeam, Detail: "the clock cannot be read"})
	}
	if !stepped && !changed && !e.tellAnew && boot-e.clockTold < ownEvery {
		return own
	}
	e.clockTold = boot
	state := closures.ClockState{Step: said.Step, Suspended: said.Suspended, Synchronised: said.Synchronised && said.Fault == "", MaxError: -1}
	if said.MaxErrorSaid {
		state.MaxError = max(said.MaxError, 0)
	}
	return append(own, state)
}

func (e *Engine) recordFacts(own []closures.Body, boot time.Duration) []closures.Body {
	c, last := e.opt.Record.Condition(), e.condition
	e.condition = c
	e.in.setFull(c.Full)
	e.settle(c)
	if !e.lost && !e.tellAnew && c.troubled() == last.troubled() && boot-e.recordTold < ownEvery {
		return own
	}
	e.recordTold = boot
	return append(own, closures.RecordState{
		Durable: c.Durable, Behind: c.Behind, Half: c.Half || c.Full, Full: c.Gap || e.lost, Failed: c.Failed, Damaged: c.Damaged,
	})
}
