package permit

import (
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/engine"
)

// handClock stands still until it is moved.
type handClock struct {
	wall time.Time
	boot time.Duration
}

func (c *handClock) Read() (time.Time, time.Duration) { return c.wall, c.boot }
func (c *handClock) AfterFunc(time.Duration, func()) (_ func() bool) {
	return func() bool { return true }
}
func (c *handClock) advance(d time.Duration) { c.wall, c.boot = c.wall.Add(d), c.boot+d }

// lateRecord makes entries durable when it is told to.
type lateRecord struct {
	queued, durable uint64
	opening         uint64 // the entry of the decision that opened; 0 while shuttered
}

func (r *lateRecord) Append(entries []engine.Entry) error {
	for _, e := range entries {
		switch d, ok := e.What.(engine.Decided); {
		case ok && !d.Decision.Open:
			r.opening = 0
		case ok && r.opening == 0:
			r.opening = e.Seq
		}
		r.queued = e.Seq
	}
	return nil
}
func (r *lateRecord) Condition() engine.Condition          { return engine.Condition{Durable: r.durable} }
func (r *lateRecord) Notify(chan<- struct{}) (stop func()) { return func() {} }
func (r *lateRecord) Flush(context.Context) error          { return nil }

// seen joins the engine to the issuer, as the service does.
type seen struct{ e *engine.Engine }

func (s seen) Sight(id closures.BeamID) (Sight, bool) {
	v := s.e.View()
	b := v.Beam(id)
	if b == nil {
		return Sight{}, false
	}
	return Sight{Decision: b.Decision, Rules: v.Rules, At: v.At, Boot: v.Boot, BootID: v.BootID, Number: v.Number}, true
}

func (s seen) Pulse() (time.Time, time.Duration, *closures.Rules) {
	v := s.e.View()
	return v.At, v.Boot, v.Rules
}

// schedule is one random night of a few seconds.
type schedule struct {
	rng    *rand.Rand
	clock  handClock
	record lateRecord
	e      *engine.Engine
	s      *engine.Stepper
	i      *Issuer
	rules  *closures.Rules
	closed []span.Span // what can be foreseen, known so far; leads and tails in
	holds  int
	reads  int
	opens  int
}

func scheduleRules(rng *rand.Rand) *closures.Rules {
	ms := func(most int) time.Duration { return time.Duration(rng.IntN(most)) * time.Millisecond }
	r := &closures.Rules{
		Site: closures.SiteRules{
			Name: "Skerry Peak", TimeZone: "UTC", Position: earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}, Geoid: 18,
			UT1: sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true},
		},
		Permit:   closures.PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 500 * time.Millisecond, ConsumerClockError: ms(400)},
		Clock:    closures.ClockRules{StepLimit: 100 * time.Millisecond},
		ByItself: closures.AllCodes,
		Beams: []closures.BeamRules{{
			ID: "north", Launches: []closures.Launch{{ID: "axis", Offset: r3.Vector{Z: 12}}}, AimOfTelescope: true,
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.3, FocusHeight: 92000, Asterism: 20 * geometry.Arcsecond,
			Limits:      closures.Limits{ElevationMin: 30 * s1.Degree, ElevationMax: 89 * s1.Degree, SunBelow: -12 * s1.Degree},
			Aim:         closures.AimRules{StaleAfter: 5 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: 0.1 * s1.Degree},
			ShutterTime: time.Millisecond + ms(800), FeedbackStale: 5 * time.Second, ReopenAfter: time.Millisecond + ms(300),
		}},
		Authorities: []closures.AuthorityRules{{ID: "desk", Required: true, Integrity: closures.IntegrityNone, Lead: ms(2000), Tail: ms(500), Loosening: closures.LooseningAtOnce}},
	}
	r.Digest[0] = 1
	return r
}

// span draws a closure that starts within the schedule.
func (s *schedule) span() span.Span {
	at, _ := s.clock.Read()
	from := at.Add(time.Duration(s.rng.Int64N(int64(10 * time.Second))))
	return span.Span{From: from, Until: from.Add(time.Millisecond + time.Duration(s.rng.Int64N(int64(3*time.Second))))}
}

func (s *schedule) list(t *testing.T) *closures.List {
	text := &closures.ListText{
		ID: "a", Authority: "desk", Issued: evening.Add(-time.Hour), Covers: span.Span{From: evening.Add(-time.Hour), Until: evening.Add(time.Hour)},
		Regions: []closures.Region{{ID: "dome", Shape: closures.WholeSky}}, Digest: closures.Digest{1},
	}
	text.Windows = append(text.Windows, closures.Window{From: evening.Add(-time.Hour).UnixNano(), Until: evening.Add(-time.Minute).UnixNano()})
	a := &s.rules.Authorities[0]
	for range s.rng.IntN(4) {
		w := s.span()
		text.Windows = append(text.Windows, closures.Window{From: w.From.UnixNano(), Until: w.Until.UnixNano()})
		s.closed = append(s.closed, w.Widen(a.Lead, a.Tail))
	}
	l, err := closures.Index(text)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func (s *schedule) run(t *testing.T, n *sky.Night, k *Key) error {
	s.clock = handClock{evening, time.Hour}
	s.rules = scheduleRules(s.rng)
	var err error
	s.e, err = engine.New(engine.Options{
		Clock: &s.clock, Record: &s.record, Rules: s.rules, Boot: closures.Boot{ID: "boot", At: evening},
		Health:  func() engine.ClockReport { return engine.ClockReport{Synchronised: true, MaxErrorSaid: true} },
		Prepare: func(*closures.Rules, time.Time) (*sky.Night, error) { return n, nil },
	})
	if err != nil {
		return err
	}
	if s.s, err = s.e.Stepper(); err != nil {
		return err
	}
	if s.i, err = New(seen{s.e}, &s.clock, k, false); err != nil {
		return err
	}
	if _, err := s.e.Offer("desk", closures.ListOffered{List: s.list(t), By: "desk"}); err != nil {
		return err
	}
	dir := n.ICRS(geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), evening)
	for end := evening.Add(10 * time.Second); s.clock.wall.Before(end); {
		_, err := s.e.Offer("mount", closures.AimSeen{Beam: "north", Said: s.clock.wall, From: "encoder",
			Aim: &closures.Aim{Frame: closures.ICRS, Direction: dir, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}})
		if err != nil {
			return err
		}
		if s.rng.IntN(20) == 0 {
			h := s.span()
			s.holds++
			s.closed = append(s.closed, h)
			if _, err := s.e.Offer("console", closures.HoldPlaced{ID: closures.HoldID(fmt.Sprint("h-", s.holds)), Beam: "*", By: "ana", Placed: s.clock.wall, From: h.From, Until: h.Until}); err != nil {
				return err
			}
		}
		if err := s.turn(); err != nil {
			return err
		}
		for step := time.Duration(1 + s.rng.Int64N(int64(500*time.Millisecond))); step > 0; {
			d := min(step, time.Duration(1+s.rng.Int64N(int64(400*time.Millisecond))))
			step -= d
			s.clock.advance(d)
			if err := s.read(); err != nil {
				return err
			}
		}
	}
	return nil
}

func (s *schedule) turn() error {
	if s.rng.IntN(3) > 0 { // the store has caught up with what was queued before
		s.record.durable = s.record.queued
	}
	v, err := s.s.Turn()
	if err != nil {
		return err
	}
	if v.Beams[0].Decision.Open {
		s.opens++
		if s.record.opening == 0 || s.record.opening > s.record.durable {
			return fmt.Errorf("open by entry %d, and only %d is durable", s.record.opening, s.record.durable)
		}
	}
	return s.read()
}

// read takes a permit, as one that is signed for its request and as one that
// is kept for a slot, and holds both against everything that can be foreseen.
func (s *schedule) read() error {
	s.reads++
	sight, _ := s.i.source.Sight("north")
	slotEnd := s.clock.wall.Add(s.clock.boot.Truncate(slot) + slot - s.clock.boot)
	margin := s.rules.MarginTime(&s.rules.Beams[0])
	for _, issued := range []time.Time{s.clock.wall, slotEnd} {
		p := s.i.lease(&sight, s.clock.wall, s.clock.boot, issued, "")
		if p.State != wire.Open {
			continue
		}
		// Until this instant a reader may keep the shutter open; the slowest
		// reader by its own stopwatch included.
		until := p.ValidUntil
		if by := s.clock.wall.Add(p.Lease()); by.After(until) {
			return fmt.Errorf("a stopwatch runs to %v, past %v", by, until)
		}
		for _, c := range s.closed {
			if c.Until.After(s.clock.wall) && until.Add(margin).After(c.From) {
				return fmt.Errorf("read %v after the start: valid until %v with a margin of %v, closed from %v to %v",
					s.clock.wall.Sub(evening), until.Sub(evening), margin, c.From.Sub(evening), c.Until.Sub(evening))
			}
		}
	}
	return nil
}

// No read of any permit is valid past the start of a foreseeable closure less
// the margin time, and none is open before its opening is durable. BW-008
func TestNoPermitOutlivesAForeseeableClosure(t *testing.T) {
	schedules := 10_000
	if hurried {
		schedules = 1_000
	}
	if os.Getenv("BEAMWARD_LONG") != "" {
		schedules = 300_000
	}
	n, err := sky.Prepare(scheduleRules(rand.New(rand.NewPCG(1, 1))).Site.Position, evening, sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true})
	if err != nil {
		t.Fatal(err)
	}
	k, err := LoadKey(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	var next, reads, opens, closed atomic.Int64
	var hands sync.WaitGroup
	for range 2 {
		hands.Go(func() {
			for seed := next.Add(1); seed <= int64(schedules) && !t.Failed(); seed = next.Add(1) {
				s := schedule{rng: rand.New(rand.NewPCG(7, uint64(seed)))}
				if err := s.run(t, n, k); err != nil {
					t.Errorf("schedule %d: %v", seed, err)
				}
				reads.Add(int64(s.reads))
				opens.Add(int64(s.opens))
				closed.Add(int64(len(s.closed)))
			}
		})
	}
	hands.Wait()
	t.Logf("%d schedules, %d closures, %d reads, open in %d turns", schedules, closed.Load(), reads.Load(), opens.Load())
	if opens.Load() < int64(schedules) {
		t.Error("hardly ever open: this shows nothing")
	}
}
