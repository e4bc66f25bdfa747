package journal

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) {
	if os.Getenv(childEnv) != "" {
		os.Exit(child())
	}
	goleak.VerifyTestMain(m)
}

var evening = time.Date(2031, 2, 14, 20, 0, 0, 0, time.UTC)

// handClock stands still until a test moves it; its timers fire in advance.
type handClock struct {
	mu     sync.Mutex
	now    time.Duration
	timers map[int]*handTimer
	made   int
}

type handTimer struct {
	due time.Duration
	f   func()
}

func newHandClock() *handClock {
	return &handClock{now: time.Hour, timers: map[int]*handTimer{}}
}

func (c *handClock) Boot() time.Duration {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.now
}

func (c *handClock) Wall() time.Time { return evening.Add(c.Boot() - time.Hour) }

func (c *handClock) AfterFunc(d time.Duration, f func()) func() bool {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.made++
	id := c.made
	c.timers[id] = &handTimer{due: c.now + d, f: f}
	return func() bool {
		c.mu.Lock()
		defer c.mu.Unlock()
		_, waiting := c.timers[id]
		delete(c.timers, id)
		return waiting
	}
}

func (c *handClock) advance(d time.Duration) {
	c.mu.Lock()
	c.now += d
	var ripe []func()
	for id := 1; id <= c.made; id++ {
		if t := c.timers[id]; t != nil && t.due <= c.now {
			ripe = append(ripe, t.f)
			delete(c.timers, id)
		}
	}
	c.mu.Unlock()
	for _, f := range ripe {
		f()
	}
}

// machineClock is the real one, for tests in which the disk sets the pace.
type machineClock struct{ start time.Time }

func (c machineClock) Boot() time.Duration { return time.Since(c.start) }
func (c machineClock) Wall() time.Time     { return time.Now().UTC() }
func (c machineClock) AfterFunc(d time.Duration, f func()) func() bool {
	return time.AfterFunc(d, f).Stop
}

// place is a folder that Open accepts, not yet made.
func place(t testing.TB) string { return filepath.Join(t.TempDir(), "var") }

func mustOpen(t testing.TB, opt Options) *Journal {
	t.Helper()
	if opt.Clock == nil {
		opt.Clock = newHandClock()
	}
	j, err := Open(opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = j.Close() })
	return j
}

func entry(seq uint64, kind string) Entry {
	return Entry{
		Seq: seq, At: evening.Add(time.Duration(seq) * 10 * time.Millisecond), Kind: kind,
		Body: fmt.Appendf(nil, `{"n":%d,"what":"%s"}`, seq, kind),
	}
}

func entries(from, to uint64, kind string) []Entry {
	var es []Entry
	for s := from; s <= to; s++ {
		es = append(es, entry(s, kind))
	}
	return es
}

func must(t testing.TB, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func readAll(t testing.TB, r *Reader, q Query) []Entry {
	t.Helper()
	var got []Entry
	must(t, r.Read(context.Background(), q, func(e Entry) error {
		got = append(got, e)
		return nil
	}))
	return got
}

func same(t testing.TB, got, want []Entry) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%d entries, want %d", len(got), len(want))
	}
	for i := range want {
		g, w := got[i], want[i]
		if g.Seq != w.Seq || !g.At.Equal(w.At) || g.Kind != w.Kind || string(g.Body) != string(w.Body) {
			t.Fatalf("entry %d is %+v, want %+v", i, g, w)
		}
	}
}

func TestAppendFlushRead(t *testing.T) {
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	if s := j.State(); !s.Sound || s.Durable != 0 {
		t.Fatalf("a new record is %+v", s)
	}
	want := append(entries(1, 2500, "aim"), entry(2501, KindDurable), entry(2502, "hold"))
	must(t, j.Append(want[:10]))
	must(t, j.Append(want[10:]))
	if s := j.State(); s.Durable != 0 || s.Queued != 2502 || s.Bytes == 0 {
		t.Fatalf("queued: %+v", s)
	}
	must(t, j.Flush(context.Background()))
	if s := j.State(); s.Durable != 2502 || s.Bytes != 0 || s.Behind != 0 || !s.Sound {
		t.Fatalf("flushed: %+v", s)
	}
	same(t, readAll(t, j.Reader, Query{}), want)
	must(t, j.Close())

	j = mustOpen(t, Options{Dir: dir})
	if s := j.State(); s.Durable != 2502 || s.Queued != 2502 || s.Damage != nil || j.Cut() != nil {
		t.Fatalf("opened again: %+v", s)
	}
	e, ok, err := j.LastOf(context.Background(), KindDurable)
	if err != nil || !ok || e.Seq != 2501 {
		t.Fatalf("newest durable is %v %v %v", e, ok, err)
	}
	if _, ok, err := j.LastOf(context.Background(), "sighting"); ok || err != nil {
		t.Fatalf("a kind that never came: %v %v", ok, err)
	}
	if err := j.Append(entries(2502, 2502, "aim")); !errors.Is(err, ErrOrder) {
		t.Fatalf("a number used again: %v", err)
	}
	must(t, j.Append(entries(2510, 2511, "aim")))
	must(t, j.Flush(context.Background()))
	if e, ok, err := j.Last(context.Background()); err != nil || !ok || e.Seq != 2511 {
		t.Fatalf("last is %v %v %v", e, ok, err)
	}
}
