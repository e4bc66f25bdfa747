package feed

import (
	"fmt"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/closures"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// wallClock is the machine's own, which is the same within a synctest bubble.
type wallClock struct{ began time.Time }

func newWallClock() wallClock { return wallClock{time.Now()} }

func (wallClock) Wall() time.Time       { return time.Now().UTC().Round(0) }
func (c wallClock) Boot() time.Duration { return time.Since(c.began) }
func (wallClock) Timer(d time.Duration) (<-chan struct{}, func() bool) {
	fired := make(chan struct{}, 1)
	return fired, time.AfterFunc(d, func() { fired <- struct{}{} }).Stop
}

// handed is a fact that a feed handed to intake.
type handed struct {
	from closures.Source
	body closures.Body
}

// inbox is an intake that a test can fill, and look into.
type inbox struct {
	mu      sync.Mutex
	answers []error // given first, one a fact
	got     chan handed
}

func newInbox() *inbox { return &inbox{got: make(chan handed, 1000)} }

func (i *inbox) take(from closures.Source, body closures.Body) error {
	i.mu.Lock()
	var err error
	if len(i.answers) > 0 {
		err, i.answers = i.answers[0], i.answers[1:]
	}
	i.mu.Unlock()
	if err == nil {
		i.got <- handed{from, body}
	}
	return err
}

func (i *inbox) answer(err error, times int) {
	i.mu.Lock()
	defer i.mu.Unlock()
	for range times {
		i.answers = append(i.answers, err)
	}
}

// patience is how long a test waits for what must come. It is no measure: only
// a failure takes so long.
const patience = 20 * time.Second

func (i *inbox) next(t *testing.T) handed {
	t.Helper()
	select {
	case h := <-i.got:
		return h
	case <-time.After(patience):
		t.Fatal("no fact came")
	}
	return handed{}
}

func (i *inbox) none(t *testing.T) {
	t.Helper()
	select {
	case h := <-i.got:
		t.Fatalf("a fact came: %+v", h)
	default:
	}
}

// until waits for what another goroutine does.
func until(t *testing.T, what string, is func() bool) {
	t.Helper()
	for end := time.Now().Add(patience); !is(); time.Sleep(time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("never: %s", what)
		}
	}
}

var errFull = closures.Errorf(closures.Busy, "try again", "full")

func stamp(at time.Time) string { return at.UTC().Format("2006-01-02T15:04:05.000Z") }

func interlockLine(source string) string {
	return fmt.Sprintf(`{"kind":"interlock","source":%q,"at":%q,"safe":true}`, source, stamp(time.Now()))
}

func aircraftLine(source, address string) string {
	return fmt.Sprintf(`{"kind":"aircraft","source":%q,"at":%q,"aircraft":%q,"lat_deg":-31.2,"lon_deg":-4,"altitude_m":9000,"altitude_from":"ellipsoid"}`,
		source, stamp(time.Now()), address)
}

// notices collects what operators are told.
type notices struct {
	mu  sync.Mutex
	all []string
}

func (n *notices) tell(text string, args ...any) {
	n.mu.Lock()
	defer n.mu.Unlock()
	n.all = append(n.all, fmt.Sprint(append([]any{text}, args...)...))
}

func (n *notices) count() int {
	n.mu.Lock()
	defer n.mu.Unlock()
	return len(n.all)
}

func (n *notices) text() string {
	n.mu.Lock()
	defer n.mu.Unlock()
	return fmt.Sprint(n.all)
}
