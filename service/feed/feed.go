package feed

import (
	"context"
	"errors"
	"fmt"
	"time"

	"beamward/closures"
)

// Intake takes in one fact. It does not block. An error that is a
// *closures.Error of code Busy means full: try again. Any other refuses the
// fact for good.
type Intake func(from closures.Source, body closures.Body) error

// Clock is what feeds need of the service's clock.
type Clock interface {
	Wall() time.Time     // UTC
	Boot() time.Duration // never goes back
	Timer(d time.Duration) (c <-chan struct{}, stop func() bool)
}

// Bound is a name that a feed may speak for.
type Bound struct {
	Name     closures.Source // a source, beam, neighbour or post
	Aircraft bool            // a source of aircraft: its reception has a warm-up
}

// Notice tells operators of something, with keys and values as log/slog takes
// them. It must not block. It is called seldom, whatever happens how often.
type Notice func(text string, args ...any)

// Options are what every feed of facts is made of.
type Options struct {
	Bound  []Bound // never none
	Intake Intake
	Clock  Clock
	Notice Notice // nil: nobody is told
}

func (o *Options) check() error {
	if o.Intake == nil || o.Clock == nil {
		return errors.New("it has no intake or no clock")
	}
	if len(o.Bound) == 0 {
		return errors.New("it may speak for nothing: bind it to sources")
	}
	seen := map[closures.Source]bool{}
	for _, b := range o.Bound {
		if !closures.ValidName(string(b.Name)) {
			return fmt.Errorf("%.80q is not a name", b.Name)
		}
		if seen[b.Name] {
			return fmt.Errorf("it is bound twice to %s", b.Name)
		}
		seen[b.Name] = true
	}
	return nil
}

// How long a full intake is left alone before the same fact is tried again.
const (
	busyFirst = 5 * time.Millisecond
	busyMost  = 100 * time.Millisecond
)

// sleep waits for d by the clock, or until ctx ends.
func sleep(ctx context.Context, c Clock, d time.Duration) error {
	fired, stop := c.Timer(d)
	defer stop()
	select {
	case <-fired:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}

func busy(err error) bool {
	var e *closures.Error
	return errors.As(err, &e) && e.Code == closures.Busy
}
