package service

import (
	"context"
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"sync"
	"time"

	"beamward/closures"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/engine"
	"beamward/service/journal"
)

// Options are what a service is made of.
type Options struct {
	Config    *config.Config
	Log       *slog.Logger
	Clock     Clock // nil: the machine's
	Simulated bool  // permits say so and are signed by a throw-away key
	Build     string
	Watchdog  func() // called by the decision loop while all is well; nil: none
}

// Clock is the time that the whole service goes by.
type Clock = clock.Clock

// Addresses are where the service listens, with the ports that were given to
// it.
type Addresses struct {
	API    string
	Permit string
	Feeds  []string // in the configuration's order; empty for those that do not listen
}

// Service is the daemon. Its methods are safe for concurrent use.
type Service struct {
	opt     Options
	log     *slog.Logger
	clock   Clock
	boot    closures.Boot
	journal *journal.Journal
	record  *record
	engine  *engine.Engine
	parts   parts

	mu  sync.Mutex
	cfg *config.Config
}

// New opens the record, restores what must outlive a restart and binds every
// listener. Nothing runs yet: until Run, and after it, every beam is
// shuttered. What it opened is given back by Close.
func New(ctx context.Context, opt Options) (_ *Service, err error) {
	if opt.Config == nil {
		return nil, errors.New("making the service: no configuration is given")
	}
	s := &Service{opt: opt, cfg: opt.Config, log: opt.Log, clock: opt.Clock}
	if s.log == nil {
		s.log = slog.New(slog.DiscardHandler)
	}
	rules := opt.Config.Rules
	if s.clock == nil {
		if s.clock, err = clock.NewReal(rules.Clock.StepLimit); err != nil {
			return nil, fmt.Errorf("making the service: %w", err)
		}
	}
	defer func() {
		if err != nil {
			_ = s.Close()
		}
	}()
	s.boot = closures.Boot{ID: bootID(), At: s.clock.Wall()}
	if err := s.openRecord(ctx); err != nil {
		return nil, err
	}
	if err := s.bind(); err != nil {
		return nil, err
	}
	s.parts.run("second opinion", s.secondOpinion)
	return s, nil
}

// bootID names one start: 96 random bits.
func bootID() string {
	var b [12]byte
	_, _ = rand.Read(b[:]) // never fails: crypto/rand ends the program instead
	return hex.EncodeToString(b[:])
}

// openRecord opens the record and makes the engine from what it holds. A
// record that is damaged, or whose newest entries cannot be understood, does
// not stop the start: the service starts shuttered and says so.
func (s *Service) openRecord(ctx context.Context) error {
	rules := s.cfg.Rules
	j, err := journal.Open(journal.Options{Dir: s.cfg.DataDir, Clock: s.clock})
	if err != nil {
		return err
	}
	s.journal = j
	s.record = &record{Journal: j}
	if cut := j.Cut(); cut != nil {
		s.record.cut = true
		s.log.Error("the record lost its end", "what", cut.String(), "mend", "look at what people were told before the crash, place the holds again, then restart")
	}
	limited, cancel := context.WithTimeout(ctx, startLimit)
	defer cancel()
	kept, err := recall(limited, j, rules, resolver(limited, j.Reader, rules))
	if err != nil {
		s.record.cut = true
		s.log.Error("what must outlive a restart cannot be read from the record", "err", err, "mend", "every beam stays shuttered: verify the record, restore a backup or start with an empty data_dir and bring lists and holds again")
		if last, any, lastErr := j.Last(limited); lastErr == nil && any {
			kept.after = last.Seq
		}
		kept.durable = closures.Durable{}
	}
	if err := j.PutList(rules.Digest.String(), s.cfg.Canonical()); err != nil {
		return fmt.Errorf("recording the configuration: %w", err)
	}
	if damage := j.State().Damage; damage != nil {
		s.log.Error("the record is damaged", "err", damage)
	}
	s.engine, err = engine.New(engine.Options{
		Clock: s.clock, Health: s.health, Reanchor: func() { s.clock.Reanchor() },
		Record: s.record, Rules: rules, Boot: s.boot, Durable: kept.durable, After: kept.after,
		Build: s.opt.Build, Watchdog: s.opt.Watchdog, Simulated: s.opt.Simulated,
		Report: func(err error) { s.log.Error("the engine reports", "err", err) },
	})
	return err
}

// health is the clock's word of itself, as the engine asks for it.
func (s *Service) health() engine.ClockReport {
	k := s.clock.State()
	r := engine.ClockReport{Step: k.Step, Suspended: k.Suspended != 0, Synchronised: k.Known && k.Synchronised, MaxErrorSaid: k.Known, MaxError: k.MaxError}
	r.Fault = k.Fault
	return r
}

// Run runs every part until ctx ends or one of them cannot go on. Then the
// engine shutters every beam and puts that on record, and the rest ends.
func (s *Service) Run(ctx context.Context) error {
	outer, stop := context.WithCancelCause(ctx)
	defer stop(nil)
	// The record outlives the engine, which writes its end to it.
	recordCtx, recordStop := context.WithCancel(context.WithoutCancel(ctx))
	var ends, shell sync.WaitGroup
	var recordErr error
	ends.Go(func() {
		recordErr = s.journal.Run(recordCtx)
	})
	for _, p := range s.parts.running {
		shell.Go(func() {
			if err := p.run(outer); err != nil && outer.Err() == nil {
				stop(fmt.Errorf("%s: %w", p.name, err))
			}
		})
	}
	err := s.engine.Run(outer)
	stop(err)
	shell.Wait()
	recordStop()
	ends.Wait()
	if cause := context.Cause(outer); err == nil && cause != nil && !errors.Is(cause, context.Canceled) && ctx.Err() == nil {
		err = cause
	}
	return errors.Join(err, recordErr)
}

// Close gives back what New took. It is called once, after Run.
func (s *Service) Close() error {
	var errs []error
	for _, c := range s.parts.closing {
		errs = append(errs, c())
	}
	if s.journal != nil {
		errs = append(errs, s.journal.Close())
	}
	return errors.Join(errs...)
}

// Engine is the engine, for the demo and the simulator.
func (s *Service) Engine() *engine.Engine { return s.engine }

// CaughtUp reports whether the service has done what the clock asks of it so
// far: it has decided at the present instant, within a decision interval, and
// nothing has waited for the store longer than a block may. Whoever steps a
// virtual clock waits for it, since virtual time can outrun a real disk.
func (s *Service) CaughtUp() bool {
	v := s.engine.View()
	return s.clock.Boot()-v.Boot <= v.Rules.Permit.DecisionInterval && s.journal.State().Behind <= followLimit
}

// Addresses tells where the service listens.
func (s *Service) Addresses() Addresses { return s.parts.addresses }

// parts are what runs beside the engine and the record.
type parts struct {
	running   []part
	closing   []func() error
	addresses Addresses
}

type part struct {
	name string
	run  func(ctx context.Context) error
}

// run adds what Run will run until its context ends.
func (p *parts) run(name string, f func(ctx context.Context) error) {
	p.running = append(p.running, part{name, f})
}

// listen binds one address; its listener is closed with the service.
func (p *parts) listen(network, address string) (net.Listener, error) {
	l, err := net.Listen(network, address)
	if err != nil {
		return nil, fmt.Errorf("listening at %s: %w: choose another address, or end what listens there", address, err)
	}
	p.closing = append(p.closing, func() error {
		if err := l.Close(); err != nil && !errors.Is(err, net.ErrClosed) {
			return err
		}
		return nil
	})
	return l, nil
}

// drain is how long a listener waits for requests to end.
const drain = 2 * time.Second

// followLimit is twice the age at which a block is written.
const followLimit = 200 * time.Millisecond
