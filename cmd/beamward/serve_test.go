package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"net"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"beamward/closures/wire"
)

// quickSite makes a folder with the example site, whose lead, tail and waiting
// time are short, so that a whole window passes in a few seconds.
func quickSite(t *testing.T) (dir, config string) {
	t.Helper()
	text, err := os.ReadFile("../../testdata/site/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	dir = t.TempDir()
	config = filepath.Join(dir, "beamward.yaml")
	quick := strings.NewReplacer("lead: 5s, tail: 5s", "lead: 1s, tail: 1s", "reopen_after: 5s", "reopen_after: 1s").Replace(siteCopy(string(text)))
	if err := os.WriteFile(config, []byte(quick), 0o600); err != nil {
		t.Fatal(err)
	}
	return dir, config
}

// windowList closes the beam's direction for a second from from on.
func windowList(from time.Time) string {
	stamp := func(t time.Time) string { return t.UTC().Format("2006-01-02T15:04:05.000Z") }
	return fmt.Sprintf(`closure_list: 1
id: tonight
authority: orbital-desk
issued: %s
covers: {from: %s, until: %s}
unlisted_sky: open
regions:
  - {id: pole, icrs: {ra_deg: 0, dec_deg: -89.5, radius_deg: 0.05}}
windows:
  - {region: pole, closed: {from: %s, until: %s}, ref: A-17}
`, stamp(from.Add(-2*time.Hour)), stamp(from.Add(-time.Hour)), stamp(from.Add(time.Hour)), stamp(from), stamp(from.Add(time.Second)))
}

// post sends a body and returns the status.
func post(t *testing.T, url, mediaType, body string) (int, []byte) {
	t.Helper()
	a, err := http.Post(url, mediaType, strings.NewReader(body))
	if err != nil {
		t.Fatal(err)
	}
	defer a.Body.Close()
	var out bytes.Buffer
	if _, err := out.ReadFrom(a.Body); err != nil {
		t.Fatal(err)
	}
	return a.StatusCode, out.Bytes()
}

// reading is one permit, and when it was asked for and had.
type reading struct {
	wire.Permit
	asked, had time.Time
}

func (p *process) read(t *testing.T) reading {
	t.Helper()
	r := reading{asked: time.Now()}
	a, err := http.Get(p.permit + "/v1/beams/north/permit?nonce=n1")
	if err != nil {
		t.Fatalf("%v; the log:\n%s", err, p.log)
	}
	defer a.Body.Close()
	var body bytes.Buffer
	if _, err := body.ReadFrom(a.Body); err != nil {
		t.Fatal(err)
	}
	r.had = time.Now()
	if r.Permit, err = wire.ParsePermit(body.Bytes()); err != nil {
		t.Fatalf("%v: %s", err, body.Bytes())
	}
	return r
}

func (r *reading) why() string {
	var codes []string
	for _, o := range r.Reasons {
		codes = append(codes, o.Code)
	}
	return strings.Join(codes, " ")
}

// The daemon, fed by plain HTTP, goes from starting to open, is shuttered by
// from - lead - shutter_time - consumer_clock_error of a listed window and
// never later (BW-008), and opens again. A hold that was acknowledged survives
// a kill of the process (BW-012), and the record verifies.
func TestANightOfTheDaemon(t *testing.T) {
	t.Parallel()
	dir, config := quickSite(t)
	p, err := launch(config)
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = p.end(syscall.SIGKILL) }()
	if !strings.Contains(p.first, "api=127.0.0.1:") {
		t.Errorf("the first line of the log names no address: %s", p.first)
	}
	if r := p.read(t); r.State != wire.Shuttered || !strings.Contains(r.why(), "starting") || !r.ValidUntil.Equal(r.IssuedAt) {
		t.Errorf("it began %v (%s), valid until %v from %v", r.State, r.why(), r.ValidUntil, r.IssuedAt)
	}

	// The list goes into the folder as other programs put it there.
	from := time.Now().Add(7 * time.Second).Truncate(time.Second)
	beside := filepath.Join(dir, "tonight.part")
	if err := os.WriteFile(beside, []byte(windowList(from)), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.MkdirAll(filepath.Join(dir, "lists"), 0o700); err != nil {
		t.Fatal(err)
	}
	if err := os.Rename(beside, filepath.Join(dir, "lists", "tonight.yaml")); err != nil {
		t.Fatal(err)
	}
	p.feed(t.Logf)

	// lead 1 s, shutter_time 500 ms, consumer_clock_error 200 ms.
	const margin = time.Second + 500*time.Millisecond + 200*time.Millisecond
	dark := from.Add(-margin)
	var opened, last, shut, again reading
	for deadline := from.Add(patience); again.Beam == ""; time.Sleep(10 * time.Millisecond) {
		r := p.read(t)
		open := r.State == wire.Open
		switch {
		case open && r.ValidUntil.After(dark) && r.asked.Before(from):
			t.Fatalf("a permit is valid until %v, past %v", r.ValidUntil, dark)
		case open && !r.asked.Before(dark) && r.had.Before(from.Add(2*time.Second)):
			t.Fatalf("open at %v, after %v", r.asked, dark)
		case open && opened.Beam == "":
			opened = r
		case !open && opened.Beam != "" && shut.Beam == "":
			shut = r
		case open && shut.Beam != "":
			again = r
		}
		if open && shut.Beam == "" {
			last = r
		}
		if time.Now().After(deadline) {
			t.Fatalf("opened %v, shut %v, again %v; now %v (%s); the log:\n%s", opened.IssuedAt, shut.IssuedAt, again.IssuedAt, r.State, r.why(), p.log)
		}
	}
	if !strings.Contains(shut.why(), "listed-closure") {
		t.Errorf("it was shuttered for %s", shut.why())
	}
	// Not much sooner either: the last permit ran to the end, which the step
	// limit of 100 ms moves forward, since the clock may be off by as much.
	if want := dark.Add(-100 * time.Millisecond); !last.ValidUntil.Equal(want) {
		t.Errorf("the last permit was valid until %v, not %v", last.ValidUntil, want)
	}
	if from := from.Add(time.Second + time.Second + time.Second); again.had.Before(from) {
		t.Errorf("it opened again at %v, before the window, its tail and reopen_after were over at %v", again.had, from)
	}
	t.Logf("open %v before the window began, dark %v before it, open again %v after it began", from.Sub(opened.asked).Round(time.Millisecond), from.Sub(shut.asked).Round(time.Millisecond), again.had.Sub(from).Round(time.Millisecond))

	// A hold closes at once, and stays through a kill.
	status, body := post(t, p.api+"/v1/holds", "application/json", `{"beam":"north","reason":"a visitor on the catwalk"}`)
	if status != http.StatusCreated {
		t.Fatalf("the hold was answered %d: %s", status, body)
	}
	if r := p.read(t); r.State != wire.Shuttered || !strings.Contains(r.why(), "hold") {
		t.Errorf("after the hold was acknowledged the beam is %v (%s)", r.State, r.why())
	}
	var placed struct {
		ID string `json:"id"`
	}
	if err := json.Unmarshal(body, &placed); err != nil {
		t.Fatal(err)
	}
	_ = p.end(syscall.SIGKILL)
	if p, err = launch(config); err != nil {
		t.Fatal(err)
	}
	p.feed(t.Logf)
	if err := p.until("shuttered", "hold"); err != nil {
		t.Fatal(err)
	}
	var holds struct {
		Holds []struct {
			ID     string `json:"id"`
			Reason string `json:"reason"`
		} `json:"holds"`
	}
	if err := get(p.api+"/v1/holds", &holds); err != nil {
		t.Fatal(err)
	}
	if len(holds.Holds) != 1 || holds.Holds[0].ID != placed.ID || holds.Holds[0].Reason != "a visitor on the catwalk" {
		t.Errorf("after the kill there are %+v, not hold %s", holds.Holds, placed.ID)
	}
	if err := p.end(syscall.SIGTERM); err != nil {
		t.Errorf("it ended with %v; the log:\n%s", err, p.log)
	}
	if out, err := exec.Command("beamward", "record", "verify", "--config", config).CombinedOutput(); err != nil {
		t.Errorf("the record does not verify: %v\n%s", err, out)
	}
}

// systemd is told that the daemon is ready, lives and stops, where it asks.
func TestTellsSystemd(t *testing.T) {
	t.Parallel()
	_, config := quickSite(t)
	socket := filepath.Join(t.TempDir(), "notify")
	l, err := net.ListenUnixgram("unixgram", &net.UnixAddr{Name: socket, Net: "unixgram"})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	p, err := launch(config, "NOTIFY_SOCKET="+socket, "WATCHDOG_USEC=400000")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = p.end(syscall.SIGKILL) }()
	next := func() string {
		b := make([]byte, 256)
		if err := l.SetReadDeadline(time.Now().Add(patience)); err != nil {
			t.Fatal(err)
		}
		n, err := l.Read(b)
		if err != nil {
			t.Fatalf("%v; the log:\n%s", err, p.log)
		}
		return string(b[:n])
	}
	if said := next(); said != "READY=1" {
		t.Errorf("first it said %q", said)
	}
	for range 3 {
		if said := next(); said != "WATCHDOG=1" {
			t.Errorf("then it said %q", said)
		}
	}
	if err := p.end(syscall.SIGTERM); err != nil {
		t.Error(err)
	}
	for said := next(); said != "STOPPING=1"; said = next() {
		if said != "WATCHDOG=1" {
			t.Fatalf("at the end it said %q", said)
		}
	}
}

// SIGHUP puts a configuration in force that only tightens. One that loosens or
// cannot be met is told with its keys, and what was in force stays.
func TestHangup(t *testing.T) {
	t.Parallel()
	_, config := quickSite(t)
	p, err := launch(config)
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = p.end(syscall.SIGKILL) }()
	for _, step := range []struct{ old, new, told string }{
		{"elevation_min_deg: 30", "elevation_min_deg: 35", "the configuration was read again"},
		{"elevation_min_deg: 35", "elevation_min_deg: 20", "elevation_min_deg"},
		{"elevation_min_deg: 20", "elevation_min_deg: 95", "make it 0 to 90"},
	} {
		text, err := os.ReadFile(config)
		if err != nil {
			t.Fatal(err)
		}
		changed := strings.Replace(string(text), step.old, step.new, 1)
		if changed == string(text) {
			t.Fatalf("the site has no %q", step.old)
		}
		if err := os.WriteFile(config, []byte(changed), 0o600); err != nil {
			t.Fatal(err)
		}
		if err := p.cmd.Process.Signal(syscall.SIGHUP); err != nil {
			t.Fatal(err)
		}
		for deadline := time.Now().Add(patience); !strings.Contains(p.log.String(), step.told); time.Sleep(10 * time.Millisecond) {
			if time.Now().After(deadline) {
				t.Fatalf("after %s the log does not tell %q:\n%s", step.new, step.told, p.log)
			}
		}
	}
	var b struct {
		Least float64 `json:"elevation_min_deg"`
	}
	if err := get(p.api+"/v1/beams/north", &b); err != nil {
		t.Fatal(err)
	}
	if b.Least != 35 {
		t.Errorf("in force is %v, not 35", b.Least)
	}
	if err := p.end(syscall.SIGTERM); err != nil {
		t.Error(err)
	}
}
