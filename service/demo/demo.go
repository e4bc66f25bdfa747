package demo

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"os"
	"path/filepath"
	"sync"
	"time"

	"beamward/geometry/sky"
	"beamward/service"
	"beamward/service/client"
	"beamward/service/clock"
	"beamward/service/config"
)

// Options say how the night is played.
type Options struct {
	Out    io.Writer     // where the story is told
	Log    *slog.Logger  // the service's own log; nil: none
	JSON   bool          // tell it as JSON, one object a line
	Speed  float64       // how many times as fast as real time, at most; 0: as fast as the service follows
	For    time.Duration // how much of the night is played; 0: Length
	Listen string        // address of the API; empty: a free port of the loopback interface
	Dir    string        // an empty folder, or none yet; empty: a temporary one. It is left as it is at the end
	Build  string
}

// Length is how long the whole story takes, in the night's own time.
const Length = storyLength

// tick is how far the clock moves at a time: the decision interval.
const tick = 100 * time.Millisecond

// Run plays the night. It returns nil only if every reason was shown, every
// permit that was read proved itself, and the record that is left verifies.
func Run(ctx context.Context, o Options) (err error) {
	if o.For <= 0 {
		o.For = Length
	}
	s, start, cfg, err := prepare(o)
	if err != nil {
		return err
	}
	s.service, err = service.New(ctx, service.Options{Config: cfg, Log: o.Log, Clock: s.clock, Simulated: true, Build: o.Build})
	if err != nil {
		return err
	}
	t := newTeller(o.Out, o.JSON)
	err = s.play(ctx, o, t, start)
	if err = errors.Join(err, s.service.Close()); err != nil {
		return err
	}
	return t.finish(ctx, s, o)
}

// prepare writes the site and everything that the service is made of.
func prepare(o Options) (*stage, time.Time, *config.Config, error) {
	fail := func(err error) (*stage, time.Time, *config.Config, error) {
		return nil, time.Time{}, nil, fmt.Errorf("preparing the demo: %w", err)
	}
	sunrise, err := dawn()
	if err != nil {
		return fail(err)
	}
	start := sunrise.Add(-dawnAt)
	dir, err := folder(o.Dir)
	if err != nil {
		return fail(err)
	}
	listen := o.Listen
	if listen == "" {
		listen = "127.0.0.1:0"
	}
	path := filepath.Join(dir, configFile)
	if err := os.WriteFile(path, []byte(siteText(listen)), 0o600); err != nil {
		return fail(err)
	}
	if err := os.Mkdir(filepath.Join(dir, "lists"), 0o700); err != nil {
		return fail(err)
	}
	cfg, err := config.Load(path)
	if err != nil {
		return fail(err)
	}
	night, err := sky.Prepare(skerry, start, cfg.Rules.Site.UT1)
	if err != nil {
		return fail(err)
	}
	c := clock.NewStepped(start)
	s := &stage{dir: dir, clock: c, began: c.Boot(), devices: makeDevices()}
	s.devices.stars = icrs(night, start, stars)
	s.lists = lists(start, s.devices.stars)
	return s, start, cfg, nil
}

const configFile = "beamward.yaml"

// folder makes the folder that the demo works in.
func folder(dir string) (string, error) {
	if dir == "" {
		return os.MkdirTemp("", "beamward-demo-")
	}
	if err := os.MkdirAll(dir, 0o700); err != nil {
		return "", err
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return "", err
	}
	if len(entries) > 0 {
		return "", fmt.Errorf("folder %s is not empty: choose another", dir)
	}
	return filepath.Abs(dir)
}

// play runs the service and the story beside it, and ends both.
func (s *stage) play(ctx context.Context, o Options, t *teller, start time.Time) (err error) {
	running, stop := context.WithCancel(ctx)
	ended := make(chan struct{})
	s.ended = ended
	var runs sync.WaitGroup
	var ran error
	runs.Go(func() {
		defer close(ended)
		ran = s.service.Run(running)
	})
	defer func() {
		// The service needs its clock to end: what it waits for may be due.
		stop()
		for alive := true; alive; {
			select {
			case <-ended:
				alive = false
			case <-time.After(pause):
				s.clock.Advance(time.Millisecond)
			}
		}
		runs.Wait()
		err = errors.Join(err, ran)
	}()
	at := s.service.Addresses()
	for i := range s.devices.lines {
		s.devices.lines[i].addr = at.Feeds[i]
	}
	if s.api, err = client.New(client.Options{Server: "http://" + at.API}); err != nil {
		return err
	}
	defer s.api.Close()
	if s.permits, err = client.New(client.Options{Server: "http://" + at.Permit}); err != nil {
		return err
	}
	defer s.permits.Close()
	t.begin(start, at, s.dir)
	defer func() {
		for i := range s.devices.lines {
			err = errors.Join(err, s.devices.lines[i].hangUp())
		}
		err = errors.Join(err, s.holdStore(context.WithoutCancel(ctx), false))
	}()
	return s.perform(ctx, o, t)
}

// perform goes through the night step by step.
func (s *stage) perform(ctx context.Context, o Options, t *teller) error {
	updates, cancel := s.service.Engine().Watch(4096)
	defer cancel()
	began := time.Now()
	next := 0
	for step := time.Duration(0); ; step += tick {
		due := next
		for ; due < len(story) && story[due].at <= step; due++ {
			t.scene(story[due].at, story[due].says)
		}
		if err := s.advance(ctx, step); err != nil {
			return err
		}
		t.drain(s, updates)
		if s.elapsed() >= o.For {
			return t.err
		}
		for ; next < due; next++ {
			for _, d := range story[next].does {
				if err := d.do(ctx, s); err != nil {
					return fmt.Errorf("at %s: %w", timeOf(s.elapsed()), err)
				}
			}
		}
		if err := s.devices.speak(ctx, s); err != nil {
			return fmt.Errorf("at %s: %w", timeOf(s.elapsed()), err)
		}
		if err := s.flush(ctx); err != nil {
			return fmt.Errorf("at %s: %w", timeOf(s.elapsed()), err)
		}
		t.drain(s, updates)
		if t.err != nil {
			return t.err
		}
		if step < s.elapsed() {
			step = s.elapsed().Truncate(tick) // a sleep of the machine jumps
		}
		if err := pace(ctx, began, s.elapsed(), o.Speed); err != nil {
			return err
		}
	}
}

// pace waits until the real clock has come as far as the night at its speed.
func pace(ctx context.Context, began time.Time, elapsed time.Duration, speed float64) error {
	if !(speed > 0) {
		return ctx.Err()
	}
	wait := time.Duration(float64(elapsed)/speed) - time.Since(began)
	if wait <= 0 {
		return ctx.Err()
	}
	select {
	case <-ctx.Done():
		return ctx.Err()
	case <-time.After(wait):
		return nil
	}
}
