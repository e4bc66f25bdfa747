package demo

import (
	"context"
	"fmt"
	"math"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/client"
)

// laser is the control of one beam: it reads the permit as often as the site
// says, and moves its shutter by it. Were it real it would refuse a simulated
// permit; this shutter is made of words.
type laser struct {
	beam  closures.BeamID
	power float64
	open  bool
	stray bool // it emits whatever the shutter does
	reads int
}

// read asks for the permit. The client proves it: its signature, its beam, the
// nonce, and that it is not older than one before. Beyond that it must say
// simulated and allow nothing.
func (l *laser) read(ctx context.Context, c *client.Client, now time.Time) error {
	p, err := c.Permit(ctx, l.beam)
	if err != nil {
		return fmt.Errorf("reading the permit of %s: %w", l.beam, err)
	}
	if !p.Simulated || p.Allows(now) {
		return fmt.Errorf("reading the permit of %s: it does not say simulated", l.beam)
	}
	l.reads++
	l.open = p.State == wire.Open && now.Before(p.ValidUntil)
	return nil
}

// says is what the control tells of its shutter and its light.
func (l *laser) says(now time.Time) []closures.Body {
	position := closures.ShutterClosed
	if l.open {
		position = closures.ShutterOpen
	}
	light := closures.LaserSeen{Beam: l.beam, Said: now, Emitting: l.open || l.stray, PowerW: math.NaN()} // no power is said of no light
	if light.Emitting {
		light.PowerW = l.power
	}
	return []closures.Body{closures.ShutterSeen{Beam: l.beam, Said: now, Position: position}, light}
}
