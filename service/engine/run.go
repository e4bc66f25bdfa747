package engine

import (
	"context"
	"errors"
	"sync"
	"time"

	"beamward/closures"
)

// How long facts are gathered for one batch: as long as a turn takes, within
// these bounds.
const (
	leastWindow = time.Millisecond
	mostWindow  = 100 * time.Millisecond
)

// flushTime bounds the wait for the store at the end.
const flushTime = 10 * time.Second

var errOwned = errors.New("running the engine: it runs already")

// Run decides until ctx ends. Then it applies what was taken in, publishes
// every beam as shuttered and waits for the record. It returns nil after a
// stop in good order, and an error where it had to give up; every beam is
// shuttered either way.
func (e *Engine) Run(ctx context.Context) error {
	if !e.owned.CompareAndSwap(false, true) {
		return errOwned
	}
	news := make(chan struct{}, 1)
	stopNews := e.opt.Record.Notify(news)
	defer stopNews()

	orders := make(chan order, 16)
	e.nights0.queue = orders
	var worker sync.WaitGroup
	worker.Go(func() {
		for o := range orders {
			e.makeNight(o)
		}
	})
	defer worker.Wait()
	defer close(orders)

	for {
		again, err := e.turn()
		switch {
		case err != nil:
			return e.giveUp(err)
		case ctx.Err() != nil:
			return e.stop()
		case again:
			continue
		}
		e.await(ctx, news)
	}
}

// await returns when the next turn is due: facts wait and were gathered for
// their time, a person's word came, the record has news that matter, a night
// is ready, or the decision interval is over.
func (e *Engine) await(ctx context.Context, record <-chan struct{}) {
	due := make(chan struct{}, 1)
	_, now := e.opt.Clock.Read()
	left := e.boot + e.rules.Permit.DecisionInterval - now
	if left <= 0 {
		return
	}
	stop := e.opt.Clock.AfterFunc(left, func() { poke(due) })
	defer stop()
	for {
		select {
		case <-ctx.Done():
		case <-due:
		case <-e.in.urgent:
		case <-e.ripe:
		case <-record:
			if !e.minds() {
				continue
			}
		case <-e.in.news:
			e.gather(ctx, due)
		}
		return
	}
}

// gather waits for more facts to join the batch.
func (e *Engine) gather(ctx context.Context, due <-chan struct{}) {
	full := make(chan struct{}, 1)
	stop := e.opt.Clock.AfterFunc(min(max(e.cost, leastWindow), mostWindow), func() { poke(full) })
	defer stop()
	select {
	case <-ctx.Done():
	case <-due:
	case <-full:
	case <-e.in.urgent:
	}
}

// minds reports whether the record's news ask for a turn: an opening that is
// durable now, or a change of health. It answers who waits for the record.
func (e *Engine) minds() bool {
	c := e.opt.Record.Condition()
	e.settle(c)
	for i := range e.gates {
		if g := &e.gates[i]; !g.granted && g.opening != 0 && c.Durable >= g.opening {
			return true
		}
	}
	return c.troubled() != e.condition.troubled()
}

// stop ends in good order.
func (e *Engine) stop() error {
	e.in.close()
	e.stopping = true
	for {
		again, err := e.turn()
		if err != nil {
			return e.giveUp(err)
		}
		if !again {
			break
		}
	}
	v := *e.view.Load()
	v.Number++
	v.Stopped = true
	e.view.Store(&v)
	err := e.opt.Record.Append(e.entry(nil, e.at, Ended{}))

	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	stop := e.opt.Clock.AfterFunc(flushTime, cancel)
	defer stop()
	err = errors.Join(err, e.opt.Record.Flush(ctx))
	e.end()
	return err
}

// giveUp ends after a fault. The view is shuttered already.
func (e *Engine) giveUp(err error) error {
	e.in.close()
	v := *e.view.Load()
	v.Number++
	v.Stopped = true
	e.view.Store(&v)
	e.end()
	return err
}

// end lets go of everybody who waits.
func (e *Engine) end() {
	e.settle(e.opt.Record.Condition())
	b := e.in.take(e.boot, true)
	for _, lane := range [...][]pending{e.carried, e.deferred, b.people, b.devices, b.latest} {
		for i := range lane {
			if w := lane[i].wait; w != nil {
				w.tell(Result{}, errStopping)
			}
		}
	}
	for _, w := range e.waits { // of a turn that did not come to its end
		w.tell(w.result, errUnsure)
	}
	e.dismiss(errUnsure)
	before := e.view.Load()
	e.watchers.tell(Update{View: before, Beams: beamsOf(before)})
	e.watchers.end()
}

var errUnsure = closures.Errorf(closures.Busy, "look whether it is in force when the service is back", "the service stopped before this was on record")

func beamsOf(v *View) []closures.BeamID {
	out := make([]closures.BeamID, len(v.Beams))
	for i := range v.Beams {
		out[i] = v.Beams[i].Decision.Beam
	}
	return out
}
