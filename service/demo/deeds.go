package demo

import (
	"context"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/service/client"
)

// deed is something that happens in the story.
type deed interface {
	do(ctx context.Context, s *stage) error
}

type (
	// speak and silence begin and end what a device says by itself.
	speak   struct{ device string }
	silence struct{ device string }
	// point turns a telescope to a star. It slews for a time, if any.
	point struct {
		telescope, star string
		slews           time.Duration
	}
	// safe and detect change what an interlock and a detector say.
	safe struct {
		interlock closures.Source
		safe      bool
	}
	detect struct {
		detector closures.Source
		state    closures.DetectorState
	}
	// sight is a spotter's word.
	sight struct {
		spotter        closures.Source
		az, el, spread s1.Angle
		lasts          time.Duration
	}
	// watch is kept until a time of the story.
	watch struct {
		post  string
		until time.Duration
	}
	// bring gives a list to the service, and confirm lets it take effect.
	bring   struct{ list string }
	confirm struct{ list string }
	// hold shutters, release ends the last hold, rearm re-arms.
	hold struct {
		beam   closures.BeamID
		reason string
	}
	release struct{}
	rearm   struct{ beam closures.BeamID }
	// stray makes a laser emit whatever its shutter does.
	stray struct {
		beam closures.BeamID
		on   bool
	}
	// step sets the machine's clock; suspend lets the machine sleep.
	step    struct{ by time.Duration }
	suspend struct{ lasts time.Duration }
	// store keeps the service from writing its record, or lets it again.
	store struct{ writable bool }
)

func (d speak) do(ctx context.Context, s *stage) error { return s.devices.start(ctx, s, d.device) }
func (d silence) do(_ context.Context, s *stage) error { return s.devices.stop(d.device) }
func (d point) do(_ context.Context, s *stage) error   { return s.devices.turn(s.elapsed(), d) }
func (d safe) do(_ context.Context, s *stage) error {
	s.devices.safe = d.safe
	s.devices.hurry(string(d.interlock))
	return nil
}
func (d detect) do(_ context.Context, s *stage) error {
	s.devices.detector = d.state
	s.devices.hurry(string(d.detector))
	return nil
}
func (d stray) do(_ context.Context, s *stage) error {
	s.devices.laser(d.beam).stray = d.on
	s.devices.hurry("lasers")
	return nil
}
func (d step) do(_ context.Context, s *stage) error      { s.clock.Step(d.by); return nil }
func (d suspend) do(_ context.Context, s *stage) error   { s.clock.Suspend(d.lasts); return nil }
func (d store) do(ctx context.Context, s *stage) error   { return s.holdStore(ctx, !d.writable) }
func (d bring) do(ctx context.Context, s *stage) error   { return s.bringList(ctx, d.list) }
func (d confirm) do(ctx context.Context, s *stage) error { return s.confirmList(ctx, d.list) }

func (d sight) do(ctx context.Context, s *stage) error {
	return s.tell(ctx, closures.Sighted{
		Source: d.spotter, Said: s.clock.Wall(), HasDirection: true, Direction: geometry.FromHorizon(d.az, d.el), Spread: d.spread, For: d.lasts,
	})
}

func (d watch) do(ctx context.Context, s *stage) error {
	now := s.clock.Wall()
	return s.tell(ctx, closures.WatchKept{Post: d.post, Said: now, By: []string{"A. Night"}, Until: now.Add(d.until - s.elapsed())})
}

func (d hold) do(ctx context.Context, s *stage) error {
	return s.during(ctx, func() error {
		placed, err := s.api.PlaceHold(ctx, client.NewHold{Beam: d.beam, Reason: d.reason}, "")
		s.held = placed.ID
		return err
	})
}

func (release) do(ctx context.Context, s *stage) error {
	return s.during(ctx, func() error { return s.api.ReleaseHold(ctx, s.held, "", "") })
}

func (d rearm) do(ctx context.Context, s *stage) error {
	return s.during(ctx, func() error {
		_, err := s.api.Rearm(ctx, d.beam, "looked at", "")
		return err
	})
}
