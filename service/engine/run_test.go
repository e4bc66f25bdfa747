package engine

import (
	"context"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"beamward/closures"
	"beamward/geometry"

	"github.com/golang/geo/s1"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// bubbleClock follows the time of a synctest bubble.
type bubbleClock struct{ start time.Time }

func (c bubbleClock) Read() (time.Time, time.Duration) {
	d := time.Since(c.start)
	return evening.Add(d), time.Hour + d
}

func (c bubbleClock) AfterFunc(d time.Duration, f func()) func() bool {
	return time.AfterFunc(d, f).Stop
}

// running is an engine in its own goroutine with feeds that keep all clear.
type running struct {
	e      *Engine
	rec    *slate
	clock  bubbleClock
	ended  chan error
	cancel context.CancelFunc
}

func start(t *testing.T, change ...func(*Options)) *running {
	t.Helper()
	r := &running{clock: bubbleClock{time.Now()}, rec: &slate{forget: true}, ended: make(chan error, 1)}
	rules := siteRules()
	opt := Options{
		Clock: r.clock, Record: r.rec, Rules: rules, Boot: closures.Boot{ID: "boot", At: evening}, Prepare: nights,
		Health: func() ClockReport { return newHandClock().report },
	}
	for _, f := range change {
		f(&opt)
	}
	e, err := New(opt)
	if err != nil {
		t.Fatal(err)
	}
	r.e = e
	ctx, cancel := context.WithCancel(t.Context())
	r.cancel = cancel
	var feeds sync.WaitGroup
	feeds.Go(func() { r.feed(ctx, rules) })
	go func() {
		err := e.Run(ctx)
		feeds.Wait()
		r.ended <- err
	}()
	return r
}

func (r *running) feed(ctx context.Context, rules *closures.Rules) {
	n, _ := nights(rules, evening)
	dir := n.ICRS(geometry.FromHorizon(150*s1.Degree, 65*s1.Degree), evening)
	tick := time.NewTicker(50 * time.Millisecond)
	defer tick.Stop()
	for {
		at, _ := r.clock.Read()
		_, _ = r.e.Offer("tcp", closures.AimSeen{Beam: "north", Said: at, From: "encoder",
			Aim: &closures.Aim{Frame: closures.ICRS, Direction: dir, Reference: at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}})
		_, _ = r.e.Offer("tcp", closures.InterlockSeen{Source: "catwalk", Said: at, Safe: true})
		select {
		case <-tick.C:
		case <-ctx.Done():
			return
		}
	}
}

func (r *running) open() bool { return r.e.View().Beams[0].Decision.Open }

func TestRun(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := start(t)
		ctx := t.Context()
		if _, err := r.e.SubmitDurable(ctx, "console", closures.ListOffered{List: list(t, "2031-045-A"), By: "ana"}); err != nil {
			t.Fatal(err)
		}
		time.Sleep(2 * time.Second)
		if !r.open() {
			t.Fatalf("not open: %v", reasons(r.e.View().Beams[0].Decision))
		}

		// An unsafe interlock closes within the window in which facts gather.
		at, _ := r.clock.Read()
		if _, err := r.e.Offer("tcp", unsafe(at.Add(time.Millisecond))); err != nil {
			t.Fatal(err)
		}
		time.Sleep(leastWindow)
		synctest.Wait()
		if r.open() {
			t.Fatal("open a window's length after an unsafe interlock")
		}
		time.Sleep(2 * time.Second)
		if !r.open() {
			t.Fatal("not open again")
		}

		// A person's word does not even wait for that, nor for the store.
		r.rec.set(func(s *slate) { s.held = true })
		before, _ := r.clock.Read()
		if _, err := r.e.Submit(ctx, "console", hold("h-1")); err != nil {
			t.Fatal(err)
		}
		if after, _ := r.clock.Read(); r.open() || !after.Equal(before) {
			t.Fatalf("open %v, %v after a hold", r.open(), after.Sub(before))
		}
		short, cancel := context.WithTimeout(ctx, time.Second)
		defer cancel()
		if _, err := r.e.SubmitDurable(short, "console", hold("h-2")); err == nil {
			t.Fatal("a hold was called durable while the store sleeps")
		}
		r.rec.set(func(s *slate) { s.held = false })

		// A quiet engine decides at every interval all the same.
		n := r.e.View().Number
		time.Sleep(time.Second)
		if got := r.e.View().Number - n; got < 10 {
			t.Errorf("%d views in a second", got)
		}

		r.cancel()
		if err := <-r.ended; err != nil {
			t.Fatal(err)
		}
		v := r.e.View()
		if !v.Stopped || v.Beams[0].Decision.Open {
			t.Errorf("after the end: %+v", v.Beams[0].Decision)
		}
	})
}

func TestRunGrantsWhenTheRecordTells(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := start(t)
		if _, err := r.e.Submit(t.Context(), "console", closures.ListOffered{List: list(t, "2031-045-A"), By: "ana"}); err != nil {
			t.Fatal(err)
		}
		time.Sleep(500 * time.Millisecond)
		r.rec.set(func(s *slate) { s.held = true; s.c.Behind = 0 })
		c, cancel := r.e.Watch(1000)
		defer cancel()
		for u := range c {
			if u.View.Beams[0].Opening {
				break
			}
			if time.Since(r.clock.start) > time.Minute {
				t.Fatal("it never opens")
			}
		}
		if r.open() {
			t.Fatal("open before the record told")
		}
		r.rec.set(func(s *slate) { s.c.Durable = 1 << 40; s.held = false })
		synctest.Wait() // no time passes
		if !r.open() {
			t.Fatalf("not granted at the record's word: %v", reasons(r.e.View().Beams[0].Decision))
		}
		r.cancel()
		if err := <-r.ended; err != nil {
			t.Fatal(err)
		}
	})
}

// Many senders, watchers, readers and people at once, for the race detector.
func TestRunUnderManyHands(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := start(t)
		ctx, cancel := context.WithTimeout(t.Context(), time.Second)
		defer cancel()
		var hands sync.WaitGroup
		for i := range 4 {
			hands.Go(func() {
				for ctx.Err() == nil {
					at, _ := r.clock.Read()
					_, _ = r.e.Offer(closures.Source(rune('a'+i)), closures.Heard{Source: "catwalk", Said: at})
					time.Sleep(3 * time.Millisecond)
				}
			})
			hands.Go(func() {
				c, stop := r.e.Watch(4)
				defer stop()
				for {
					select {
					case u, ok := <-c:
						if !ok {
							return
						}
						if u.View.Beam("north") == nil {
							t.Error("a view without its beam")
						}
					case <-ctx.Done():
						return
					}
				}
			})
			hands.Go(func() {
				for n := 0; ctx.Err() == nil; n++ {
					id := closures.HoldID(string(rune('a'+i)) + "-" + time.Now().Format("05.000"))
					if _, err := r.e.SubmitDurable(ctx, "console", closures.HoldPlaced{ID: id, Beam: "north", By: "ana", Placed: evening}); err != nil && ctx.Err() == nil {
						t.Error(err)
					}
					if r.open() {
						t.Error("open under a hold")
					}
					_ = r.e.Stats()
					time.Sleep(7 * time.Millisecond)
				}
			})
		}
		hands.Wait()
		r.cancel()
		if err := <-r.ended; err != nil {
			t.Fatal(err)
		}
	})
}

func TestRunEndsAfterTwoPanics(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := start(t, func(o *Options) { o.Record = brokenRecord{&slate{}} })
		if err := <-r.ended0(); err == nil {
			t.Fatal("no error")
		}
		if v := r.e.View(); !v.Stopped || v.Beams[0].Decision.Open {
			t.Fatal("not shuttered after a fault")
		}
		if _, err := r.e.Submit(t.Context(), "console", hold("h")); codeOf(err) != closures.Busy {
			t.Fatalf("submitting to an engine that ended: %v", err)
		}
	})
}

// ended0 lets the feeds end, which outlive an engine that gives up.
func (r *running) ended0() <-chan error {
	synctest.Wait()
	r.cancel()
	return r.ended
}
