package replay

import (
	"fmt"
	"runtime/debug"
	"slices"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// event is what an entry was to the player.
type event uint8

const (
	skipped   event = iota // it belongs to no run that can be replayed
	started                // a run begins; what it starts from is to come
	restored               // the state is made
	gathered               // a fact joins the batch
	stepped                // a tick: the batch was applied and the beams decided
	decided                // a decision on record
	published              // an opening was granted
	summed                 // a tally
	kept                   // what a restart would need, as of here
	ended                  // the run ended in good order
	beside                 // it changes no decision
	lost                   // entries were lost: nothing is known until the next run
	missing                // entries are not there that should be: likewise
	failed                 // the core panicked: likewise
)

// player turns entries into the state that they tell of. It has one owner and
// sees entries in order.
type player struct {
	shelf *shelf
	other []string // kinds that change no decision
	run   Run
	state *closures.State // nil: outside a run
	begun *Run            // waits for the entry that it starts from
	last  uint64          // newest entry seen
	batch []closures.Fact
	step  closures.Fact       // the newest tick; its number is zero before the first of a run
	facts []closures.Fact     // what the newest step applied; its tick is the last
	out   []closures.Decision // of the newest step
	from  uint64              // of missing: the first that is not there
	cause string              // of failed
}

// take takes in one entry. An error means that it cannot be understood, after
// which the player is of no more use.
func (p *player) take(e *journal.Entry) (event, error) {
	before := p.last
	p.last = e.Seq
	switch {
	case e.Kind == KindBegun:
		return p.begin(e)
	case e.Kind == journal.KindGap:
		p.leave()
		return lost, nil
	case p.state == nil && p.begun == nil:
		return skipped, nil
	case e.Seq != before+1, p.begun != nil && e.Kind != journal.KindDurable:
		p.from = before + 1
		p.leave()
		return missing, nil
	case p.begun != nil:
		return p.restore(e)
	}
	switch e.Kind {
	case wire.KindDecision:
		return decided, nil
	case KindGranted:
		return published, nil
	case KindTallied:
		return summed, nil
	case journal.KindDurable:
		p.shelf.keep(p.state.Book())
		return kept, nil
	case KindEnded:
		return ended, nil
	}
	if slices.Contains(p.other, e.Kind) {
		return beside, nil
	}
	return p.fact(e)
}

// leave ends the run: what it knew is gone.
func (p *player) leave() {
	p.state, p.begun, p.batch, p.step = nil, nil, nil, closures.Fact{}
}

// waiting is how many facts were never applied.
func (p *player) waiting() int { return len(p.batch) }

func (p *player) begin(e *journal.Entry) (event, error) {
	b, err := form[begun](e)
	if err != nil {
		return skipped, err
	}
	r, err := b.run(e)
	if err != nil {
		return skipped, err
	}
	p.leave()
	p.begun = &r
	return started, nil
}

// restore makes the state from the entry after a run's first.
func (p *player) restore(e *journal.Entry) (event, error) {
	d, err := wire.DecodeDurable(e.Body, p.shelf.resolver())
	if err != nil {
		return skipped, unread(e, err)
	}
	rules, err := p.shelf.theRules(p.begun.Rules)
	if err != nil {
		return skipped, fmt.Errorf("reading entry %d, kind %s: %w", p.begun.Seq, KindBegun, err)
	}
	if err := p.start(*p.begun, rules, d); err != nil {
		return skipped, err
	}
	return restored, nil
}

// start makes the state that a run goes on from.
func (p *player) start(run Run, rules *closures.Rules, d closures.Durable) error {
	s, err := closures.New(rules, closures.Boot{ID: run.BootID, At: run.At}, d)
	if err != nil {
		return fmt.Errorf("beginning the run of entry %d: %w", run.Seq, err)
	}
	p.leave()
	p.run, p.state, p.shelf.force = run, s, rules
	return nil
}

func (p *player) fact(e *journal.Entry) (event, error) {
	f, err := wire.DecodeBody(e.Kind, e.Body, p.shelf.resolver())
	if err != nil {
		return skipped, fmt.Errorf("reading entry %d: %w", e.Seq, err)
	}
	f.Seq, f.At = e.Seq, e.At
	p.batch = append(p.batch, f)
	if _, tick := f.Body.(closures.Tick); !tick {
		return gathered, nil
	}
	return p.apply(f), nil
}

// apply makes the step that a tick asks for.
func (p *player) apply(tick closures.Fact) (done event) {
	defer func() {
		if caught := recover(); caught != nil {
			p.cause = fmt.Sprintf("%v\n%s", caught, debug.Stack())
			p.leave()
			done = failed
		}
	}()
	p.facts, p.batch = p.batch, p.facts[:0]
	p.step = tick
	p.out = p.state.Step(p.facts, tick.At, p.out[:0])
	p.shelf.force = p.state.Rules()
	return stepped
}

// decision is the newest step's decision on a beam, or nil.
func (p *player) decision(id closures.BeamID) *closures.Decision {
	for i := range p.out {
		if p.out[i].Beam == id {
			return &p.out[i]
		}
	}
	return nil
}
