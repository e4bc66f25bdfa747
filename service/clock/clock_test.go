package clock

import (
	"context"
	"errors"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

var (
	_ Clock = (*Real)(nil)
	_ Clock = (*Virtual)(nil)
)

var evening = time.Date(2031, 2, 14, 20, 0, 0, 0, time.UTC)

func TestZeroStateVouchesForNothing(t *testing.T) {
	var s State
	if s.Known || s.Synchronised {
		t.Fatalf("the zero state claims to be known or synchronised: %+v", s)
	}
}

func TestRealReadsForwardInUTC(t *testing.T) {
	r, err := NewReal(DefaultStepLimit)
	if err != nil {
		t.Fatal(err)
	}
	before := r.Now()
	for range 2000 {
		now := r.Now()
		if now.Boot < before.Boot || now.Wall.Before(before.Wall) {
			t.Fatalf("went back: %v then %v", before, now)
		}
		before = now
	}
	if before.Wall.Location() != time.UTC {
		t.Fatalf("wall time is in %v, want UTC", before.Wall.Location())
	}
	if before.Wall != before.Wall.Round(0) {
		t.Fatal("the wall time carries a monotonic part")
	}
	if off := time.Since(before.Wall); off < -time.Minute || off > time.Minute {
		t.Fatalf("the wall time is %v from the kernel's", off)
	}
	if s := r.State(); s.Fault != "" || s.Suspended != 0 {
		t.Fatalf("a healthy machine shows %+v", s)
	}
}

func TestRealTimers(t *testing.T) {
	r, err := NewReal(DefaultStepLimit)
	if err != nil {
		t.Fatal(err)
	}
	c, stop := r.Tick(time.Millisecond)
	<-c
	<-c
	stop()
	done := make(chan struct{})
	r.AfterFunc(0, func() { close(done) })
	<-done
	fired, _ := r.Timer(time.Microsecond)
	<-fired
	if _, stop := r.Timer(time.Hour); !stop() {
		t.Fatal("stopping a far timer came too late")
	}
}

func TestNewRealRefusesLimit(t *testing.T) {
	for _, limit := range []time.Duration{0, -1} {
		if _, err := NewReal(limit); err == nil {
			t.Errorf("a step limit of %v was accepted", limit)
		}
	}
}

func TestSmallDisagreementIsSlewed(t *testing.T) {
	for _, d := range []time.Duration{80 * time.Millisecond, -80 * time.Millisecond} {
		v := NewVirtual(evening)
		v.Step(d)
		last := v.Now()
		if last.State.Step != 0 || last.State.Offset != d {
			t.Fatalf("after %v: %+v", d, last.State)
		}
		for range 200 { // 80 ms at 500 ppm take 160 s
			v.Advance(time.Second)
			now := v.Now()
			rate := now.Wall.Sub(last.Wall) - time.Second
			if rate > 500*time.Microsecond || rate < -500*time.Microsecond {
				t.Fatalf("slewed by %v in a second, want at most 500 µs", rate)
			}
			last = now
		}
		if last.State.Offset != 0 {
			t.Fatalf("after 200 s %v of %v is left", last.State.Offset, d)
		}
		if want := evening.Add(200*time.Second + d); !last.Wall.Equal(want) {
			t.Fatalf("wall is %v, want %v", last.Wall, want)
		}
	}
}

func TestLargeStepIsReportedUntilReanchored(t *testing.T) {
	for _, d := range []time.Duration{time.Second, -time.Second, 101 * time.Millisecond, -time.Hour} {
		v := NewVirtual(evening)
		v.Step(d)
		if now := v.Now(); now.State.Step != d || !now.Wall.Equal(evening) {
			t.Fatalf("step %v: reported %v at %v", d, now.State.Step, now.Wall)
		}
		v.Step(-d) // the clock is put right again; the report stays
		v.Advance(time.Minute)
		if now := v.Now(); now.State.Step != d || !now.Wall.Equal(evening.Add(time.Minute)) {
			t.Fatalf("step %v taken back: reported %v at %v", d, now.State.Step, now.Wall)
		}
		v.Step(d)
		if now := v.Reanchor(); now.State.Step != 0 || !now.Wall.Equal(evening.Add(time.Minute+d)) {
			t.Fatalf("after reanchoring: %v at %v", now.State.Step, now.Wall)
		}
	}
}

func TestSmallStepsAddUp(t *testing.T) {
	v := NewVirtual(evening)
	for range 3 {
		v.Step(40 * time.Millisecond)
		v.Advance(time.Second)
		v.Now()
	}
	// 120 ms less at most 1.5 ms of slew is past the limit of 100 ms.
	if s := v.Now().State; s.Step < 100*time.Millisecond {
		t.Fatalf("three steps of 40 ms were not reported: %+v", s)
	}
}

func TestSuspendIsReported(t *testing.T) {
	v := NewVirtual(evening)
	fired, _ := v.Timer(time.Second)
	v.Suspend(time.Minute)
	now := v.Now()
	if now.State.Suspended != time.Minute || now.State.Step != 0 {
		t.Fatalf("after a suspend of a minute: %+v", now.State)
	}
	if !now.Wall.Equal(evening.Add(time.Minute)) || now.Boot != virtualBoot+time.Minute {
		t.Fatalf("a suspend must count in both clocks: %v %v", now.Wall, now.Boot)
	}
	select {
	case <-fired:
		t.Fatal("a timer fired in the suspend")
	default:
	}
	v.Advance(time.Second)
	<-fired
	if got := v.Reanchor().State.Suspended; got != 0 {
		t.Fatalf("still reported after reanchoring: %v", got)
	}
}

func TestDisciplineAndFault(t *testing.T) {
	v := NewVirtual(evening)
	if s := v.State(); !s.Known || !s.Synchronised || s.MaxError != time.Millisecond {
		t.Fatalf("a new virtual clock is %+v", s)
	}
	v.Discipline(true, false, 16*time.Second)
	if s := v.Now().State; !s.Known || s.Synchronised || s.MaxError != 16*time.Second {
		t.Fatalf("unsynchronised shows as %+v", s)
	}
	v.Discipline(false, true, 0)
	if s := v.Now().State; s.Known || s.Synchronised {
		t.Fatalf("not known shows as %+v", s)
	}
	v.Discipline(true, true, time.Millisecond)
	v.Advance(time.Second)
	before := v.Now()
	v.Break(true)
	v.Advance(time.Second)
	if now := v.Now(); now.State.Fault == "" || now.State.Synchronised || now.Boot != before.Boot {
		t.Fatalf("a clock that cannot be read shows %+v", now)
	}
	v.Break(false)
	if now := v.Now(); now.State.Fault != "" || now.Boot != before.Boot+time.Second {
		t.Fatalf("a mended clock shows %+v", now)
	}
}

func TestTimersFireInOrder(t *testing.T) {
	v := NewStepped(evening)
	var got []string
	note := func(name string) func() {
		return func() { got = append(got, name+"@"+v.Wall().Sub(evening).String()) }
	}
	v.AfterFunc(2*time.Second, note("b"))
	v.AfterFunc(time.Second, note("a"))
	v.AfterFunc(2*time.Second, note("c"))
	v.AfterFunc(time.Second, func() { v.AfterFunc(500*time.Millisecond, note("nested")) })
	if stop := v.AfterFunc(time.Second, note("stopped")); !stop() || stop() {
		t.Fatal("stop must come in time once, and only once")
	}
	settled := 0
	v.Settle(func() { settled++ })
	v.Advance(1500 * time.Millisecond)
	v.Advance(10 * time.Second)
	want := []string{"a@1s", "nested@1.5s", "b@2s", "c@2s"}
	if len(got) != len(want) {
		t.Fatalf("fired %v, want %v", got, want)
	}
	for i := range want {
		if got[i] != want[i] {
			t.Fatalf("fired %v, want %v", got, want)
		}
	}
	if settled != 3 {
		t.Fatalf("settled %d times, want once an instant: 3", settled)
	}
	if _, waiting := v.Next(); waiting {
		t.Fatal("a timer is left")
	}
}

func TestVirtualTicks(t *testing.T) {
	v := NewStepped(evening)
	c, stop := v.Tick(100 * time.Millisecond)
	n := 0
	v.Settle(func() {
		select {
		case <-c:
			n++
		default:
		}
	})
	v.Advance(time.Second)
	stop()
	v.Advance(time.Second)
	if n != 10 {
		t.Fatalf("%d ticks in a second, want 10", n)
	}
	if d, waiting := v.Next(); waiting {
		t.Fatalf("a stopped ticker waits for %v", d)
	}
}

func TestSleep(t *testing.T) {
	v := NewVirtual(evening)
	done := make(chan error, 1)
	go func() { done <- Sleep(context.Background(), v, time.Second) }()
	for {
		if _, waiting := v.Next(); waiting {
			break
		}
	}
	v.Advance(time.Second)
	if err := <-done; err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if err := Sleep(ctx, v, time.Second); !errors.Is(err, context.Canceled) {
		t.Fatalf("a cancelled sleep returned %v", err)
	}
	if _, waiting := v.Next(); waiting {
		t.Fatal("a cancelled sleep left its timer")
	}
}

func TestConcurrentUse(t *testing.T) {
	v := NewVirtual(evening)
	var wg sync.WaitGroup
	for range 4 {
		wg.Go(func() {
			for range 200 {
				v.Now()
				v.Read()
				v.AfterFunc(time.Millisecond, func() {})()
			}
		})
	}
	for range 100 {
		v.Advance(time.Millisecond)
		v.Step(time.Millisecond)
	}
	wg.Wait()
}

func BenchmarkRealNow(b *testing.B) {
	r, err := NewReal(DefaultStepLimit)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("Now", func(b *testing.B) {
		for b.Loop() {
			r.Now()
		}
	})
	b.Run("Read", func(b *testing.B) {
		for b.Loop() {
			r.Read()
		}
	})
	b.Run("rival-time.Now", func(b *testing.B) {
		for b.Loop() {
			_ = time.Now()
		}
	})
}
