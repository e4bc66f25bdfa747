package simulate

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/engine"
	"beamward/service/journal"
	"beamward/service/permit"
)

// daemon is one life of the process: the real parts, joined as the service
// joins them, driven by its owner.
type daemon struct {
	clock   *clock.Virtual
	journal *journal.Journal
	engine  *engine.Engine
	stepper *engine.Stepper
	issuer  *permit.Issuer
	killed  bool
}

var errKilled = errors.New("the process was killed")

// boot opens the record in dir and starts from it. A daemon that forgets is
// broken on purpose.
func boot(ctx context.Context, dir string, c *clock.Virtual, cfg *config.Config, id, build string, forgets bool) (d *daemon, err error) {
	d = &daemon{clock: c}
	d.journal, err = journal.Open(journal.Options{Dir: dir, Clock: c, Fault: func(op string) error {
		if d.killed && op != "read" {
			return errKilled
		}
		return nil
	}})
	if err != nil {
		return nil, err
	}
	defer func() {
		if err != nil {
			err = errors.Join(fmt.Errorf("starting %s: %w", id, err), d.journal.Close())
		}
	}()
	if err := d.journal.PutList(cfg.Rules.Digest.String(), cfg.Canonical()); err != nil {
		return nil, err
	}
	durable, after, err := recall(ctx, d.journal, cfg.Rules)
	if err != nil {
		return nil, err
	}
	if forgets {
		durable.Holds, durable.Sightings = nil, nil
	}
	d.engine, err = engine.New(engine.Options{
		Clock: c, Health: d.health, Reanchor: func() { c.Reanchor() }, Record: record{d.journal}, Rules: cfg.Rules,
		Boot: closures.Boot{ID: id, At: c.Wall()}, Durable: durable, After: after, Build: build, Simulated: true,
	})
	if err != nil {
		return nil, err
	}
	if d.stepper, err = d.engine.Stepper(); err != nil {
		return nil, err
	}
	key, err := permit.ThrowAway()
	if err != nil {
		return nil, err
	}
	d.issuer, err = permit.New(sights{d.engine}, c, key, true)
	return d, err
}

// health is the clock's word of itself.
func (d *daemon) health() engine.ClockReport {
	k := d.clock.State()
	return engine.ClockReport{
		Step: k.Step, Suspended: k.Suspended != 0, Synchronised: k.Known && k.Synchronised, MaxErrorSaid: k.Known, MaxError: k.MaxError, Fault: k.Fault,
	}
}

// turn decides; an opening is put on record and granted at once, if it is
// still clear then.
func (d *daemon) turn(ctx context.Context) (*engine.View, error) {
	v, err := d.stepper.Turn()
	if err != nil {
		return v, err
	}
	for i := range v.Beams {
		if v.Beams[i].Opening {
			if err := d.journal.Flush(ctx); err != nil {
				return v, err
			}
			return d.stepper.Turn()
		}
	}
	return v, nil
}

// tell gives one fact and returns when it is applied and, where durable, on
// record: from then on people rely on it.
func (d *daemon) tell(ctx context.Context, from closures.Source, body closures.Body, durable bool) error {
	if o, is := body.(closures.ListOffered); is {
		var text bytes.Buffer
		if err := listfile.Canonical(&text, o.List.Text()); err != nil {
			return err
		}
		if err := d.journal.PutList(o.List.Digest().String(), text.Bytes()); err != nil {
			return err
		}
	}
	if _, err := d.stepper.Submit(from, body); err != nil || !durable {
		return err
	}
	return d.journal.Flush(ctx)
}

// kill ends the process at once: what was not on disk is lost.
func (d *daemon) kill() {
	d.killed = true
	_ = d.journal.Close() // it cannot write, which is meant
}

// sights is the engine as the permit issuer sees it.
type sights struct{ *engine.Engine }

func (e sights) Sight(id closures.BeamID) (permit.Sight, bool) {
	v := e.View()
	b := v.Beam(id)
	if b == nil {
		return permit.Sight{}, false
	}
	return permit.Sight{Decision: b.Decision, Rules: v.Rules, At: v.At, Boot: v.Boot, BootID: v.BootID, Number: v.Number}, true
}

func (e sights) Pulse() (at time.Time, boot time.Duration, r *closures.Rules) {
	v := e.View()
	return v.At, v.Boot, v.Rules
}
