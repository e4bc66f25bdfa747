package engine

import (
	"fmt"
	"time"

	"beamward/closures"
)

// take makes a new state the engine's: it is told everything anew, and what
// was granted is not.
func (e *Engine) take(s *closures.State, cause string) {
	e.state = s
	e.kept, e.version = s.Durable()
	e.known, e.knownAt = s.Known(e.at), e.boot
	e.rules, e.foreseen, e.book, e.holds = s.Rules(), s.Foreseen(), s.Book(), s.Holds()
	e.in.setRules(e.rules)
	e.gates = make([]gate, len(e.rules.Beams))
	e.recorded = make([]closures.Decision, len(e.rules.Beams))
	e.begun = &Begun{Boot: closures.Boot{ID: e.opt.Boot.ID, At: e.at}, Build: e.opt.Build, Rules: e.rules, Cause: cause}
	e.tellAnew, e.torn = true, false
	e.own = e.own[:0]
	for _, n := range e.nights {
		e.own = append(e.own, closures.NightReady{Night: n})
	}
	e.own = append(e.own, closures.Started{})
}

// anew builds the state from what was kept, as a restart would.
func (e *Engine) anew(cause string) error {
	s, err := closures.New(e.rules, closures.Boot{ID: e.opt.Boot.ID, At: e.at}, e.kept)
	if err != nil {
		return err
	}
	e.take(s, cause)
	return nil
}

// renew is anew for a state that is sound: what is durable is as of now, the
// tracks included.
func (e *Engine) renew(cause string) error {
	e.kept, e.version = e.state.Durable()
	return e.anew(cause)
}

// afterPanic shutters, records what came before, and builds the state anew; a
// second panic in a row is the end.
func (e *Engine) afterPanic(caught error, entries []Entry, b *batch, wall time.Time, boot time.Duration) (again bool, err error) {
	e.panics++
	e.stats.panics.Add(1)
	before := e.view.Load()
	v := e.shutter(wall, boot, closures.CodeFault, "the decision failed")
	e.announce(before, v)
	e.opt.Report(caught)
	if len(entries) > 0 {
		_ = e.opt.Record.Append(entries) // the record begins anew whether it holds these or not
	}
	if e.panics > 1 {
		return false, fmt.Errorf("twice in a row: %w", caught)
	}
	// What people and devices said is given again; what comes again by itself
	// is not, for it may be the cause.
	e.carried = append(append(append([]pending(nil), e.carried...), b.people...), b.devices...)
	e.kept.Tracks = e.lastTracks()
	if err := e.anew("a decision failed"); err != nil {
		return false, err
	}
	e.own = append(e.own, closures.Fault{Beam: closures.EveryBeam, Detail: "a decision failed"})
	e.in.giveBack(b)
	return true, nil
}

// lastTracks returns the tracks of a state whose step did not come to its end:
// they are read only, and what the step left out comes again. Where they cannot
// be read they are those that were kept last.
func (e *Engine) lastTracks() (tracks []closures.DurableTrack) {
	defer func() {
		if recover() != nil {
			tracks = e.kept.Tracks
		}
	}()
	d, _ := e.state.Durable()
	return d.Tracks
}
