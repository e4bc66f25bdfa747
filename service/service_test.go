package service_test

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"log/slog"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/closures/wire"
	"beamward/service"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/journal"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// site is a running service of the small example site, on ports of its own.
type site struct {
	t    *testing.T
	dir  string
	v    *clock.Virtual
	s    *service.Service
	stop func()
	log  *syncBuffer
}

type syncBuffer struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (b *syncBuffer) Write(p []byte) (int, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.b.Write(p)
}

func (b *syncBuffer) String() string {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.b.String()
}

var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

// example is the text of the example site with its addresses and folder moved.
func example(t *testing.T) []byte {
	t.Helper()
	text, err := os.ReadFile("../testdata/site/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	for _, port := range []string{"8460", "8461", "8470"} {
		text = bytes.ReplaceAll(text, []byte("127.0.0.1:"+port), []byte("127.0.0.1:0"))
	}
	return text
}

func start(t *testing.T, dir string, at time.Time, edit func([]byte) []byte) *site {
	t.Helper()
	text := example(t)
	if edit != nil {
		text = edit(text)
	}
	c, err := config.Parse(text, dir)
	if err != nil {
		t.Fatal(err)
	}
	x := &site{t: t, dir: dir, v: clock.NewVirtual(at), log: &syncBuffer{}}
	x.v.Discipline(true, true, 10*time.Millisecond)
	x.s, err = service.New(t.Context(), service.Options{Config: c, Clock: x.v, Build: "test", Log: slog.New(slog.NewTextHandler(x.log, nil))})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- x.s.Run(ctx) }()
	once := sync.OnceFunc(func() {
		cancel()
		if err := <-done; err != nil {
			t.Errorf("run: %v\n%s", err, x.log)
		}
		if err := x.s.Close(); err != nil {
			t.Errorf("close: %v", err)
		}
		http.DefaultClient.CloseIdleConnections()
	})
	x.stop = once
	t.Cleanup(once)
	return x
}

// call makes one request of the API.
func (x *site) call(method, path, contentType, body string) (int, []byte) {
	x.t.Helper()
	r, err := http.NewRequest(method, "http://"+x.s.Addresses().API+path, strings.NewReader(body))
	if err != nil {
		x.t.Fatal(err)
	}
	if contentType != "" {
		r.Header.Set("Content-Type", contentType)
	}
	answer, err := http.DefaultClient.Do(r)
	if err != nil {
		x.t.Fatal(err)
	}
	defer answer.Body.Close()
	text, err := io.ReadAll(answer.Body)
	if err != nil {
		x.t.Fatal(err)
	}
	return answer.StatusCode, text
}

// permit reads the permit from its own listener.
func (x *site) permit() wire.Permit {
	x.t.Helper()
	answer, err := http.Get("http://" + x.s.Addresses().Permit + "/v1/beams/north/permit?nonce=abc")
	if err != nil {
		x.t.Fatal(err)
	}
	defer answer.Body.Close()
	text, err := io.ReadAll(answer.Body)
	if err != nil {
		x.t.Fatal(err)
	}
	p, err := wire.ParsePermit(text)
	if err != nil {
		x.t.Fatalf("%v: %s", err, text)
	}
	return p
}

// step moves the clock, no faster than the service follows.
func (x *site) step(d time.Duration) {
	x.t.Helper()
	const tick = 20 * time.Millisecond
	for passed := time.Duration(0); passed < d; passed += tick {
		x.v.Advance(tick)
		for waits, deadline := 1, time.Now().Add(20*time.Second); !x.s.CaughtUp(); time.Sleep(50 * time.Microsecond) {
			if waits++; waits%400 == 0 {
				x.v.Advance(time.Millisecond) // a timer that was set meanwhile waits for it
			}
			if time.Now().After(deadline) {
				x.t.Fatalf("the service does not follow the clock at %v; its log:\n%s", x.v.Wall(), x.log)
			}
		}
	}
}

// facts are what a quiet site says.
func (x *site) facts() {
	x.t.Helper()
	now := wire.FormatTime(x.v.Wall())
	body := fmt.Sprintf(`{"kind":"aim","beam":"north","at":%q,"horizon":{"az_deg":150,"el_deg":65},"refracted":false,"error_arcsec":10,"from":"encoder","motion":"fixed"}
{"kind":"interlock","source":"catwalk","at":%q,"safe":true}
`, now, now)
	if code, text := x.call("POST", "/v1/facts", "application/x-ndjson", body); code != 200 || !bytes.Contains(text, []byte(`"refused_total":0`)) {
		x.t.Fatalf("facts: %d %s", code, text)
	}
}

// list is a closure list that leaves all open but a window about now.
func list(id string, at time.Time, windows ...[2]time.Duration) string {
	text := fmt.Sprintf("closure_list: 1\nid: %s\nauthority: orbital-desk\nissued: %s\ncovers: {from: %s, until: %s}\nunlisted_sky: open\nwindow_count: %d\n",
		id, wire.FormatTime(at.Add(-time.Hour)), wire.FormatTime(at.Add(-2*time.Hour)), wire.FormatTime(at.Add(12*time.Hour)), len(windows))
	text += "regions:\n  - {id: east, horizon: {az_from_deg: 140, az_to_deg: 160, el_from_deg: 40, el_to_deg: 80, observed: false}}\nwindows:\n"
	for _, w := range windows {
		text += fmt.Sprintf("  - {region: east, closed: {from: %s, until: %s}}\n", wire.FormatTime(at.Add(w[0])), wire.FormatTime(at.Add(w[1])))
	}
	return text
}

// From starting to open to shuttered by a listed window, never late, and open
// again; a hold survives a stop without an end; the record verifies. BW-012
func TestTheMainJob(t *testing.T) {
	dir := t.TempDir()
	x := start(t, dir, evening, nil)
	if p := x.permit(); p.State != wire.Shuttered {
		t.Fatalf("open at the start: %+v", p)
	}
	x.step(100 * time.Millisecond)
	if code, text := x.call("POST", "/v1/lists", "application/yaml", list("l-1", evening, [2]time.Duration{30 * time.Second, 40 * time.Second})); code != 200 && code != 201 && code != 202 {
		t.Fatalf("list: %d %s", code, text)
	}
	opened, shut := time.Time{}, time.Time{}
	var again time.Time
	for x.v.Wall().Before(evening.Add(70 * time.Second)) {
		x.facts()
		x.step(500 * time.Millisecond)
		p := x.permit()
		switch {
		case p.State == wire.Open && opened.IsZero():
			opened = p.IssuedAt
		case p.State == wire.Shuttered && !opened.IsZero() && shut.IsZero():
			shut = p.IssuedAt
		case p.State == wire.Open && !shut.IsZero() && again.IsZero():
			again = p.IssuedAt
		}
		if p.State == wire.Open {
			// from 30 s, less lead 5 s, shutter_time 0.5 s, consumer_clock_error 0.2 s.
			limit := evening.Add(30*time.Second - 5*time.Second - 700*time.Millisecond)
			if p.IssuedAt.Before(limit) && p.ValidUntil.After(limit) {
				t.Fatalf("valid until %v, past %v", p.ValidUntil, limit)
			}
		}
	}
	if opened.IsZero() || shut.IsZero() || again.IsZero() {
		_, text := x.call("GET", "/v1/beams/north", "", "")
		t.Fatalf("opened %v, shut %v, again %v: %s\n%s", opened, shut, again, text, x.log)
	}
	t.Logf("opened after %v, shut at %v, open again at %v", opened.Sub(evening), shut.Sub(evening), again.Sub(evening))
	if s := shut.Sub(evening); s > 24800*time.Millisecond {
		t.Errorf("shuttered at %v", s)
	}
	if a := again.Sub(evening); a < 45*time.Second {
		t.Errorf("open again at %v, before the window and its tail were over", a)
	}
	if code, text := x.call("POST", "/v1/holds", "application/json", `{"beam":"*","reason":"people on the roof","order":"site"}`); code != 201 && code != 200 {
		t.Fatalf("hold: %d %s", code, text)
	}
	if p := x.permit(); p.State != wire.Shuttered {
		t.Fatal("open under a hold")
	}
	x.stop()

	y := start(t, dir, x.v.Wall().Add(time.Second), nil)
	for range 30 {
		y.facts()
		y.step(500 * time.Millisecond)
	}
	p := y.permit()
	if p.State != wire.Shuttered || len(p.Reasons) != 2 || p.Reasons[0].Code != "hold" || p.Reasons[1].Code != "reopening" {
		text, _ := json.Marshal(p)
		t.Fatalf("after a restart: %s", text)
	}
	y.stop()
	r, err := journal.OpenReader(filepath.Join(dir, "var"))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	report, err := r.Verify(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%+v", report)
}
