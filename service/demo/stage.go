package demo

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"slices"
	"time"

	"beamward/closures"
	"beamward/service"
	"beamward/service/client"
	"beamward/service/clock"
	"beamward/service/engine"
)

// patience is how long, by the real clock, the demo waits for the service to do
// one thing.
const patience = 20 * time.Second

// pause is between two looks at the service.
const pause = 200 * time.Microsecond

// behind is how far the record may be behind before the clock moves on: well
// under the second at which the service shutters.
const behind = 400 * time.Millisecond

// stage is the service on its clock, with the observatory around it.
type stage struct {
	dir     string
	clock   *clock.Virtual
	began   time.Duration // boot time of the clock at the beginning
	service *service.Service
	ended   <-chan struct{} // closed when the service has ended

	api     *client.Client
	permits *client.Client // asks the permit listener
	devices devices
	lists   map[string]*closures.ListText
	held    closures.HoldID
	lock    *storeLock
}

// elapsed is how far the night has come.
func (s *stage) elapsed() time.Duration { return s.clock.Boot() - s.began }

func (s *stage) view() *engine.View { return s.service.Engine().View() }

var errGone = errors.New("the service ended by itself")

// creep is how far the clock may move on while the demo waits: enough for a
// batch that is being gathered.
const creep = 3 * time.Millisecond

// until waits, by the real clock, for something that needs no more of the
// service's clock than creep.
func (s *stage) until(ctx context.Context, what string, ok func() bool) error {
	deadline := time.Now().Add(patience)
	for left := creep; !ok(); {
		select {
		case <-ctx.Done():
			return ctx.Err()
		case <-s.ended:
			return errGone
		case <-time.After(pause):
		}
		if d, waits := s.clock.Next(); waits && d <= min(left, time.Millisecond) {
			s.clock.Advance(d)
			left -= max(d, time.Microsecond)
		}
		if time.Now().After(deadline) {
			return fmt.Errorf("waiting for the service: after %v %s", patience, what)
		}
	}
	return nil
}

// during asks the service something while its clock stands still.
func (s *stage) during(ctx context.Context, ask func() error) error {
	answered := make(chan error, 1)
	go func() { answered <- ask() }()
	var err error
	got := false
	waited := s.until(ctx, "it had not answered", func() bool {
		select {
		case err = <-answered:
			got = true
		default:
		}
		return got
	})
	if !got {
		err = <-answered // the client has an end of its own
	}
	return errors.Join(waited, err)
}

// tell posts facts, all of which must be taken in.
func (s *stage) tell(ctx context.Context, bodies ...closures.Body) error {
	text, err := ndjson(bodies)
	if err != nil {
		return err
	}
	return s.during(ctx, func() error {
		became, err := s.api.Facts(ctx, bytes.NewReader(text))
		if err == nil && became.Accepted != len(bodies) {
			err = errors.New("sending facts: not all were taken in")
			if len(became.Refused) > 0 {
				err = fmt.Errorf("sending facts: one was refused: %s", became.Refused[0].Cause)
			}
		}
		return err
	})
}

// taken counts the facts that the service has taken in or refused.
func (s *stage) taken() uint64 {
	var n uint64
	stats := s.service.Engine().Stats()
	for _, k := range stats.Kinds {
		n += k.Accepted + k.Refused
	}
	return n
}

// flush sends what the devices put on their lines, and waits until the service
// has taken it in. It decides on it when the clock moves on.
func (s *stage) flush(ctx context.Context) error {
	want := s.taken()
	sent := false
	for i := range s.devices.lines {
		l := &s.devices.lines[i]
		want += uint64(bytes.Count(l.out, []byte{'\n'}))
		sent = sent || len(l.out) > 0
		if err := l.send(); err != nil {
			return err
		}
	}
	if !sent {
		return nil
	}
	return s.until(ctx, "it had not taken in what was said", func() bool { return s.taken() >= want })
}

// due reports whether the service has to decide by now, or has an opening that
// waits for its entry on record.
func (s *stage) due() bool {
	v := s.view()
	if !v.Started || s.clock.Boot()-v.Boot >= v.Rules.Permit.DecisionInterval {
		return true
	}
	opening := func(b engine.BeamView) bool { return b.Opening }
	return s.lock == nil && slices.ContainsFunc(v.Beams, opening)
}

// advance moves the clock to a time of the night, and no further than the
// service follows: it must have made the decision that is due, and its record
// must not be behind.
func (s *stage) advance(ctx context.Context, to time.Duration) error {
	if d := to - s.elapsed(); d > 0 {
		s.clock.Advance(d)
	}
	if err := s.until(ctx, "it had not made the decision that is due", func() bool { return !s.due() }); err != nil {
		return err
	}
	return s.recorded(ctx)
}

// recorded waits for the record. Its state is told with each decision, so the
// mast says its word again to have one made, for which the clock creeps.
func (s *stage) recorded(ctx context.Context) error {
	if s.lock != nil {
		return nil // it is kept from writing
	}
	deadline := time.Now().Add(patience)
	for s.view().Record.Behind > behind {
		if time.Now().After(deadline) {
			return fmt.Errorf("waiting for the service: after %v its record was behind", patience)
		}
		if err := s.tell(ctx, closures.WeatherSeen{Source: "mast", Said: s.clock.Wall(), PressureHPa: 760, Temperature: 4}); err != nil {
			return err
		}
		s.clock.Advance(time.Millisecond)
		time.Sleep(5 * time.Millisecond)
	}
	return nil
}

// untilList waits for a list that was put into a folder. The folder is watched
// by the machine's own means, so the clock goes on in small steps meanwhile.
func (s *stage) untilList(ctx context.Context, t *closures.ListText) error {
	deadline := time.Now().Add(patience)
	for s.view().Book.Find(t.Authority, t.ID) == nil {
		if time.Now().After(deadline) {
			return fmt.Errorf("waiting for the service: after %v it had not taken list %s from its folder", patience, t.ID)
		}
		time.Sleep(20 * time.Millisecond)
		if err := s.advance(ctx, s.elapsed()+10*time.Millisecond); err != nil {
			return err
		}
	}
	return nil
}
