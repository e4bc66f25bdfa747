package engine

import (
	"context"
	"fmt"
	"time"

	"beamward/closures"
)

// Result is where a fact stands in the record.
type Result struct {
	Seq uint64
	At  time.Time // of the step that applied it
}

// waiter is one caller of Submit.
type waiter struct {
	durable bool // it also waits for the record
	done    chan outcome
	upTo    uint64 // the entry it waits for; 0: the next that keeps what is durable
	result  Result
}

type outcome struct {
	Result
	err error
}

// tell answers once; a second answer is dropped.
func (w *waiter) tell(r Result, err error) {
	select {
	case w.done <- outcome{r, err}:
	default:
	}
}

// Offer takes a fact in without waiting for it to be applied. It never
// blocks. The error is a *closures.Error: Busy where a lane or the record is
// full or the service stops, Invalid for what no sender may say.
func (e *Engine) Offer(from closures.Source, body closures.Body) (Intake, error) {
	wall, boot := e.opt.Clock.Read()
	return e.in.offer(pending{from: from, body: body, wall: wall, boot: boot})
}

// Submit gives a fact and returns when it is applied and what follows from it
// is published. The error is the core's refusal or intake's, a
// *closures.Error, or that of ctx, after which the fact may still be applied.
func (e *Engine) Submit(ctx context.Context, from closures.Source, body closures.Body) (Result, error) {
	return e.submit(ctx, from, body, false)
}

// SubmitDurable is Submit that returns only when what the fact did is on
// record as well. With an error of ctx it may be in force and not on record.
func (e *Engine) SubmitDurable(ctx context.Context, from closures.Source, body closures.Body) (Result, error) {
	return e.submit(ctx, from, body, true)
}

func (e *Engine) submit(ctx context.Context, from closures.Source, body closures.Body, durable bool) (Result, error) {
	w := &waiter{durable: durable, done: make(chan outcome, 1)}
	wall, boot := e.opt.Clock.Read()
	if _, err := e.in.offer(pending{from: from, body: body, wall: wall, boot: boot, wait: w}); err != nil {
		return Result{}, err
	}
	select {
	case o := <-w.done:
		return o.Result, o.err
	case <-ctx.Done():
		return Result{}, fmt.Errorf("waiting for the decision loop: %w", ctx.Err())
	}
}

// answer settles the waiters of a turn: with the core's refusal, with the
// place in the record, or later, when the record holds it.
func (e *Engine) answer(waits []*waiter, refused []closures.Refused, recorded uint64) {
	for _, w := range waits {
		if err := refusal(refused, w.result.Seq); err != nil {
			w.tell(w.result, err)
			continue
		}
		if !w.durable {
			w.tell(w.result, nil)
			continue
		}
		w.upTo = recorded
		e.waiters = append(e.waiters, w)
	}
}

// refusal returns why fact seq was refused, as an error that is nil when it
// was not.
func refusal(refused []closures.Refused, seq uint64) error {
	for i := range refused {
		if refused[i].Seq == seq && refused[i].Err != nil {
			return refused[i].Err
		}
	}
	return nil
}

// settle answers those whose entry is durable.
func (e *Engine) settle(c Condition) {
	kept := e.waiters[:0]
	for _, w := range e.waiters {
		if w.upTo != 0 && c.Durable >= w.upTo {
			w.tell(w.result, nil)
			continue
		}
		kept = append(kept, w)
	}
	clear(e.waiters[len(kept):])
	e.waiters = kept
}

// dismiss answers everybody who still waits.
func (e *Engine) dismiss(err error) {
	for _, w := range e.waiters {
		w.tell(w.result, err)
	}
	e.waiters = nil
}
