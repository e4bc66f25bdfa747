package schedule

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/service/clock"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// drive runs a schedule over a virtual span and returns when its jobs ran.
func drive(t *testing.T, start time.Time, over time.Duration, zone *time.Location, state string, when string) (ran []time.Time, told []error) {
	t.Helper()
	v := clock.NewVirtual(start)
	var mu sync.Mutex
	ctx, cancel := context.WithCancel(t.Context())
	s, err := New(Options{Clock: v, Zone: zone, State: state, Jobs: []Job{{Name: "noon", When: when, Do: func(context.Context) error {
		mu.Lock()
		defer mu.Unlock()
		ran = append(ran, v.Wall())
		if len(ran) == 2 {
			panic("a job that goes wrong")
		}
		return nil
	}}}, Told: func(_ string, err error) {
		if err != nil {
			mu.Lock()
			defer mu.Unlock()
			told = append(told, err)
		}
	}})
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan error, 1)
	go func() { done <- s.Run(ctx) }()
	for passed := time.Duration(0); passed < over; passed += 30 * time.Second {
		for { // until the schedule waits for the clock
			if _, waiting := v.Next(); waiting {
				break
			}
			time.Sleep(10 * time.Microsecond)
		}
		v.Advance(30 * time.Second)
	}
	cancel()
	if err := <-done; err != nil {
		t.Error(err)
	}
	return ran, told
}

// Noon comes once a day by the site's clock, also on the days of 23 and of 25
// hours (Europe/Lisbon, 2031: clocks forward on 30 March, back on 26 October,
// by the European Union's rule of the last Sunday; common practice, no source).
func TestSummerTime(t *testing.T) {
	zone, err := time.LoadLocation("Europe/Lisbon")
	if err != nil {
		t.Skip("no time zone data: " + err.Error())
	}
	for _, day := range []time.Time{time.Date(2031, 3, 29, 6, 0, 0, 0, zone), time.Date(2031, 10, 25, 6, 0, 0, 0, zone)} {
		ran, told := drive(t, day.UTC(), 72*time.Hour, zone, "", "0 12 * * *")
		if len(ran) != 3 {
			t.Fatalf("from %v: ran %d times, not 3: %v", day, len(ran), ran)
		}
		for _, at := range ran {
			if h := at.In(zone); h.Hour() != 12 || h.Minute() > 1 {
				t.Errorf("ran at %v", h)
			}
		}
		if len(told) != 1 {
			t.Errorf("a panic was told %d times", len(told))
		}
	}
}

// A run that was missed while the service was down is caught up once.
func TestMissedRunsAreCaughtUp(t *testing.T) {
	state := filepath.Join(t.TempDir(), "schedule.json")
	start := time.Date(2031, 2, 14, 11, 0, 0, 0, time.UTC)
	if ran, _ := drive(t, start, 2*time.Hour, time.UTC, state, "0 12 * * *"); len(ran) != 1 {
		t.Fatalf("ran %d times", len(ran))
	}
	later := start.Add(5 * 24 * time.Hour) // five days down, up again at 11
	if ran, _ := drive(t, later, 30*time.Minute, time.UTC, state, "0 12 * * *"); len(ran) != 1 || ran[0].Sub(later) > time.Minute {
		t.Fatalf("caught up: %v", ran)
	}
	if ran, _ := drive(t, later.Add(40*time.Minute), 10*time.Minute, time.UTC, state, "0 12 * * *"); len(ran) != 0 {
		t.Fatalf("caught up twice: %v", ran)
	}
	if err := os.WriteFile(state, []byte("{"), 0o600); err != nil {
		t.Fatal(err)
	}
	if ran, told := drive(t, later, 30*time.Minute, time.UTC, state, "0 12 * * *"); len(ran) != 0 || len(told) == 0 {
		t.Errorf("a broken memory: ran %v, told %v", ran, told)
	}
}

func TestBadTimes(t *testing.T) {
	for _, when := range []string{"", "0 12 * *", "61 12 * * *", "0 12 31 2 *"} {
		_, err := New(Options{Clock: clock.NewVirtual(time.Date(2031, 1, 1, 0, 0, 0, 0, time.UTC)), Zone: time.UTC, Jobs: []Job{{Name: "x", When: when}}})
		if err == nil {
			t.Errorf("%q was taken", when)
		}
	}
	if _, err := New(Options{}); err == nil || errors.Unwrap(err) != nil {
		t.Errorf("no clock: %v", err)
	}
}
