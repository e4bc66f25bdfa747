package send

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"slices"
	"sync"
	"time"

	"beamward/alerts"
)

// Receiver takes messages. An error of type *Refused is for good; after any
// other the message is sent again.
type Receiver interface {
	Send(ctx context.Context, m *alerts.Message) error
}

// Options are what a Pump is made from. Outbox, Receivers and Now are needed.
type Options struct {
	Outbox    alerts.Outbox
	Receivers map[string]Receiver // by the names that routes use
	Now       func() time.Time
	Poll      time.Duration                    // how often the outbox is looked into without being woken; 0: 1 s
	Report    func(receiver string, err error) // told of the first of a run of failures, and of refusals; nil: nobody
}

// Pump brings deliveries from the outbox to their receivers, each receiver by
// itself so that none waits for another.
type Pump struct {
	opt   Options
	wakes map[string]chan struct{}

	mu      sync.Mutex
	failing map[string]time.Time
}

const (
	mostARound = 50
	mostPause  = time.Minute // between attempts at a receiver that fails
	attempt    = time.Minute // the longest that any receiver may take
)

// New makes a pump.
func New(o Options) (*Pump, error) {
	if o.Outbox == nil || o.Now == nil {
		return nil, errors.New("making the pump of messages: an outbox and a clock are needed")
	}
	if o.Poll <= 0 {
		o.Poll = time.Second
	}
	if o.Report == nil {
		o.Report = func(string, error) {}
	}
	p := &Pump{opt: o, wakes: map[string]chan struct{}{}, failing: map[string]time.Time{}}
	for name, r := range o.Receivers {
		if r == nil {
			return nil, fmt.Errorf("making the pump of messages: receiver %.64q is none", name)
		}
		p.wakes[name] = make(chan struct{}, 1) // one wake is as good as many
	}
	return p, nil
}

// Run delivers until ctx ends, and returns when every attempt is over.
func (p *Pump) Run(ctx context.Context) error {
	var all sync.WaitGroup
	for name, r := range p.opt.Receivers {
		all.Go(func() { p.serve(ctx, name, r) })
	}
	all.Wait()
	return nil
}

// Wake says that something was put into the outbox.
func (p *Pump) Wake() {
	for _, c := range p.wakes {
		select {
		case c <- struct{}{}:
		default:
		}
	}
}

// Failing tells of every receiver, since when it cannot be reached, in order of
// their names: for the observation.
func (p *Pump) Failing() []alerts.Receiver {
	p.mu.Lock()
	defer p.mu.Unlock()
	var out []alerts.Receiver
	for name := range p.opt.Receivers {
		out = append(out, alerts.Receiver{Name: name, FailingSince: p.failing[name]})
	}
	slices.SortFunc(out, func(a, b alerts.Receiver) int { return cmp.Compare(a.Name, b.Name) })
	return out
}

// How a receiver does, and what of its deliveries is taken for a round.
type health uint8

const (
	well       health = iota // what is due, the oldest first
	failing                  // one alone, to see whether it is back
	recovering               // all that waits, whenever it is due
)

func (p *Pump) serve(ctx context.Context, name string, r Receiver) {
	timer := time.NewTimer(0)
	defer timer.Stop()
	state, failures := well, 0
	for {
		select {
		case <-ctx.Done():
			return
		case <-timer.C:
		case <-p.wakes[name]:
			if state == failing {
				continue // it waits for its pause to end
			}
		}
		sent, failed := p.round(ctx, name, r, state)
		switch {
		case failed:
			state, failures = failing, failures+1
			timer.Reset(min(p.opt.Poll<<min(failures, 10), mostPause))
			continue
		case sent > 0 && state != well:
			state = recovering
		default:
			state = well
		}
		failures = 0
		if sent > 0 {
			timer.Reset(0)
		} else {
			timer.Reset(p.opt.Poll)
		}
	}
}

// take returns the deliveries of a round. Where all that waits is taken, what
// failed most comes last, so that one message that a receiver cannot stand does
// not keep the others from it.
func (p *Pump) take(name string, at time.Time, state health) ([]alerts.Delivery, error) {
	if state == well {
		return p.opt.Outbox.Due(name, at, mostARound)
	}
	due, err := p.opt.Outbox.Due(name, at.Add(2*alerts.SlowRetry), alerts.MostWaiting)
	slices.SortStableFunc(due, func(a, b alerts.Delivery) int { return a.Next.Compare(b.Next) })
	if state == failing {
		return due[:min(len(due), 1)], err
	}
	return due[:min(len(due), mostARound)], err
}

// round sends to one receiver until one attempt fails.
func (p *Pump) round(ctx context.Context, name string, r Receiver, state health) (sent int, failed bool) {
	at := p.opt.Now()
	due, err := p.take(name, at, state)
	if err != nil {
		p.opt.Report(name, fmt.Errorf("looking into the outbox: %w", err))
		return 0, true
	}
	for _, d := range due {
		if ctx.Err() != nil {
			return sent, false
		}
		next, failed := p.one(ctx, r, d)
		if ctx.Err() != nil && next.Status == alerts.Waiting {
			return sent, false // interrupted, not refused: the next start sends it again
		}
		if err := p.opt.Outbox.Settle(next); err != nil {
			p.opt.Report(name, fmt.Errorf("settling in the outbox: %w", err))
			return sent, true
		}
		switch {
		case failed:
			p.fails(name, at, next.Why)
			return sent, true
		case next.Status == alerts.Dead:
			p.opt.Report(name, errors.New(next.Why))
		}
		p.works(name)
		sent++
	}
	return sent, false
}

// one makes one attempt; failed says that the receiver, and not the message,
// is at fault.
func (p *Pump) one(ctx context.Context, r Receiver, d alerts.Delivery) (next alerts.Delivery, failed bool) {
	if d.Stale(p.opt.Now()) {
		d.Status = alerts.Expired
		return d, false
	}
	ctx, cancel := context.WithTimeout(ctx, attempt)
	defer cancel()
	err := r.Send(ctx, &d.Message)
	if err == nil {
		return d.Sent(), false
	}
	var refused *Refused
	final := errors.As(err, &refused)
	return d.Failed(p.opt.Now(), err.Error(), final), !final
}

func (p *Pump) works(name string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	delete(p.failing, name)
}

func (p *Pump) fails(name string, at time.Time, why string) {
	p.mu.Lock()
	first := p.failing[name].IsZero()
	if first {
		p.failing[name] = at
	}
	p.mu.Unlock()
	if first {
		p.opt.Report(name, errors.New(why))
	}
}
