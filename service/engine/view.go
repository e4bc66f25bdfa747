package engine

import (
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
)

// View is what the engine last published. It is never changed, and neither is
// anything that it points to.
//
// A reader must refuse a view that is older than three decision intervals by
// either clock: the engine may have stopped.
type View struct {
	At     time.Time     // of the decisions: UTC
	Boot   time.Duration // of the decisions, by the boot clock
	BootID string
	Number uint64 // rises by one with each view
	Seq    uint64 // of the decisions: the number of the tick that ended their batch

	Beams []BeamView // in the rules' order

	Rules    *closures.Rules
	Foreseen *closures.Foreseen
	Book     closures.Book
	Holds    []closures.HoldPlaced
	Nights   []*sky.Night
	Durable  uint64 // rises with each change of lists, holds, latches and sightings

	Known *closures.Known // for people to look at; at most viewEvery older than At

	Clock  ClockReport
	Record Condition

	Started   bool // the first turn was made
	Stopped   bool // the last one was
	Simulated bool
}

// BeamView is one beam as published.
type BeamView struct {
	// Decision is what readers act on. While an opening is not on record it is
	// the core's, shuttered, with the reason record.
	Decision *closures.Decision
	Opening  bool      // the core opens; the entry of the opening is not durable yet
	Since    time.Time // of the present state: open or shuttered
}

// Beam returns one beam's view, or nil.
func (v *View) Beam(id closures.BeamID) *BeamView {
	for i := range v.Beams {
		if v.Beams[i].Decision.Beam == id {
			return &v.Beams[i]
		}
	}
	return nil
}

// View returns what was last published. It is never nil.
func (e *Engine) View() *View { return e.view.Load() }

// withheld is a decision that opens, published as shuttered.
func withheld(d *closures.Decision) *closures.Decision {
	w := *d
	w.Open, w.OpensAt = false, time.Time{}
	w.Codes = w.Codes.With(closures.CodeRecord)
	w.Reasons = []closures.Finding{{Code: closures.CodeRecord, Verdict: closures.Violated, Detail: "the opening is not on record yet"}}
	return &w
}

// shuttered is the engine's own word on a beam, without the core's.
func shuttered(r *closures.Rules, id closures.BeamID, seq uint64, at time.Time, code closures.Code, detail string) *closures.Decision {
	return &closures.Decision{
		Seq: seq, Beam: id, At: at, Codes: closures.Codes(0).With(code), Rules: r.Digest,
		Reasons: []closures.Finding{{Code: code, Verdict: closures.Unknown, Margin: closures.UnknownMargin(), Detail: detail}},
	}
}

// publish makes a view of the beams and stores it.
func (e *Engine) publish(wall time.Time, boot time.Duration, seq uint64, beams []BeamView) *View {
	old := e.view.Load()
	v := &View{
		At: wall, Boot: boot, BootID: e.opt.Boot.ID, Number: 1, Seq: seq, Beams: beams, Durable: e.version,
		Rules: e.rules, Foreseen: e.foreseen, Book: e.book, Holds: e.holds, Nights: e.nights, Known: e.known,
		Clock: e.clockSaid, Record: e.condition, Started: e.started, Simulated: e.opt.Simulated,
	}
	for i := range beams {
		b := &beams[i]
		b.Since = wall
		if old != nil {
			v.Number = old.Number + 1
			if o := old.Beam(b.Decision.Beam); o != nil && o.Decision.Open == b.Decision.Open {
				b.Since = o.Since
			}
		}
	}
	e.view.Store(v)
	return v
}

// shutter publishes every beam as shuttered by the engine's own word.
func (e *Engine) shutter(wall time.Time, boot time.Duration, code closures.Code, detail string) *View {
	beams := make([]BeamView, len(e.rules.Beams))
	for i := range beams {
		beams[i].Decision = shuttered(e.rules, e.rules.Beams[i].ID, e.seq, wall, code, detail)
	}
	clear(e.gates)
	return e.publish(wall, boot, e.seq, beams)
}
