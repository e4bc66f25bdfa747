package engine

import (
	"fmt"
	"runtime/debug"
	"time"

	"beamward/closures"
)

// turn makes one turn; again asks for the next without waiting. An error ends
// the engine; every beam is shuttered then.
func (e *Engine) turn() (again bool, err error) {
	defer func() {
		if caught := recover(); caught != nil {
			wall, boot := e.opt.Clock.Read()
			e.shutter(wall, boot, closures.CodeFault, "the decision loop failed")
			err = fmt.Errorf("the decision loop failed: %v\n%s", caught, debug.Stack())
		}
	}()
	wall, boot := e.opt.Clock.Read()
	if wall.Before(e.at) {
		// Ages count from instants that lie ahead now: nothing known is fresh.
		e.at = wall
		e.shutter(wall, boot, closures.CodeClock, "the clock went back")
		if err := e.renew("the clock went back"); err != nil {
			return false, err
		}
	}
	e.at, e.boot = wall, boot
	cause := ""
	switch {
	case e.moved:
		// Tracks and nights belong to the old place.
		cause, e.moved, e.nights = "the site's place was set anew", false, nil
	case e.torn && !e.opt.Record.Condition().Gap:
		// What was lost cannot be replayed: the record begins anew.
		cause = "entries of the record were lost"
	}
	if cause != "" {
		if err := e.renew(cause); err != nil {
			return false, err
		}
	}
	e.nightsWanted(wall)

	entries := e.beginEntries()
	own := e.ownFacts(boot)
	batch := e.in.take(boot, len(e.deferred) == 0)
	e.part(&batch)
	e.number(own, &batch, wall, boot)
	tick := e.seq
	again, err, failed := e.decide(entries, &batch, wall, boot, tick)
	if failed {
		return again, err
	}
	_, after := e.opt.Clock.Read()
	e.cost = max(after-boot, 0)
	e.in.giveBack(&batch)
	if e.opt.Watchdog != nil && !e.lost {
		e.opt.Watchdog()
	}
	return again || batch.more, nil
}

// number makes facts of the batch: the engine's own, people's, devices', the
// newest of each subject, and the tick that ends it.
func (e *Engine) number(own []closures.Body, b *batch, wall time.Time, boot time.Duration) {
	e.facts, e.waits = e.facts[:0], e.waits[:0]
	for _, body := range own {
		e.seq++
		e.facts = append(e.facts, closures.Fact{Seq: e.seq, At: wall, Body: body})
	}
	for _, lane := range [...][]pending{e.carried, b.people, b.devices, b.latest} {
		for i := range lane {
			p := &lane[i]
			if p.gone {
				continue
			}
			// Arrived just after the clock was read, or before it went back.
			at := p.wall
			if at.After(wall) {
				at = wall
			}
			if saidBy(p.body).After(wall.Add(MaxAhead)) {
				e.stats.refused[p.kind].Add(1)
				if p.wait != nil {
					p.wait.tell(Result{}, errAhead)
				}
				continue
			}
			e.seq++
			e.facts = append(e.facts, closures.Fact{Seq: e.seq, At: at, From: p.from, Body: p.body})
			e.stats.lag.observe(boot - p.boot)
			if p.wait != nil {
				p.wait.result = Result{Seq: e.seq, At: wall}
				e.waits = append(e.waits, p.wait)
			}
		}
	}
	e.seq++
	e.facts = append(e.facts, closures.Fact{Seq: e.seq, At: wall, Body: closures.Tick{}})
}

// decide steps the state and does the duties that follow, in their order.
func (e *Engine) decide(entries []Entry, b *batch, wall time.Time, boot time.Duration, tick uint64) (again bool, err error, failed bool) {
	out, caught := e.step(wall, boot)
	for i := range e.facts {
		if caught != nil && i == len(e.facts)-1 {
			e.seq-- // no tick: the batch was not applied
			break
		}
		entries = append(entries, Entry{Seq: e.facts[i].Seq, At: e.facts[i].At, What: Admitted{e.facts[i]}})
	}
	if caught != nil {
		again, err = e.afterPanic(caught, entries, b, wall, boot)
		return again, err, true
	}
	e.panics, e.carried, e.tellAnew = 0, nil, false
	e.refresh()

	before := e.view.Load()
	e.started = true
	beams := make([]BeamView, len(out))
	urgent := len(b.people) > 0
	for i := range out {
		d := &out[i]
		view, record, granted := e.gates[i].pass(d, e.condition)
		beams[i] = view
		if record || differs(&e.recorded[i], d) || e.recorded[i].Beam == "" {
			entries = e.entry(entries, wall, Decided{*d})
			e.recorded[i] = *d
			if record {
				e.gates[i].opening, urgent = e.seq, true
			}
		}
		if granted {
			entries = e.entry(entries, wall, Granted{Beam: d.Beam, Opening: e.gates[i].opening, Seq: d.Seq})
		}
		e.tally.add(d)
	}
	if over := e.overruled(); over != "" {
		for i := range beams {
			beams[i] = BeamView{Decision: shuttered(e.rules, out[i].Beam, tick, wall, closures.CodeStarting, over)}
		}
		clear(e.gates)
	}
	v := e.publish(wall, boot, tick, beams)

	entries = e.closing(entries, wall, boot)
	for _, w := range e.waits {
		urgent = urgent || w.durable
	}
	v = e.record(entries, urgent, v)
	e.announce(before, v)
	if e.reanchor && e.opt.Reanchor != nil {
		e.opt.Reanchor() // the step is told: the next turn may lie anywhere
	}
	return e.moved, nil, false
}

// overruled says why every beam is published as shuttered whatever was
// decided; empty when it is not.
func (e *Engine) overruled() string {
	switch {
	case e.stopping:
		return "the service is stopping"
	case e.moved:
		return "the site's place was set anew"
	}
	return ""
}

// step runs the core and catches its panic.
func (e *Engine) step(wall time.Time, boot time.Duration) (out []closures.Decision, caught error) {
	defer func() {
		if r := recover(); r != nil {
			caught = fmt.Errorf("deciding facts %d to %d: %v\n%s", e.facts[0].Seq, e.seq, r, debug.Stack())
		}
	}()
	if e.beforeStep != nil {
		e.beforeStep()
	}
	out = e.state.Step(e.facts, wall, make([]closures.Decision, 0, len(e.rules.Beams)))
	_, after := e.opt.Clock.Read()
	e.stats.turn(len(e.facts), after-boot)
	for _, r := range e.state.Refused() {
		e.stats.refused[e.kindOfSeq(r.Seq)].Add(1)
	}
	return out, nil
}

// kindOfSeq finds the kind of a fact of this turn.
func (e *Engine) kindOfSeq(seq uint64) kind {
	for i := range e.facts {
		if e.facts[i].Seq == seq {
			return kindOf(e.facts[i].Body)
		}
	}
	return kindNone
}

// refresh takes up what the step changed of what the view carries.
func (e *Engine) refresh() {
	e.foreseen = e.state.Foreseen()
	if r := e.state.Rules(); r != e.rules {
		e.newRules(r)
	}
	for i := range e.facts {
		if _, ok := e.facts[i].Body.(closures.NightReady); ok {
			e.nights = e.state.Nights()
			break
		}
	}
	changed := e.state.DurableVersion() != e.version
	if changed || e.boot-e.knownAt >= viewEvery {
		e.known, e.knownAt = e.state.Known(e.at), e.boot
	}
	if !changed {
		return
	}
	e.kept, e.version = e.state.Durable()
	e.book, e.holds = e.state.Book(), e.state.Holds()
	e.keptDue = true
}

// newRules moves what is known of each beam to its place in new rules.
func (e *Engine) newRules(r *closures.Rules) {
	gates, recorded := make([]gate, len(r.Beams)), make([]closures.Decision, len(r.Beams))
	for i := range r.Beams {
		for j := range e.rules.Beams {
			if e.rules.Beams[j].ID == r.Beams[i].ID {
				gates[i], recorded[i] = e.gates[j], e.recorded[j]
			}
		}
	}
	was := e.rules.Site
	e.moved = r.Site.Position != was.Position || r.Site.UT1 != was.UT1
	e.rules, e.gates, e.recorded = r, gates, recorded
	e.in.setRules(r)
	e.nights0.forget()
}
