package client

import (
	"context"
	"crypto/ed25519"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/closures"
	"beamward/closures/wire"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// issuer is a service that issues permits as its test wants them.
type issuer struct {
	key    ed25519.PrivateKey
	permit wire.Permit
	change func(*wire.Permit)          // before it is signed
	after  func([]byte, string) []byte // of the answer
}

func newIssuer(t *testing.T) (*issuer, *Client) {
	t.Helper()
	_, key, err := ed25519.GenerateKey(nil)
	if err != nil {
		t.Fatal(err)
	}
	now := time.Now().UTC()
	zero := closures.Digest{}.String()
	i := &issuer{key: key, permit: wire.Permit{
		Beam: "north", State: wire.Open, Seq: 7, BootID: "boot-1", IssuedAt: now, ValidUntil: now.Add(2 * time.Second), LeaseMS: 2000,
		Reasons: []wire.Reason{}, Cautions: []wire.Caution{}, Inputs: []wire.Input{}, RulesDigest: zero, ListsDigest: zero,
	}}
	return i, serve(t, i)
}

func serve(t *testing.T, h http.Handler) *Client {
	t.Helper()
	s := httptest.NewServer(h)
	t.Cleanup(s.Close)
	c, err := New(Options{Server: s.URL})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(c.Close)
	return c
}

func (i *issuer) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	if r.URL.Path == "/v1/permit-key" {
		_, _ = w.Write(wire.JWK(i.key.Public().(ed25519.PublicKey)))
		return
	}
	p := i.permit
	p.Nonce = r.URL.Query().Get("nonce")
	if i.change != nil {
		i.change(&p)
	}
	p.Signed = wire.Sign(wire.PayloadOf(&p), "k", func(b []byte) []byte { return ed25519.Sign(i.key, b) })
	body := wire.AppendPermit(nil, &p)
	if i.after != nil {
		body = i.after(body, p.Signed)
	}
	_, _ = w.Write(body)
}

func TestAPermitThatIsRightIsALease(t *testing.T) {
	_, c := newIssuer(t)
	l, err := c.Permit(t.Context(), "north")
	if err != nil {
		t.Fatal(err)
	}
	if !l.Open(time.Now()) || l.Seq != 7 || l.Sent.IsZero() {
		t.Errorf("%+v", l)
	}
}

// BW-008, on the reader's side: whichever clock ends the lease first ends it.
func TestALeaseEnds(t *testing.T) {
	_, c := newIssuer(t)
	l, err := c.Permit(t.Context(), "north")
	if err != nil {
		t.Fatal(err)
	}
	for name, now := range map[string]time.Time{
		"two seconds on":                  l.Sent.Add(2 * time.Second),
		"a day on":                        l.Sent.Add(24 * time.Hour),
		"before it was asked for":         l.Sent.Add(-time.Second),
		"long before, by the wall clock":  l.IssuedAt.Add(-time.Hour),
		"past its end, by the wall clock": l.ValidUntil,
		"never":                           {},
	} {
		if l.Open(now) {
			t.Errorf("open %s", name)
		}
	}
	if (&Lease{}).Open(time.Now()) {
		t.Error("the zero lease is open")
	}
	long := l
	long.ValidUntil = l.IssuedAt.Add(time.Hour) // valid by UTC, and its lease has run out
	if long.Open(l.Sent.Add(2 * time.Second)) {
		t.Error("open past the lease from the sending")
	}
	unsent := l
	unsent.Sent = time.Time{}
	if unsent.Open(time.Now()) {
		t.Error("open without a time of sending")
	}
}

func TestAPermitThatIsWrongIsNone(t *testing.T) {
	for name, c := range map[string]struct {
		change func(*wire.Permit)
		after  func([]byte, string) []byte
		closed bool // a permit, and not open
	}{
		"another beam":          {change: func(p *wire.Permit) { p.Beam = "south" }},
		"another nonce":         {change: func(p *wire.Permit) { p.Nonce = "x" }},
		"no nonce":              {change: func(p *wire.Permit) { p.Nonce = "" }},
		"open with a reason":    {change: func(p *wire.Permit) { p.Reasons = []wire.Reason{{Code: "hold"}} }},
		"longer than its lease": {change: func(p *wire.Permit) { p.ValidUntil = p.IssuedAt.Add(time.Hour) }},
		"simulated":             {change: func(p *wire.Permit) { p.Simulated = true }, closed: true},
		"shuttered":             {change: func(p *wire.Permit) { p.State, p.Reasons = wire.Shuttered, []wire.Reason{{Code: "hold"}} }, closed: true},
		"expired": {change: func(p *wire.Permit) {
			p.IssuedAt, p.ValidUntil = p.IssuedAt.Add(-time.Minute), p.ValidUntil.Add(-time.Minute)
		}, closed: true},
		"from the future": {change: func(p *wire.Permit) {
			p.IssuedAt, p.ValidUntil = p.IssuedAt.Add(time.Minute), p.ValidUntil.Add(time.Minute)
		}, closed: true},
		"opened outside": {change: func(p *wire.Permit) { p.State = wire.Shuttered }, after: func(b []byte, _ string) []byte {
			return []byte(strings.Replace(string(b), `"state":"shuttered"`, `"state":"open"`, 1))
		}},
		"unsigned":          {after: func(b []byte, signed string) []byte { return []byte(strings.Replace(string(b), signed, "", 1)) }},
		"cut":               {after: func(b []byte, _ string) []byte { return b[:len(b)-1] }},
		"signature changed": {after: func(b []byte, _ string) []byte { return []byte(strings.Replace(string(b), `"}`, `A"}`, 1)) }},
		"nothing":           {after: func([]byte, string) []byte { return nil }},
		"html":              {after: func([]byte, string) []byte { return []byte("<html>") }},
	} {
		i, client := newIssuer(t)
		i.change, i.after = c.change, c.after
		l, err := client.Permit(t.Context(), "north")
		if l.Open(time.Now()) {
			t.Errorf("%s: open", name)
		}
		if (err == nil) != c.closed {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestAnotherKeyIsNotBelieved(t *testing.T) {
	i, c := newIssuer(t)
	if _, err := c.Permit(t.Context(), "north"); err != nil {
		t.Fatal(err)
	}
	_, i.key, _ = ed25519.GenerateKey(nil)
	if l, err := c.Permit(t.Context(), "north"); err == nil || l.Open(time.Now()) {
		t.Error("the key was changed, and nobody noticed")
	}
}

func TestNumbersNeverFallWithinABoot(t *testing.T) {
	i, c := newIssuer(t)
	for n, step := range []struct {
		boot string
		seq  uint64
		ok   bool
	}{{"boot-1", 7, true}, {"boot-1", 7, true}, {"boot-1", 6, false}, {"boot-1", 8, true}, {"boot-2", 1, true}, {"boot-2", 0, false}} {
		i.permit.BootID, i.permit.Seq = step.boot, step.seq
		if _, err := c.Permit(t.Context(), "north"); (err == nil) != step.ok {
			t.Errorf("step %d: %v", n, err)
		}
	}
}

func TestRefusalsAreProblems(t *testing.T) {
	c := serve(t, http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		switch r.URL.Path {
		case "/v1/holds":
			w.Header().Set("Retry-After", "3")
			w.Header().Set("Content-Type", wire.ProblemType)
			w.WriteHeader(429)
			_, _ = w.Write([]byte(`{"type":"about:blank","title":"Too Many Requests","status":500,"detail":"d","errors":[{"detail":"d","mend":"wait"}]}`))
		case "/v1/sources":
			http.Redirect(w, r, "http://evil.example/", http.StatusFound)
		default:
			w.WriteHeader(502)
			_, _ = w.Write([]byte("<html>bad gateway"))
		}
	}))
	_, err := c.Holds(t.Context())
	p, is := err.(*Problem)
	if !is || p.Status != 429 || p.RetryAfter != 3*time.Second || p.Mend() != "wait" || !p.Temporary() || !strings.Contains(p.Error(), "wait") {
		t.Errorf("%#v", err)
	}
	if _, err = c.Beams(t.Context()); err.(*Problem).Status != 502 || err.(*Problem).Temporary() {
		t.Errorf("%#v", err)
	}
	if _, err = c.Sources(t.Context()); err.(*Problem).Status != 302 {
		t.Errorf("a redirect was followed: %v", err)
	}
	if _, err = c.Beam(t.Context(), ".."); err == nil {
		t.Error("a name of points was asked for")
	}
	for _, server := range []string{"", "localhost:8460", "ftp://x", "http://", "http://u:p@x", "http://x?y"} {
		if _, err := New(Options{Server: server}); err == nil {
			t.Errorf("server %q was taken", server)
		}
	}
	if _, err := New(Options{Server: "http://x", Token: "a\r\nb"}); err == nil {
		t.Error("a token with a line end was taken")
	}
}

func TestStreamsGoOnWhereTheyEnded(t *testing.T) {
	var asked []string
	c := serve(t, http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		asked = append(asked, r.Header.Get("Last-Event-ID"))
		w.Header().Set("Content-Type", "text/event-stream")
		switch len(asked) {
		case 1:
			_, _ = w.Write([]byte("retry: 1\n\nid: b.1\nevent: view\ndata: {\"n\":1}\n\n: beat\n\nid: b.2\nevent: hold\ndata: {\"n\":\ndata: 2}\n\nid: b.3\nevent: hold\ndata: {\"cut"))
		case 2:
			w.Header().Set("Retry-After", "0")
			w.WriteHeader(503)
		default:
			_, _ = w.Write([]byte("retry: 1\r\n\r\nid: b.3\r\nevent: hold\r\ndata: {\"n\":3}\r\n\r\n"))
		}
	}))
	var got []string
	stop := context.Canceled
	err := c.Stream(t.Context(), "b.0", func(e Event) error {
		got = append(got, e.ID+" "+e.Name+" "+strings.ReplaceAll(string(e.Data), "\n", ""))
		if len(got) == 3 {
			return stop
		}
		return nil
	})
	if err != stop || strings.Join(got, "; ") != `b.1 view {"n":1}; b.2 hold {"n":2}; b.3 hold {"n":3}` {
		t.Errorf("%v: %q", err, got)
	}
	if strings.Join(asked, " ") != "b.0 b.2 b.2" {
		t.Errorf("asked after %q", asked)
	}
}

func TestAStreamThatIsRefusedEnds(t *testing.T) {
	c := serve(t, http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) { w.WriteHeader(403) }))
	err := c.Stream(t.Context(), "", func(Event) error { return nil })
	if p, is := err.(*Problem); !is || p.Status != 403 {
		t.Errorf("%v", err)
	}
}
