package client_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service"
	"beamward/service/access"
	"beamward/service/client"
	"beamward/service/config"
)

// recorder keeps the last answer, to hold it against what was made of it.
type recorder struct {
	http.Transport
	mu   sync.Mutex
	last []byte
}

func (r *recorder) RoundTrip(q *http.Request) (*http.Response, error) {
	out, err := r.Transport.RoundTrip(q)
	if err != nil || !strings.HasPrefix(out.Header.Get("Content-Type"), "application/json") {
		return out, err
	}
	data, err := io.ReadAll(out.Body)
	out.Body.Close()
	out.Body = io.NopCloser(bytes.NewReader(data))
	r.mu.Lock()
	defer r.mu.Unlock()
	r.last = data
	return out, err
}

// site is a running service and clients of several people.
type site struct {
	t      testing.TB
	s      *service.Service
	tokens map[string]string
	url    string
}

// started runs the small example site with tokens, on the machine's own clock.
func started(t testing.TB) *site {
	t.Helper()
	dir := t.TempDir()
	text, err := os.ReadFile("../../testdata/site/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	for old, repl := range map[string]string{"127.0.0.1:8460": "127.0.0.1:0", "127.0.0.1:8461": "127.0.0.1:0", "reopen_after: 5s": "reopen_after: 200ms", "loosening: at-once, folder: lists": "loosening: second-person"} {
		if !bytes.Contains(text, []byte(old)) {
			t.Fatalf("the example site has no %q", old)
		}
		text = bytes.ReplaceAll(text, []byte(old), []byte(repl))
	}
	text = append(text, "\naccess: {tokens_file: tokens}\n"...)
	x := &site{t: t, tokens: map[string]string{}}
	file := access.TokenFile(filepath.Join(dir, "tokens"))
	for name, role := range map[string]access.Role{"ann": access.Operate, "ben": access.Operate, "eve": access.Read, "bus": access.Feed} {
		var sources []closures.Source
		if role == access.Feed {
			sources = []closures.Source{"north", "catwalk"}
		}
		secret, err := file.Add(name, role, sources, time.Now())
		if err != nil {
			t.Fatal(err)
		}
		x.tokens[name] = secret.Reveal()
	}
	c, err := config.Parse(text, dir)
	if err != nil {
		t.Fatal(err)
	}
	if x.s, err = service.New(t.Context(), service.Options{Config: c, Build: "test"}); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- x.s.Run(ctx) }()
	t.Cleanup(func() {
		cancel()
		if err := <-done; err != nil {
			t.Errorf("run: %v", err)
		}
		if err := x.s.Close(); err != nil {
			t.Errorf("close: %v", err)
		}
	})
	x.url = "http://" + x.s.Addresses().API
	return x
}

// as returns a client of somebody, and what it was answered last.
func (x *site) as(who string) (*client.Client, *recorder) {
	x.t.Helper()
	r := &recorder{}
	c, err := client.New(client.Options{Server: x.url, Token: x.tokens[who], Transport: r})
	if err != nil {
		x.t.Fatal(err)
	}
	x.t.Cleanup(r.CloseIdleConnections)
	return c, r
}

// must fails the test on an error, and where the answer holds what the client
// has no place for.
func must[T any](t *testing.T, r *recorder, v T, err error) T {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	if r == nil {
		return v
	}
	r.mu.Lock()
	defer r.mu.Unlock()
	strict := json.NewDecoder(bytes.NewReader(r.last))
	strict.DisallowUnknownFields()
	if err := strict.Decode(reflect.New(reflect.TypeOf(v)).Interface()); err != nil {
		t.Errorf("%T: %v", v, err)
	}
	return v
}

// say tells what a quiet site says.
func say(t *testing.T, c *client.Client) {
	t.Helper()
	now := wire.FormatTime(time.Now())
	out, err := c.Facts(t.Context(), strings.NewReader(fmt.Sprintf(`{"kind":"aim","beam":"north","at":%q,"horizon":{"az_deg":150,"el_deg":65},"refracted":false,"error_arcsec":10,"from":"encoder","motion":"fixed"}
{"kind":"interlock","source":"catwalk","at":%q,"safe":true}
`, now, now)))
	if err != nil || out.Accepted != 2 || out.RefusedTotal != 0 {
		t.Fatalf("facts: %+v %v", out, err)
	}
}

// list is a closure list over a day about now with a window an hour ahead.
func list(id string) string {
	now := time.Now().UTC().Truncate(time.Second)
	return fmt.Sprintf(`closure_list: 1
id: %s
authority: orbital-desk
issued: %s
covers: {from: %s, until: %s}
unlisted_sky: open
regions:
  - {id: east, horizon: {az_from_deg: 140, az_to_deg: 160, el_from_deg: 40, el_to_deg: 80, observed: false}}
windows:
  - {region: east, closed: {from: %s, until: %s}, ref: A-17}
`, id, wire.FormatTime(now.Add(-time.Hour)), wire.FormatTime(now.Add(-12*time.Hour)), wire.FormatTime(now.Add(12*time.Hour)), wire.FormatTime(now.Add(time.Hour)), wire.FormatTime(now.Add(time.Hour+time.Minute)))
}

// Everything that the client can ask, of a service that runs.
func TestAgainstARunningService(t *testing.T) {
	x := started(t)
	ctx := t.Context()
	ann, annSaw := x.as("ann")
	ben, _ := x.as("ben")
	eve, eveSaw := x.as("eve")
	bus, _ := x.as("bus")

	// The stream is read beside all that follows.
	streaming, stop := context.WithCancel(ctx)
	var mu sync.Mutex
	var names []string
	var view client.View
	streamed := make(chan error, 1)
	go func() {
		streamed <- eve.Stream(streaming, "", func(e client.Event) error {
			mu.Lock()
			defer mu.Unlock()
			if names = append(names, e.Name); e.Name != "view" {
				return nil
			}
			d := json.NewDecoder(bytes.NewReader(e.Data))
			d.DisallowUnknownFields()
			return d.Decode(&view)
		})
	}()

	for there := false; !there; time.Sleep(time.Millisecond) {
		mu.Lock()
		there = len(names) > 0
		mu.Unlock()
	}

	beams, err := eve.Beams(ctx)
	must(t, eveSaw, beams, err)
	if len(beams.Beams) != 1 || beams.Beams[0].Now.State != wire.Shuttered {
		t.Errorf("at the start %+v", beams)
	}
	check, err := ann.CheckList(ctx, strings.NewReader(list("l-1")), "")
	if must(t, annSaw, check, err); check.Class != "loosening" || check.Windows != 1 || len(check.RegionList) != 1 {
		t.Errorf("checked %+v", check)
	}
	added, err := ann.AddList(ctx, strings.NewReader(list("l-1")), "yaml", "k-1")
	if must(t, annSaw, added, err); added.Status != "waiting" || added.Needs != "second-person" {
		t.Errorf("added %+v", added)
	}
	_, err = ann.ConfirmList(ctx, "orbital-desk", "l-1", added.Digest)
	var p *client.Problem
	if !errors.As(err, &p) || p.Status != 409 || p.Mend() == "" {
		t.Errorf("the first person confirmed: %v", err)
	}
	if confirmed, err := ben.ConfirmList(ctx, "orbital-desk", "l-1", added.Digest); err != nil || confirmed.Status != "in-force" || confirmed.Confirmed != "ben" {
		t.Errorf("confirmed %+v %v", confirmed, err)
	}

	// It opens once everything was heard, and not before.
	var lease client.Lease
	for deadline := time.Now().Add(20 * time.Second); !lease.Open(time.Now()); {
		say(t, bus)
		time.Sleep(20 * time.Millisecond) // a client has a budget
		if lease, err = eve.Permit(ctx, "north"); err != nil {
			t.Fatal(err)
		}
		if time.Now().After(deadline) {
			t.Fatalf("it does not open: %s", lease.JSON)
		}
		// A busy machine may decide late, which asks for a person.
		if slices.ContainsFunc(lease.Reasons, func(r wire.Reason) bool { return r.Code == "rearm" }) {
			if _, err := ann.Rearm(ctx, "north", "", ""); err != nil {
				t.Fatal(err)
			}
		}
	}
	if lease.Open(lease.Sent.Add(3 * time.Second)) {
		t.Error("the lease does not end")
	}
	say(t, bus)
	beam, err := eve.Beam(ctx, "north")
	if must(t, eveSaw, beam, err); beam.ETag == "" || beam.Now.Seq < lease.Seq {
		t.Errorf("after it opened: %+v", beam)
	}
	aim, err := eve.Aim(ctx, "north")
	if must(t, eveSaw, aim, err); !aim.Known || aim.Horizon == nil || aim.Horizon.Az != 150 && (aim.Horizon.Az < 149.99 || aim.Horizon.Az > 150.01) {
		t.Errorf("aim %+v", aim)
	}
	outlook, err := eve.Outlook(ctx, "north", 2)
	must(t, eveSaw, outlook, err)
	if !outlook.AimKnown || !slices.ContainsFunc(outlook.Closures, func(c client.Closure) bool { return c.Ref == "A-17" || c.Region == "east" }) {
		t.Errorf("outlook %+v", outlook)
	}
	sources, err := eve.Sources(ctx)
	if must(t, eveSaw, sources, err); len(sources.Sources) != 1 || sources.Sources[0].State != "heard" {
		t.Errorf("sources %+v", sources)
	}
	if _, err := eve.Exposure(ctx, "north", 45); err != nil {
		t.Error(err)
	}
	if ready, err := eve.Ready(ctx); err != nil || !ready.Ready {
		t.Errorf("ready %+v %v", ready, err)
	}
	if _, err := eve.Aircraft(ctx); err != nil {
		t.Error(err)
	}
	if _, err := eve.Neighbours(ctx); err != nil {
		t.Error(err)
	}

	// A hold shutters at once.
	hold, err := eve.PlaceHold(ctx, client.NewHold{Beam: closures.EveryBeam, Reason: "smoke"}, "h-1")
	must(t, eveSaw, hold, err)
	if lease, err = eve.Permit(ctx, "north"); err != nil || lease.State != wire.Shuttered || lease.Open(time.Now()) {
		t.Errorf("open under a hold: %s %v", lease.JSON, err)
	}
	again, err := eve.PlaceHold(ctx, client.NewHold{Beam: closures.EveryBeam, Reason: "smoke"}, "h-1")
	if err != nil || again.ID != hold.ID {
		t.Errorf("the same key placed another hold: %+v %v", again, err)
	}
	holds, err := ann.Holds(ctx)
	if err != nil || len(holds) != 1 || holds[0].By != "eve" {
		t.Errorf("holds %+v %v", holds, err)
	}
	if err := eve.ReleaseHold(ctx, hold.ID, "", ""); !errors.As(err, &p) || p.Status != 403 {
		t.Errorf("a reader released: %v", err)
	}
	if err := ann.ReleaseHold(ctx, hold.ID, "", hold.ETag); err != nil {
		t.Error(err)
	}
	if states, err := ann.Rearm(ctx, "north", "all clear", ""); err != nil || len(states) != 1 {
		t.Errorf("re-armed %+v %v", states, err)
	}

	// Lists, closures, plans, the record.
	lists, err := eve.Lists(ctx, client.ListQuery{Status: "in-force"})
	if err != nil || len(lists) != 1 || lists[0].Digest != added.Digest {
		t.Errorf("lists %+v %v", lists, err)
	}
	one, err := eve.List(ctx, "orbital-desk", "l-1")
	must(t, eveSaw, one, err)
	var text bytes.Buffer
	if err := eve.ListText(ctx, "orbital-desk", "l-1", "csv", &text); err != nil || !strings.HasPrefix(text.String(), "# closure_list: 1") {
		t.Errorf("list %v %s", err, text.String())
	}
	closed, err := eve.Closures(ctx, client.ClosuresQuery{Beam: "north"})
	if err != nil || len(closed) == 0 {
		t.Errorf("closures %+v %v", closed, err)
	}
	text.Reset()
	if err := eve.ClosuresText(ctx, client.ClosuresQuery{}, "ics", &text); err != nil || !strings.HasPrefix(text.String(), "BEGIN:VCALENDAR\r\n") {
		t.Errorf("closures %v %s", err, text.String())
	}
	var targets []client.Target
	head, err := eve.Plan(ctx, client.PlanQuery{Beam: "north"}, strings.NewReader("\nname,ra_deg,dec_deg\na,150.1,2.2\nb,10,-30\n"), func(o client.Target) error {
		targets = append(targets, o)
		return nil
	})
	if err != nil || len(targets) != 2 || targets[1].Name != "b" || head.Beam != "north" || len(head.LeftOut) == 0 {
		t.Errorf("plan %+v %+v %v", head, targets, err)
	}
	text.Reset()
	if err := eve.PlanText(ctx, client.PlanQuery{Beam: "north"}, strings.NewReader(`[{"name":"a","ra_deg":150.1,"dec_deg":2.2}]`), "csv", &text); err != nil || !strings.Contains(text.String(), "north,a,") {
		t.Errorf("plan %v %s", err, text.String())
	}
	var kinds []string
	if err := eve.Record(ctx, client.RecordQuery{}, func(e client.Entry) error { kinds = append(kinds, e.Kind); return nil }); err != nil || len(kinds) < 20 {
		t.Errorf("record: %d entries, %v", len(kinds), err)
	}
	withdrawn, err := ann.WithdrawList(ctx, "orbital-desk", "l-1", "T 12")
	if err != nil || withdrawn.Withdrawal != "ann" || withdrawn.Status != "in-force" {
		t.Errorf("withdrawn %+v %v", withdrawn, err)
	}
	if _, err := ben.ConfirmList(ctx, "orbital-desk", "l-1", added.Digest); !errors.As(err, &p) || p.Status != 409 {
		t.Errorf("a withdrawal was confirmed by who meant the list: %v", err)
	}

	for deadline := time.Now().Add(10 * time.Second); ; time.Sleep(10 * time.Millisecond) {
		mu.Lock()
		seen := slices.Contains(names, "decision") && slices.Contains(names, "hold") && slices.Contains(names, "list") && view.BootID != "" && len(view.Lists) == 1
		if !seen && time.Now().After(deadline) {
			t.Fatalf("the stream told only %q, and last %+v", names, view)
		}
		mu.Unlock()
		if seen {
			break
		}
	}
	stop()
	if err := <-streamed; !errors.Is(err, context.Canceled) {
		t.Errorf("stream: %v", err)
	}
}
