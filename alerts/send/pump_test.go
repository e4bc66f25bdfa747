package send

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"slices"
	"sync"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"beamward/alerts"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// fake is a receiver that a test controls.
type fake struct {
	mu     sync.Mutex
	got    []string
	tries  int
	down   bool
	refuse string // an id
	poison string // an id that it always fails at
	hang   bool
}

func (f *fake) Send(ctx context.Context, m *alerts.Message) error {
	f.mu.Lock()
	f.tries++
	hang, down := f.hang, f.down
	f.mu.Unlock()
	if hang {
		<-ctx.Done()
		return ctx.Err()
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	switch {
	case m.ID == f.refuse:
		return &Refused{"no"}
	case down, m.ID == f.poison:
		return errors.New("down")
	}
	f.got = append(f.got, m.ID)
	return nil
}

func (f *fake) set(change func(*fake)) {
	f.mu.Lock()
	defer f.mu.Unlock()
	change(f)
}

func (f *fake) seen() []string {
	f.mu.Lock()
	defer f.mu.Unlock()
	return slices.Clone(f.got)
}

func put(t *testing.T, box alerts.Outbox, to string, ids ...string) {
	t.Helper()
	var ms []alerts.Message
	for _, id := range ids {
		ms = append(ms, alerts.Message{ID: id, What: alerts.Raised, To: []string{to}})
	}
	if err := box.Add(alerts.Deliveries(ms, time.Now())); err != nil {
		t.Fatal(err)
	}
}

func run(t *testing.T, o Options) (*Pump, func()) {
	t.Helper()
	o.Now = time.Now
	p, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan struct{})
	go func() { _ = p.Run(ctx); close(done) }()
	return p, func() { cancel(); <-done }
}

func TestPumpDelivers(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		box, f, other := &alerts.Memory{}, &fake{refuse: "2"}, &fake{hang: true}
		put(t, box, "hook", "1", "2", "3")
		put(t, box, "stuck", "x")
		var reports []string
		p, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": f, "stuck": other}, Report: func(r string, err error) { reports = append(reports, r+": "+err.Error()) }})
		time.Sleep(time.Second / 2)
		if got := f.seen(); !slices.Equal(got, []string{"1", "3"}) {
			t.Errorf("delivered %v", got)
		}
		put(t, box, "hook", "4", "1") // one that was delivered comes again: at least once
		p.Wake()
		synctest.Wait()
		if got := f.seen(); !slices.Equal(got, []string{"1", "3", "4", "1"}) {
			t.Errorf("delivered %v", got)
		}
		dead, _ := box.Dead(10)
		if len(dead) != 1 || dead[0].Message.ID != "2" || dead[0].Why != "no" {
			t.Errorf("dead: %+v", dead)
		}
		stop()
		if !slices.Equal(reports, []string{"hook: no"}) {
			t.Errorf("reports: %q", reports)
		}
		if due, _ := box.Due("stuck", time.Now(), 10); len(due) != 1 || due[0].Attempts != 0 {
			t.Errorf("an interrupted delivery: %+v", due)
		}
	})
}

// A receiver that is down is tried seldom, is told of once, and gets everything
// soon after it is back, though each message had its own time to wait.
func TestPumpThroughAnOutage(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		box, f := &alerts.Memory{}, &fake{down: true}
		var reports atomic.Int32
		p, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": f}, Report: func(string, error) { reports.Add(1) }})
		var all []string
		for i := range 120 {
			all = append(all, fmt.Sprintf("%03d", i))
			put(t, box, "hook", all[i])
			p.Wake()
			time.Sleep(time.Minute)
		}
		f.set(func(f *fake) {
			if f.tries > 150 || f.tries < 60 {
				t.Errorf("%d attempts in two hours", f.tries)
			}
		})
		if o := p.Failing(); len(o) != 1 || o[0].Name != "hook" || time.Since(o[0].FailingSince) < 115*time.Minute {
			t.Errorf("failing: %+v", o)
		}
		if n := reports.Load(); n != 1 {
			t.Errorf("%d reports", n)
		}
		f.set(func(f *fake) { f.down = false })
		time.Sleep(2 * time.Minute)
		got := f.seen()
		slices.Sort(got)
		if !slices.Equal(got, all) {
			t.Errorf("%d of %d delivered", len(got), len(all))
		}
		if o := p.Failing(); !o[0].FailingSince.IsZero() {
			t.Errorf("failing: %+v", o)
		}
		stop()
	})
}

// One message that a receiver cannot stand does not keep the others from it,
// and is given up after a day.
func TestPumpPastAPoisonedMessage(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		box, f := &alerts.Memory{}, &fake{poison: "1"}
		_, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": f}})
		put(t, box, "hook", "1", "2", "3", "4")
		time.Sleep(5 * time.Minute)
		if got := f.seen(); !slices.Equal(got, []string{"2", "3", "4"}) {
			t.Errorf("delivered %v", got)
		}
		time.Sleep(25 * time.Hour)
		if dead, _ := box.Dead(10); len(dead) != 1 || dead[0].Message.ID != "1" {
			t.Errorf("dead: %+v", dead)
		}
		stop()
	})
}

func TestPumpDropsWhatIsOfNoUse(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		box, f := &alerts.Memory{}, &fake{}
		_ = box.Add(alerts.Deliveries([]alerts.Message{{ID: "old", What: alerts.Notice, Expires: time.Now().Add(-time.Second), To: []string{"hook"}}}, time.Now()))
		_, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": f}})
		time.Sleep(3 * time.Second)
		due, _ := box.Due("hook", time.Now(), 10)
		dead, _ := box.Dead(10)
		if len(f.seen())+len(due)+len(dead) != 0 {
			t.Errorf("delivered %v, due %v, dead %v", f.seen(), due, dead)
		}
		stop()
	})
}

// broken is an outbox whose store errs.
type broken struct{ alerts.Memory }

func (*broken) Settle(alerts.Delivery) error { return errors.New("disk") }

// What cannot be settled is sent again, seldom, and never forgotten.
func TestPumpWithABrokenStore(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		box, f := &broken{}, &fake{}
		put(t, box, "hook", "1")
		_, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": f}})
		time.Sleep(10 * time.Minute)
		if n := len(f.seen()); n < 2 || n > 25 {
			t.Errorf("sent %d times", n)
		}
		stop()
	})
}

// A real webhook receiver is stopped and started again: each message arrives at
// least once.
func TestPumpThroughARestart(t *testing.T) {
	var mu sync.Mutex
	got := map[string]int{}
	handler := http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		_, _ = io.Copy(io.Discard, r.Body)
		mu.Lock()
		defer mu.Unlock()
		got[r.Header.Get("webhook-id")]++
	})
	s := httptest.NewServer(handler)
	url, where := s.URL, s.Listener.Addr().String()
	h, err := NewWebhook(WebhookOptions{URL: url, Secret: secret, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	defer h.client.CloseIdleConnections()
	box := &alerts.Memory{}
	p, stop := run(t, Options{Outbox: box, Receivers: map[string]Receiver{"hook": h}, Poll: 10 * time.Millisecond})
	defer stop()
	await := func(ids ...string) {
		t.Helper()
		for range 1000 {
			mu.Lock()
			missing := slices.ContainsFunc(ids, func(id string) bool { return got[id] == 0 })
			mu.Unlock()
			if !missing {
				return
			}
			time.Sleep(10 * time.Millisecond)
		}
		t.Fatalf("of %v there came %v", ids, got)
	}
	put(t, box, "hook", "a")
	p.Wake()
	await("a")
	s.CloseClientConnections()
	s.Close()
	put(t, box, "hook", "b", "c")
	p.Wake()
	for p.Failing()[0].FailingSince.IsZero() {
		time.Sleep(time.Millisecond)
	}
	again := httptest.NewUnstartedServer(handler)
	_ = again.Listener.Close()
	if again.Listener, err = listenAt(where); err != nil {
		t.Skip("the port was taken meanwhile: ", err)
	}
	again.Start()
	defer again.Close()
	put(t, box, "hook", "d")
	await("b", "c", "d")
}

func TestNewPumpRefuses(t *testing.T) {
	for _, o := range []Options{{}, {Outbox: &alerts.Memory{}}, {Outbox: &alerts.Memory{}, Now: now, Receivers: map[string]Receiver{"x": nil}}} {
		if _, err := New(o); err == nil {
			t.Errorf("taken: %+v", o)
		}
	}
}
