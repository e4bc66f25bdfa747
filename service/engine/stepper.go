package engine

import (
	"beamward/closures"
)

// Stepper drives an engine without a goroutine, in the caller's time: the same
// turns as Run, one a call. It is for simulators and tests, and has one owner.
type Stepper struct{ e *Engine }

// mostTurns bounds what one Turn makes of turns that ask for another.
const mostTurns = 1000

// Stepper takes the place of Run.
func (e *Engine) Stepper() (*Stepper, error) {
	if !e.owned.CompareAndSwap(false, true) {
		return nil, errOwned
	}
	return &Stepper{e}, nil
}

// Turn makes a turn, and those that have to follow it at once, and returns
// what is published then. After an error the engine is at its end.
func (s *Stepper) Turn() (*View, error) {
	for range mostTurns {
		again, err := s.e.turn()
		if err != nil {
			err = s.e.giveUp(err)
			return s.e.View(), err
		}
		if !again {
			break
		}
	}
	return s.e.View(), nil
}

// Submit gives one fact, makes a turn and returns what became of it. It does
// not wait for the record.
func (s *Stepper) Submit(from closures.Source, body closures.Body) (Result, error) {
	w := &waiter{done: make(chan outcome, 1)}
	wall, boot := s.e.opt.Clock.Read()
	if _, err := s.e.in.offer(pending{from: from, body: body, wall: wall, boot: boot, wait: w}); err != nil {
		return Result{}, err
	}
	if _, err := s.Turn(); err != nil {
		return Result{}, err
	}
	select {
	case o := <-w.done:
		return o.Result, o.err
	default:
		return Result{}, errUnsure
	}
}

// Close stops in good order, as Run does.
func (s *Stepper) Close() error { return s.e.stop() }
