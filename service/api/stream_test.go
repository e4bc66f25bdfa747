package api

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"net"
	"net/http"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// reader reads the stream's events.
type reader struct {
	t      testing.TB
	lines  *bufio.Scanner
	close  func()
	status int
}

type streamed struct {
	id, name string
	data     []byte
}

func (s *site) stream(who, last string) *reader {
	s.t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second)
	r, err := http.NewRequestWithContext(ctx, "GET", s.url+"/v1/stream", nil)
	if err != nil {
		s.t.Fatal(err)
	}
	r.Header.Set("Authorization", "Bearer "+s.tokens[who])
	if last != "" {
		r.Header.Set("Last-Event-ID", last)
	}
	// A stream may come before the hub has taken its first view.
	var out *http.Response
	for {
		if out, err = s.client.Do(r); err != nil {
			s.t.Fatal(err)
		}
		if out.StatusCode != http.StatusServiceUnavailable {
			break
		}
		out.Body.Close()
	}
	end := func() { cancel(); out.Body.Close() }
	s.t.Cleanup(end)
	lines := bufio.NewScanner(out.Body)
	lines.Buffer(nil, 16<<20)
	return &reader{t: s.t, lines: lines, close: end, status: out.StatusCode}
}

// next returns the next event; false at the end.
func (r *reader) next() (e streamed, more bool) {
	for r.lines.Scan() {
		line := r.lines.Text()
		name, value, _ := strings.Cut(line, ": ")
		switch {
		case line == "" && e.name != "":
			return e, true
		case name == "id":
			e.id = value
		case name == "event":
			e.name = value
		case name == "data":
			e.data = []byte(value)
		}
	}
	return e, false
}

// want reads to the next event of a name, passing over views.
func (r *reader) want(name string) streamed {
	r.t.Helper()
	for {
		e, more := r.next()
		if !more {
			r.t.Fatalf("the stream ended before %s", name)
		}
		if e.name == name {
			return e
		}
		if e.name != "view" {
			r.t.Fatalf("got %s %s, want %s", e.name, e.data, name)
		}
	}
}

func (e streamed) into(t testing.TB, v any) {
	t.Helper()
	if err := json.Unmarshal(e.data, v); err != nil {
		t.Fatalf("%s: %v", e.data, err)
	}
}

// A stream outlives every bound that other requests have.
func TestAStreamGoesOn(t *testing.T) {
	s := newSite(t, func(o *Options) {
		o.Limits.BodyTime, o.Limits.Answer, o.Limits.Heartbeat = 50*time.Millisecond, 50*time.Millisecond, 10*time.Millisecond
	})
	r := s.stream("eve", "")
	beats := 0
	for start := time.Now(); time.Since(start) < 700*time.Millisecond && r.lines.Scan(); {
		if r.lines.Text() == ": still here" {
			beats++
		}
	}
	if r.lines.Err() != nil || beats == 0 {
		t.Errorf("the stream ended: %v", r.lines.Err())
	}
	s.place(1)
	r.want("decision")
	r.want("hold")
}

func TestTheStreamTellsChangesAtOnce(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	s.settled()
	r := s.stream("eve", "")
	first, _ := r.next()
	var v viewDoc
	first.into(t, &v)
	if first.name != "view" || len(v.Beams) != 2 || !strings.HasPrefix(first.id, "boot-1.") {
		t.Fatalf("the first event is %s %s", first.name, first.id)
	}
	var h holdDoc
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"smoke"}`).into(t, &h)
	var d beamState
	r.want("decision").into(t, &d)
	if d.Beam != "north" || d.State != wire.Shuttered || len(d.Reasons) == 0 || d.Reasons[0].Code != "hold" {
		t.Errorf("decision %+v", d)
	}
	var hc holdChange
	r.want("hold").into(t, &hc)
	if hc.Change != "placed" || hc.Hold.ID != h.ID {
		t.Errorf("hold %+v", hc)
	}
	s.want(201, "ann", "POST", "/v1/lists", listText("quick-desk", "A", openDome), yaml)
	var lc listChange
	r.want("list").into(t, &lc)
	if lc.Change != "came" || lc.List.ID != "A" || lc.List.Status != "in-force" {
		t.Errorf("list %+v", lc)
	}
	s.want(200, "ann", "POST", "/v1/lists/quick-desk/A/withdraw", "")
	r.want("list").into(t, &lc)
	if lc.Change != "changed" || lc.List.Status != "withdrawn" {
		t.Errorf("list %+v", lc)
	}
	s.want(200, "ann", "POST", "/v1/holds/"+string(h.ID)+"/release", "")
	released := false
	for !released {
		e, more := r.next()
		if !more {
			t.Fatal("the stream ended")
		}
		if e.name == "hold" {
			e.into(t, &hc)
			released = hc.Change == "released"
		}
	}
}

// place places n holds, numbered on from those that there are.
func (s *site) place(n int) {
	s.t.Helper()
	for range n {
		if err := s.stage.apply(closures.HoldPlaced{ID: closures.HoldID(fmt.Sprintf("h%d", len(s.stage.View().Holds))), Beam: "north", Reason: "test", By: "ann", Placed: evening}); err != nil {
			s.t.Fatal(err)
		}
	}
}

func TestTheStreamResumes(t *testing.T) {
	s := newSite(t)
	r := s.stream("eve", "")
	if e, _ := r.next(); e.name != "view" {
		t.Fatalf("first %s", e.name)
	}
	s.place(1)
	r.want("decision")
	last := r.want("hold")
	r.close()
	s.place(5)
	s.settled()
	r = s.stream("eve", last.id)
	for i := range 5 {
		e, _ := r.next()
		var hc holdChange
		e.into(t, &hc)
		if want := fmt.Sprintf("h%d", i+1); e.name != "hold" || string(hc.Hold.ID) != want {
			t.Fatalf("event %d after the last is %s %s, want %s", i, e.name, hc.Hold.ID, want)
		}
	}
	e, _ := r.next()
	if e.name != "view" {
		t.Fatalf("after what was missed comes %s", e.name)
	}
	// One that has read everything starts with the view, too.
	id := e.id
	r.close()
	r = s.stream("eve", id)
	if e, _ := r.next(); e.name != "view" || e.id != id {
		t.Fatalf("nothing was missed, and %s %s comes", e.name, e.id)
	}
}

// settled waits until the hub has taken the newest view.
func (s *site) settled() {
	lag := func() bool {
		s.api.hub.mu.Lock()
		defer s.api.hub.mu.Unlock()
		return s.api.hub.view != s.stage.View()
	}
	for lag() {
		time.Sleep(time.Millisecond)
	}
}

func TestTheStreamSaysReset(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Ring = 8 })
	s.stream("eve", "").next()
	s.place(200)
	s.settled()
	for _, last := range []string{"boot-1.1", "boot-0.5", "boot-1.99999999", "boot-1", "boot-1.", "boot-1.-1", "boot-1.x", ".", "nonsense", "boot-1.18446744073709551615"} {
		r := s.stream("eve", last)
		e, _ := r.next()
		next, _ := r.next()
		if e.name != "reset" || next.name != "view" || next.id != e.id {
			t.Errorf("after %q come %s and %s", last, e.name, next.name)
		}
		r.close()
	}
}

func TestOldDecisionsAreTakenDownFromTheStream(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	s.settled()
	r := s.stream("eve", "")
	r.next()
	s.stage.advance(time.Second) // and nobody decides
	var d beamState
	r.want("decision").into(t, &d)
	if d.State != wire.Shuttered || d.Reasons[0].Code != "fault" {
		t.Errorf("decision %+v", d)
	}
	s.stage.steady(t, 1)
	for {
		e, more := r.next()
		if !more {
			t.Fatal("the stream ended")
		}
		if e.name != "decision" {
			continue
		}
		if e.into(t, &d); len(d.Reasons) == 0 || d.Reasons[0].Code != "fault" {
			return // the next decision is shown as it is
		}
	}
}

func TestASlowReaderIsCutOff(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Ring, o.Limits.Stall = 64, 100*time.Millisecond })
	s.stream("eve", "").next() // the hub runs
	c, err := net.Dial("tcp", strings.TrimPrefix(s.url, "http://"))
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	fmt.Fprintf(c, "GET /v1/stream HTTP/1.1\r\nHost: localhost\r\nAuthorization: Bearer %s\r\n\r\n", s.tokens["eve"])
	streams := func() int {
		s.api.clients.mu.Lock()
		defer s.api.clients.mu.Unlock()
		return s.api.clients.streams
	}
	for streams() < 2 {
		time.Sleep(time.Millisecond)
	}
	// It reads nothing. What it does not take fills its socket, then a write
	// stalls, or the ring runs past it.
	quick := s.stream("ann", "")
	quick.next()
	done := make(chan struct{})
	go func() {
		defer close(done)
		for {
			if _, more := quick.next(); !more {
				return
			}
		}
	}()
	for i := 0; streams() > 2; i++ {
		if i == 20_000 {
			t.Fatal("it is not cut off")
		}
		if err := s.stage.apply(closures.HoldPlaced{ID: "x", Beam: "north", Reason: strings.Repeat("long ", 100), By: "ann", Placed: evening}); err == nil {
			_ = s.stage.apply(closures.HoldReleased{ID: "x", By: "ann"})
		}
	}
	quick.close()
	<-done
}

func TestStreamsAreBounded(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Mine, o.Limits.Streams = 2, 3 })
	s.stream("eve", "").next()
	s.stream("eve", "").next()
	if r := s.stream("eve", ""); r.status != 429 {
		t.Errorf("a third stream of one client: %d", r.status)
	}
	s.stream("ann", "").next()
	a := s.want(503, "ben", "GET", "/v1/stream", "")
	if a.header.Get("Retry-After") == "" {
		t.Error("no Retry-After")
	}
}

func TestAStreamEndsWithItsToken(t *testing.T) {
	s := newSite(t)
	r := s.stream("eve", "")
	r.next()
	if err := s.file.Revoke("eve"); err != nil {
		t.Fatal(err)
	}
	for {
		if _, more := r.next(); !more {
			return
		}
	}
}

func TestAStreamHasAHeartbeat(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Heartbeat = time.Millisecond })
	r := s.stream("eve", "")
	for r.lines.Scan() {
		if r.lines.Text() == ": still here" {
			return
		}
	}
	t.Error("the stream ended without a heartbeat")
}

func TestWithoutAFeederThereIsNoStream(t *testing.T) {
	s := newSite(t)
	s.stream("eve", "").next()
	s.api.hub.set(false)
	s.want(503, "eve", "GET", "/v1/stream", "")
}
