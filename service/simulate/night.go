package simulate

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/geometry/sky"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/engine"
)

// Options say which night is played, and where its record is left.
type Options struct {
	Seed   uint64
	Length time.Duration // 0: Short
	Dir    string        // empty, mode 0700; a folder in memory is quicker
	Build  string
	Broken Fault
}

// Short is the length of a night in which much happens.
const Short = 20 * time.Minute

// Result is what a night was.
type Result struct {
	Seed      uint64
	Start     time.Time
	Length    time.Duration
	Turns     int
	Reads     int
	Starts    int // of the process
	Kills     int
	Reloads   int
	Entries   uint64
	Head      string // of the record's chain: the night's own mark
	Unsafe    []Unsafe
	Available map[closures.BeamID]time.Duration // with an open permit
	Needless  map[string]time.Duration          // shuttered though the judge saw no cause, by the first reason
	Refused   []string                          // people's words that were not taken, and why
	Restored  int                               // holds and sightings that were in force before a restart and after it
}

// UnsafeFor is how long anything was unsafe.
func (r *Result) UnsafeFor() time.Duration {
	var sum time.Duration
	for i := range r.Unsafe {
		sum += r.Unsafe[i].For
	}
	return sum
}

// night is a night while it is played.
type night struct {
	opt    Options
	rng    *rand.Rand
	clock  *clock.Virtual
	began  time.Duration // boot time of the beginning
	start  time.Time
	daemon *daemon // nil: the process is dead
	stall  time.Time
	boots  int
	cfg    *config.Config // on disk

	nights  map[int64]*sky.Night
	scopes  []*scope // north, south, ridge-2
	lasers  []*laser
	flights []*flight
	danger  time.Time // people are in danger since
	blind   closures.DetectorState
	staffed time.Time // the watch is kept until
	silent  map[string]time.Time
	next    map[string]time.Time
	targets map[string]r3.Vector
	lists   map[closures.ListID]*closures.List

	events  []event
	busy    time.Time // something happens until then: look closely
	flushed time.Time
	judge   *judge
	result  Result
	view    *engine.View
	rearms  map[closures.BeamID]time.Time
}

// Night plays a night. The error is of the playing; what was unsafe is in the
// result.
func Night(ctx context.Context, o Options) (Result, error) {
	n, err := prepare(o)
	if err != nil {
		return Result{}, fmt.Errorf("preparing night %d: %w", o.Seed, err)
	}
	if err := n.play(ctx); err != nil {
		return n.result, fmt.Errorf("night %d at %v: %w", o.Seed, n.now().Sub(n.start), err)
	}
	return n.result, nil
}

func prepare(o Options) (*night, error) {
	if o.Length <= 0 {
		o.Length = Short
	}
	n := &night{
		opt: o, rng: rand.New(rand.NewPCG(o.Seed, 0x6265616d)), nights: map[int64]*sky.Night{}, blind: closures.DetectorClear,
		silent: map[string]time.Time{}, next: map[string]time.Time{}, targets: map[string]r3.Vector{}, lists: map[closures.ListID]*closures.List{},
		rearms: map[closures.BeamID]time.Time{},
	}
	n.start = time.Date(2031, 2, 15, 1, 0, 0, 0, time.UTC)
	dawn := n.rng.IntN(4) == 0
	switch {
	case o.Length > 2*time.Hour: // a whole night
		n.start = time.Date(2031, 2, 14, 20, 30, 0, 0, time.UTC)
	case dawn: // a night's end: the Sun comes
		for sunElevation(n.start.Add(o.Length-2*time.Minute)) < sunBelowDeg {
			n.start = n.start.Add(time.Minute)
		}
	}
	n.clock = clock.NewVirtual(n.start)
	n.began = n.clock.Boot()
	cfg, err := config.Parse(siteOf(leads[0], o.Broken), "/")
	if err != nil {
		return nil, err
	}
	n.cfg = cfg
	n.result = Result{Seed: o.Seed, Start: n.start, Length: o.Length, Available: map[closures.BeamID]time.Duration{}, Needless: map[string]time.Duration{}}
	n.judge = newJudge(n)
	if err := n.write(); err != nil {
		return nil, err
	}
	return n, nil
}

// now is the true time: the virtual boot clock is never wrong.
func (n *night) now() time.Time { return n.start.Add(n.clock.Boot() - n.began) }

// sky is the sky of an instant.
func (n *night) sky(at time.Time) *sky.Night {
	bin := sky.Bin(at).From
	s := n.nights[bin.Unix()]
	if s == nil {
		s, _ = sky.Prepare(skerry, bin, n.cfg.Rules.Site.UT1) // nil answers nowhere, for which the judge finds every beam too low
		n.nights[bin.Unix()] = s
	}
	return s
}

// wake starts the process from the record.
func (n *night) wake(ctx context.Context) error {
	n.boots++
	n.result.Starts++
	d, err := boot(ctx, n.opt.Dir, n.clock, n.cfg, fmt.Sprintf("night-%d-%d", n.opt.Seed, n.boots), n.opt.Build, n.opt.Broken == FaultForget && n.boots > 1)
	if err != nil {
		return err
	}
	n.daemon = d
	n.judge.told.restarted(n.now())
	clear(n.next) // connections are made anew and everybody speaks
	return nil
}

// play goes through the night step by step.
func (n *night) play(ctx context.Context) error {
	if err := n.wake(ctx); err != nil {
		return err
	}
	end := n.start.Add(n.opt.Length)
	for n.now().Before(end) {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := n.step(ctx); err != nil {
			return err
		}
		n.advance(n.pace())
	}
	return n.finish(ctx)
}

const (
	closely    = 100 * time.Millisecond
	quietly    = time.Second
	soon       = 1100 * time.Millisecond // what comes within is looked at closely
	settles    = 2500 * time.Millisecond // after a change, until the shutter has said where it is
	writeEvery = 500 * time.Millisecond  // a kill loses what is younger and nobody waits for
)

// pace is how far the next step is: to the next whole second while nothing
// happens or is about to.
func (n *night) pace() time.Duration {
	now := n.now()
	rest := quietly - time.Duration(now.UnixNano())%quietly
	if now.Before(n.busy) || len(n.events) > 0 && n.events[0].at.Sub(now) < soon {
		return closely - time.Duration(now.UnixNano())%closely
	}
	if n.view != nil {
		for i := range n.view.Beams {
			d := n.view.Beams[i].Decision
			if left := d.OpenUntil.Sub(now); d.Open && !d.OpenUntil.IsZero() && left < soon {
				return closely - time.Duration(now.UnixNano())%closely
			}
		}
	}
	return rest
}

// advance moves time on and looks at the light on the way.
func (n *night) advance(d time.Duration) {
	n.clock.Advance(d)
	now := n.now()
	for _, l := range n.lasers {
		if !l.lit {
			continue
		}
		if end := l.endsAt(); end.Before(now) {
			n.judge.light(l.beam, end.Add(-1), l.validUntil)
			l.lit, l.closing = false, time.Time{}
			n.busy = now.Add(settles)
			n.next["laser "+string(l.beam)] = time.Time{}
		}
	}
}

// step is what happens at one instant.
func (n *night) step(ctx context.Context) error {
	if err := n.happen(ctx); err != nil {
		return err
	}
	now := n.now()
	for i, s := range n.scopes {
		s.step(now, i >= len(n.lasers) || !n.lasers[i].lit)
	}
	if n.daemon != nil && now.Before(n.stall) { // it does not run, but its last view may be read
		n.watch(false)
		return n.reads(now)
	}
	if n.daemon == nil {
		n.watch(false)
		return nil
	}
	n.speak(now)
	v, err := n.daemon.turn(ctx)
	n.result.Turns++
	if err != nil {
		return err
	}
	if now.Sub(n.flushed) >= writeEvery {
		n.flushed = now
		if err := n.daemon.journal.Flush(ctx); err != nil {
			return err
		}
	}
	n.note(v)
	if err := n.reads(now); err != nil {
		return err
	}
	n.watch(true)
	return n.rearm(ctx, v)
}

// note takes up what was published.
func (n *night) note(v *engine.View) {
	if n.view != nil {
		for i := range v.Beams {
			if o := n.view.Beam(v.Beams[i].Decision.Beam); o != nil && o.Decision.Open != v.Beams[i].Decision.Open {
				n.busy = n.now().Add(settles)
			}
		}
	}
	n.view = v
}

// reads has each laser's control read its permit when it is time.
func (n *night) reads(now time.Time) error {
	for _, l := range n.lasers {
		if now.Before(n.next["read "+string(l.beam)]) {
			continue
		}
		n.next["read "+string(l.beam)] = now.Truncate(time.Second).Add(time.Second) // never later than the site's renew
		open, err := l.read(n.daemon.issuer, now)
		if err != nil {
			return err
		}
		n.result.Reads++
		n.judge.permit(l.beam, now, open)
		n.next["laser "+string(l.beam)] = time.Time{}
	}
	return nil
}

// watch looks at the light of an instant, and at what was shuttered without
// need.
func (n *night) watch(awake bool) {
	now := n.now()
	for _, l := range n.lasers {
		since := now.Sub(n.judge.looked[l.beam])
		if l.lit && now.Before(l.endsAt()) {
			n.judge.light(l.beam, now, l.validUntil)
		} else {
			n.judge.dark(l.beam, now)
		}
		if !awake || n.view == nil || n.view.Beam(l.beam) == nil || since > time.Minute {
			continue
		}
		switch d := n.view.Beam(l.beam).Decision; {
		case d.Open:
			n.result.Available[l.beam] += since
		case len(d.Reasons) > 0 && len(n.judge.causes(l.beam, now)) == 0:
			n.result.Needless[d.Reasons[0].Code.String()] += since
		}
	}
}

// finish ends the process in good order and takes the record's mark.
func (n *night) finish(ctx context.Context) error {
	n.result.Unsafe = n.judge.found
	if n.daemon == nil {
		if err := n.wake(ctx); err != nil {
			return err
		}
	}
	if err := n.daemon.stepper.Close(); err != nil {
		return err
	}
	last, head, err := n.daemon.journal.Head(ctx)
	n.result.Entries, n.result.Head = last, head.String()
	return errors.Join(err, n.daemon.journal.Close())
}

// What the judge asks.

func (n *night) scope(name string) *scope {
	for _, s := range n.scopes {
		if s.name == name {
			return s
		}
	}
	return nil
}

func (n *night) trueAim(beam closures.BeamID, at time.Time) r3.Vector {
	return n.scope(string(beam)).truly(at)
}

func (n *night) moves(beam closures.BeamID, at time.Time) bool {
	s := n.scope(string(beam))
	return !s.moved.IsZero() && at.After(s.moved)
}

func (n *night) overhead(icrs r3.Vector, at time.Time) r3.Vector { return n.sky(at).Horizon(icrs, at) }

func (n *night) neighbour(at time.Time) (axis r3.Vector, pointing int, looks bool) {
	s := n.scope("ridge-2")
	return n.overhead(s.truly(at), at), s.number, s.moved.IsZero()
}

func (n *night) airborne(at time.Time) []r3.Vector {
	out := make([]r3.Vector, len(n.flights))
	for i, f := range n.flights {
		out[i], _ = f.place(at)
	}
	return out
}

func (n *night) unsafe(time.Time) time.Time { return n.danger }
