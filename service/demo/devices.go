package demo

import (
	"context"
	"fmt"
	"slices"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/geometry"
)

// devices are all that speak by themselves, each at its own pace.
type devices struct {
	stars    map[string]r3.Vector // ICRS
	lines    [numFeeds]line
	scopes   []scope
	lasers   []laser
	safe     bool // the interlock's word
	detector closures.DetectorState
	all      []device
}

// device is one of them.
type device struct {
	name   string
	every  time.Duration
	says   func(ctx context.Context, s *stage, d *devices) error
	feed   int // over which it speaks; noFeed: HTTP
	speaks bool
	next   time.Duration
}

const noFeed = -1

// scope is where a telescope points.
type scope struct {
	name     string
	from, to r3.Vector
	target   string
	began    time.Duration
	slews    time.Duration
}

// makeDevices sets everything up; nothing speaks yet.
func makeDevices() devices {
	d := devices{
		safe: true, detector: closures.DetectorClear,
		scopes: []scope{{name: "north"}, {name: "south"}, {name: "ridge-2"}},
		lasers: []laser{{beam: "north", power: 22}, {beam: "south", power: 40}},
	}
	const half = 500 * time.Millisecond
	for i := range d.scopes {
		every := half
		if d.scopes[i].name == "ridge-2" {
			every = second
		}
		d.all = append(d.all, device{name: d.scopes[i].name, every: every, feed: telescopeFeed, says: func(_ context.Context, s *stage, d *devices) error {
			return d.lines[telescopeFeed].put(d.aim(&d.scopes[i], s.elapsed(), s.clock.Wall()))
		}})
	}
	d.all = append(d.all,
		device{name: "rx-1", every: second, feed: receiverFeed, says: receive},
		device{name: "catwalk", every: second, feed: safetyFeed, says: func(_ context.Context, s *stage, d *devices) error {
			return d.lines[safetyFeed].put(closures.InterlockSeen{Source: "catwalk", Said: s.clock.Wall(), Safe: d.safe})
		}},
		device{name: "thermal-1", every: second, feed: safetyFeed, says: func(_ context.Context, s *stage, d *devices) error {
			return d.lines[safetyFeed].put(closures.DetectorSeen{Source: "thermal-1", Said: s.clock.Wall(), State: d.detector})
		}},
		device{name: "mast", every: 10 * second, feed: noFeed, says: func(ctx context.Context, s *stage, _ *devices) error {
			return s.tell(ctx, closures.WeatherSeen{Source: "mast", Said: s.clock.Wall(), PressureHPa: 760, Temperature: 4})
		}},
		device{name: "lasers", every: half, feed: noFeed, says: readPermits},
	)
	return d
}

func (d *devices) find(name string) (*device, error) {
	i := slices.IndexFunc(d.all, func(o device) bool { return o.name == name })
	if i < 0 {
		return nil, fmt.Errorf("the story names %q, which is no device", name)
	}
	return &d.all[i], nil
}

// start lets a device speak, over a connection that is made if there is none.
func (d *devices) start(ctx context.Context, s *stage, name string) error {
	one, err := d.find(name)
	if err != nil {
		return err
	}
	if one.feed != noFeed {
		if err := d.lines[one.feed].connect(ctx); err != nil {
			return err
		}
	}
	one.speaks, one.next = true, s.elapsed()
	return nil
}

// stop silences a device. A receiver's connection breaks with it.
func (d *devices) stop(name string) error {
	one, err := d.find(name)
	if err != nil {
		return err
	}
	one.speaks = false
	if one.feed == receiverFeed {
		return d.lines[one.feed].hangUp()
	}
	return nil
}

// hurry makes a device speak now.
func (d *devices) hurry(name string) {
	if one, err := d.find(name); err == nil {
		one.next = 0
	}
}

func (d *devices) laser(beam closures.BeamID) *laser {
	return &d.lasers[slices.IndexFunc(d.lasers, func(l laser) bool { return l.beam == beam })]
}

// turn points a telescope.
func (d *devices) turn(now time.Duration, p point) error {
	to, known := d.stars[p.star]
	i := slices.IndexFunc(d.scopes, func(s scope) bool { return s.name == p.telescope })
	if !known || i < 0 {
		return fmt.Errorf("the story points %q at %q: there is no such thing", p.telescope, p.star)
	}
	s := &d.scopes[i]
	from := to
	if s.target != "" {
		from = s.direction(now)
	}
	*s = scope{name: s.name, from: from, to: to, target: p.star, began: now, slews: p.slews}
	d.hurry(s.name)
	return nil
}

func (s *scope) direction(now time.Duration) r3.Vector {
	if now-s.began >= s.slews {
		return s.to
	}
	return between(s.from, s.to, float64(now-s.began)/float64(s.slews))
}

// aim is what a telescope says of itself. A slewing one says so from its first
// word on.
func (d *devices) aim(s *scope, now time.Duration, said time.Time) closures.AimSeen {
	a := &closures.Aim{Frame: closures.ICRS, Direction: s.direction(now), Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
	if now-s.began < s.slews {
		a.Motion = closures.Slewing
	}
	seen := closures.AimSeen{Said: said, Aim: a, From: "encoder", Target: s.target}
	if s.name == "ridge-2" {
		seen.Telescope, seen.Exposing = closures.TelescopeID(s.name), closures.Yes
	} else {
		seen.Beam = closures.BeamID(s.name)
	}
	return seen
}

// receive is what the aircraft receiver says: that it hears, and whom.
func receive(_ context.Context, s *stage, d *devices) error {
	now := s.clock.Wall()
	l := &d.lines[receiverFeed]
	if err := l.put(closures.Heard{Source: "rx-1", Said: now, Scope: closures.HeardReception, MessagesPerMinute: 900}); err != nil {
		return err
	}
	for i := range flights {
		if seen, heard := flights[i].report(s.elapsed(), now); heard {
			if err := l.put(seen); err != nil {
				return fmt.Errorf("aircraft %s: %w", flights[i].address, err)
			}
		}
	}
	return nil
}

// readPermits has each laser's control read its permit and tell what its
// shutter does.
func readPermits(ctx context.Context, s *stage, d *devices) error {
	var says []closures.Body
	for i := range d.lasers {
		l := &d.lasers[i]
		if err := l.read(ctx, s.permits, s.clock.Wall()); err != nil {
			return err
		}
		says = append(says, l.says(s.clock.Wall())...)
	}
	return s.tell(ctx, says...)
}

// speak has every device whose time has come say its word.
func (d *devices) speak(ctx context.Context, s *stage) error {
	now := s.elapsed()
	for i := range d.all {
		o := &d.all[i]
		if !o.speaks || now < o.next {
			continue
		}
		o.next = now + o.every
		if err := o.says(ctx, s, d); err != nil {
			return fmt.Errorf("%s: %w", o.name, err)
		}
	}
	return nil
}
