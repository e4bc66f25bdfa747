package permit

import (
	"bufio"
	"context"
	"encoding/json"
	"io"
	"net"
	"net/http"
	"net/http/httptest"
	"net/url"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/closures/wire"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// BW-032
func TestRoutes(t *testing.T) {
	s := newStage()
	i := issuer(t, s)
	h := NewHandler(i)
	for _, c := range []struct {
		method, target string
		status         int
	}{
		{"GET", "/v1/beams/north/permit", 200},
		{"HEAD", "/v1/beams/north/permit", 200},
		{"GET", "/v1/beams/north/permit?nonce=abc-_9", 200},
		{"GET", "/v1/beams/north/permit?nonce=", 200},
		{"GET", "/v1/permit-key", 200},
		{"HEAD", "/v1/permit-key", 200},
		{"GET", "/healthz", 200},
		{"HEAD", "/healthz", 200},

		{"GET", "/v1/beams/south/permit", 404},
		{"GET", "/v1/beams//permit", 404},
		{"GET", "/v1/beams/../permit", 404},
		{"GET", "/v1/beams/north/../north/permit", 404},
		{"GET", "/v1/beams/%6eorth/permit", 404},
		{"GET", "/v1/beams/north/permit/", 404},
		{"GET", "/v1/beams/north", 404},
		{"GET", "/v1//permit-key", 404},
		{"GET", "/", 404},
		{"GET", "/metrics", 404},
		{"GET", "/v1/beams", 404},
		{"POST", "/v1/beams", 404},
		{"GET", "/healthz/", 404},

		{"GET", "/v1/beams/north/permit?nonce=a&nonce=b", 400},
		{"GET", "/v1/beams/north/permit?nonce=a%20b", 400},
		{"GET", "/v1/beams/north/permit?nonce=" + strings.Repeat("a", 65), 400},
		{"GET", "/v1/beams/north/permit?Nonce=a", 400},
		{"GET", "/v1/beams/north/permit?a=b", 400},
		{"GET", "/v1/beams/north/permit?nonce=a;b", 400},
		{"GET", "/v1/permit-key?nonce=a", 400},
		{"GET", "/healthz?x", 400},

		{"POST", "/v1/beams/north/permit", 405},
		{"PUT", "/v1/permit-key", 405},
		{"DELETE", "/healthz", 405},
		{"OPTIONS", "/healthz", 405},
		{"get", "/healthz", 405},
	} {
		r := httptest.NewRequest("GET", "http://permits"+c.target, nil)
		r.Method = c.method
		w := httptest.NewRecorder()
		h.ServeHTTP(w, r)
		if w.Code != c.status {
			t.Errorf("%s %s: %d, want %d", c.method, c.target, w.Code, c.status)
			continue
		}
		if w.Header().Get("Cache-Control") != "no-store" || w.Header().Get("Location") != "" {
			t.Errorf("%s %s: header %v", c.method, c.target, w.Header())
		}
		if c.status == 405 && w.Header().Get("Allow") != "GET, HEAD" {
			t.Errorf("%s %s: Allow %q", c.method, c.target, w.Header().Get("Allow"))
		}
		if c.status >= 400 {
			p, err := wire.ParseProblem(w.Body.Bytes())
			if err != nil || p.Status != c.status || p.Detail == "" || w.Header().Get("Content-Type") != wire.ProblemType {
				t.Errorf("%s %s: %v %+v", c.method, c.target, err, p)
			}
		}
	}
	r := httptest.NewRequest("GET", "http://permits/healthz", strings.NewReader("x"))
	w := httptest.NewRecorder()
	h.ServeHTTP(w, r)
	if w.Code != 400 || w.Header().Get("Connection") != "close" {
		t.Errorf("a body: %d %v", w.Code, w.Header())
	}
	s.advance(time.Second)
	w = httptest.NewRecorder()
	h.ServeHTTP(w, httptest.NewRequest("GET", "http://permits/healthz", nil))
	if w.Code != 503 {
		t.Errorf("healthz of an engine that stopped: %d", w.Code)
	}
}

// Whatever is asked for, the answer is one of five and only a good nonce comes
// back.
func FuzzHandler(f *testing.F) {
	h := NewHandler(issuer(f, newStage()))
	f.Add("/v1/beams/north/permit", "nonce=abc")
	f.Add("/v1/permit-key", "")
	f.Add("/healthz", "nonce=%00")
	f.Add("/v1/beams/%2e%2e/permit", "a&b;c")
	f.Fuzz(func(t *testing.T, path, query string) {
		r := httptest.NewRequest("GET", "http://permits/", nil)
		r.URL = &url.URL{Path: path, RawQuery: query}
		w := httptest.NewRecorder()
		h.ServeHTTP(w, r)
		switch w.Code {
		case 200:
			if path != routeHealth && path != routeKey && path != "/v1/beams/north/permit" {
				t.Fatalf("%q is served", path)
			}
			if path == "/v1/beams/north/permit" {
				p, err := wire.ParsePermit(w.Body.Bytes())
				if err != nil || !ValidNonce(p.Nonce) {
					t.Fatalf("%v, nonce %q", err, p.Nonce)
				}
			}
		case 400, 404:
		default:
			t.Fatalf("%q?%q: %d", path, query, w.Code)
		}
	})
}

// serving runs a server on a free port until the test ends.
func serving(t testing.TB, s *Server) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan error, 1)
	go func() { done <- s.Serve(ctx, l) }()
	t.Cleanup(func() {
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	})
	return l.Addr().String()
}

func TestServer(t *testing.T) {
	st := newStage()
	i := issuer(t, st)
	addr := serving(t, NewServer(NewHandler(i), 0))
	client := &http.Client{Transport: &http.Transport{}}
	defer client.CloseIdleConnections()
	get := func(path string) (int, http.Header, []byte) {
		t.Helper()
		r, err := client.Get("http://" + addr + path)
		if err != nil {
			t.Fatal(err)
		}
		defer r.Body.Close()
		b, err := io.ReadAll(r.Body)
		if err != nil {
			t.Fatal(err)
		}
		return r.StatusCode, r.Header, b
	}
	_, _, jwk := get("/v1/permit-key")
	key, err := wire.ParseJWK(jwk)
	if err != nil {
		t.Fatal(err)
	}
	status, head, body := get("/v1/beams/north/permit?nonce=xyz")
	if status != 200 || head.Get("Content-Type") != "application/json" {
		t.Fatalf("%d %v", status, head)
	}
	var p wire.Permit
	if err := json.Unmarshal(body, &p); err != nil {
		t.Fatal(err)
	}
	if p, err = wire.VerifyPermit(p.Signed, key); err != nil || p.Nonce != "xyz" || !p.Allows(evening) {
		t.Fatalf("%v %+v", err, p)
	}
	r, err := client.Head("http://" + addr + "/v1/beams/north/permit")
	if err != nil {
		t.Fatal(err)
	}
	defer r.Body.Close()
	if b, _ := io.ReadAll(r.Body); r.StatusCode != 200 || len(b) != 0 || r.ContentLength < 100 {
		t.Errorf("HEAD: %d, %d bytes, length %d", r.StatusCode, len(b), r.ContentLength)
	}
	// A header beyond its bound.
	q, _ := http.NewRequest("GET", "http://"+addr+"/healthz", nil)
	q.Header.Set("X", strings.Repeat("x", 16<<10))
	if r, err = client.Do(q); err == nil {
		defer r.Body.Close()
		if r.StatusCode != http.StatusRequestHeaderFieldsTooLarge {
			t.Errorf("a large header: %d", r.StatusCode)
		}
	}
}

// Holding connections open does not keep a reader out.
func TestConnectionsAreBounded(t *testing.T) {
	st := newStage()
	const most = 8
	server := NewServer(NewHandler(issuer(t, st)), most)
	addr := serving(t, server)
	var held []net.Conn
	defer func() {
		for _, c := range held {
			_ = c.Close()
		}
	}()
	for n := range 5 * most {
		c, err := net.Dial("tcp", addr)
		if err != nil {
			t.Fatal(err)
		}
		held = append(held, c)
		switch n % 3 {
		case 1: // the beginning of a request
			_, _ = io.WriteString(c, "GET /healthz HTTP/1.1\r\n")
		case 2: // a whole one, whose answer comes
			if !answered(c) {
				t.Fatalf("reader %d got no answer", n)
			}
		}
		if open, _ := server.Connections(); open > most {
			t.Fatalf("%d connections are open", open)
		}
	}
	c, err := net.Dial("tcp", addr)
	if err != nil {
		t.Fatal(err)
	}
	held = append(held, c)
	if !answered(c) {
		t.Fatal("the last reader got no answer")
	}
	if _, shut := server.Connections(); shut < 3*most {
		t.Errorf("only %d were shut", shut)
	}
}

func answered(c net.Conn) bool {
	_, _ = io.WriteString(c, "GET /v1/beams/north/permit HTTP/1.1\r\nHost: permits\r\n\r\n")
	r, err := http.ReadResponse(bufio.NewReader(c), nil)
	if err != nil {
		return false
	}
	defer r.Body.Close()
	_, err = io.Copy(io.Discard, r.Body)
	return err == nil && r.StatusCode == 200
}

func TestServeEnds(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	_ = l.Close()
	if err := NewServer(NewHandler(issuer(t, newStage())), 1).Serve(context.Background(), l); err == nil {
		t.Error("serving on a listener that is closed")
	}
}
