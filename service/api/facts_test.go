package api

import (
	"bytes"
	"fmt"
	"io"
	"math/rand/v2"
	"net"
	"net/http"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

const nd = "Content-Type: application/x-ndjson"

func interlock(at, more string) string {
	return `{"kind":"interlock","source":"catwalk","at":"` + at + `","safe":true` + more + `}`
}

const now = "2031-02-14T01:00:00Z"

func TestFactsAreTakenLineByLine(t *testing.T) {
	s := newSite(t)
	s.stage.set(func(s *stage) { s.keep = true })
	body := strings.Join([]string{
		interlock(now, ""), // 1
		"",
		`{"kind":"interlock"`, // 3
		interlock(now, `,"safe":true`),
		`{"kind":"sighting","source":"spotter-east","at":"` + now + `"}`, // 5: not bound
		`{"kind":"interlock","source":"rx-1","at":"` + now + `","safe":true}`,
		`{"kind":"aircraft","source":"rx-1","at":"` + now + `","aircraft":"a1b2c3","lat_deg":-31,"lon_deg":-4,"altitude_m":9000,"altitude_from":"ellipsoid"}` + "\r", // 7
		`{"kind":"shutter","beam":"north","at":"` + now + `","position":"closed"}`,
		strings.Repeat("x", 200_000), // 9
		`{"kind":"heard","source":"rx-1","at":"` + now + `","scope":"link"}`,
		`{"kind":"interlock","source":"catwalk","at":"2031-02-14T01:00:10Z","safe":true}`, // 11: ahead
		interlock(now, ""), // without an end
	}, "\n")
	var out factsDoc
	s.want(200, "rx", "POST", "/v1/facts", body, nd).into(t, &out)
	lines := []int{}
	for _, r := range out.Refused {
		lines = append(lines, r.Line)
		if r.Cause == "" || r.Mend == "" {
			t.Errorf("line %d is refused without cause or mend", r.Line)
		}
	}
	if out.Accepted != 5 || out.RefusedTotal != 6 || fmt.Sprint(lines) != "[3 4 5 6 9 11]" {
		t.Errorf("taken as %+v", out)
	}
	if n := len(s.stage.offered); n != 5 {
		t.Errorf("%d facts were offered", n)
	}
}

// BW-026: a line that speaks for another source is refused, whoever sends it
// and whatever else is right with it.
func TestFactsAreBoundToTheirSources(t *testing.T) {
	s := newSite(t)
	var out factsDoc
	for _, who := range []string{"ann", "adm"} { // they are bound to nothing
		s.want(200, who, "POST", "/v1/facts", interlock(now, ""), nd).into(t, &out)
		if out.Accepted != 0 || out.RefusedTotal != 1 {
			t.Errorf("%s may speak for the interlock: %+v", who, out)
		}
	}
	s.want(200, "rx", "POST", "/v1/facts", `{"kind":"shutter","beam":"south","at":"`+now+`","position":"closed"}`, nd).into(t, &out)
	if out.Accepted != 0 {
		t.Error("a feed speaks for a beam that it is not bound to")
	}
	local := newLocal(t)
	local.want(200, "", "POST", "/v1/facts", interlock(now, "")+"\n"+`{"kind":"interlock","source":"nowhere","at":"`+now+`","safe":true}`, nd).into(t, &out)
	if out.Accepted != 1 || out.RefusedTotal != 1 {
		t.Errorf("on this machine: %+v", out)
	}
}

func TestOnlyAHundredRefusalsAreTold(t *testing.T) {
	s := newSite(t)
	var out factsDoc
	s.want(200, "rx", "POST", "/v1/facts", strings.Repeat("no\n", 1000), nd).into(t, &out)
	if out.RefusedTotal != 1000 || len(out.Refused) != 100 {
		t.Errorf("%d refused, %d told", out.RefusedTotal, len(out.Refused))
	}
}

func TestAFullEngineAnswers429WithWhatWasTaken(t *testing.T) {
	s := newSite(t)
	s.stage.set(func(s *stage) { s.offers = closures.Errorf(closures.Busy, "wait", "the record's queue is full") })
	a := s.want(429, "rx", "POST", "/v1/facts", "no\n"+interlock(now, ""), nd)
	var out partDoc
	a.into(t, &out)
	if a.header.Get("Content-Type") != wire.ProblemType || a.header.Get("Retry-After") == "" || out.Status != 429 || out.Accepted != 0 || out.RefusedTotal != 1 {
		t.Errorf("answered %s", a.body)
	}
}

// A body that is cut gives nothing of its last line, and one that does not
// come ends in time.
func TestBodiesThatDoNotComeWhole(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.LongTime, o.Limits.BodyTime = 200*time.Millisecond, 200*time.Millisecond })
	s.stage.set(func(s *stage) { s.keep = true })
	for name, c := range map[string]struct {
		path, kind, body string
		close            bool
		want             int
	}{
		"facts that stop":   {"/v1/facts", "application/x-ndjson", interlock(now, "") + "\n" + interlock(now, ""), false, 408},
		"facts that end":    {"/v1/facts", "application/x-ndjson", interlock(now, "") + "\n" + interlock(now, ""), true, 400},
		"a hold that stops": {"/v1/holds", "application/json", `{"beam":"north"`, false, 408},
	} {
		conn, err := net.Dial("tcp", strings.TrimPrefix(s.url, "http://"))
		if err != nil {
			t.Fatal(err)
		}
		s.stage.set(func(s *stage) { s.offered = nil })
		fmt.Fprintf(conn, "POST %s HTTP/1.1\r\nHost: localhost\r\nAuthorization: Bearer %s\r\nContent-Type: %s\r\nContent-Length: 100000\r\n\r\n%s", c.path, s.tokens["rx"], c.kind, c.body)
		if c.close {
			_ = conn.(*net.TCPConn).CloseWrite()
		}
		data, _ := io.ReadAll(conn)
		conn.Close()
		if !bytes.HasPrefix(data, fmt.Appendf(nil, "HTTP/1.1 %d ", c.want)) {
			t.Errorf("%s: %.200s", name, data)
		}
		if n := len(s.stage.offered); c.path == "/v1/facts" && n != 1 {
			t.Errorf("%s: %d facts were offered, want the whole one", name, n)
		}
	}
}

// What is read does not depend on how the bytes come.
func TestFactsComeInAnyPieces(t *testing.T) {
	s := newSite(t)
	var body []byte
	for i := range 500 {
		body = append(body, interlock(now, "")...)
		body = append(body, '\n')
		if i%7 == 0 {
			body = append(body, "bad\n\n"...)
		}
	}
	for range 5 {
		r := s.request("POST", "/v1/facts")
		in, w := io.Pipe()
		go func() {
			rest := body
			for len(rest) > 0 {
				n := min(1+rand.IntN(9000), len(rest))
				_, _ = w.Write(rest[:n])
				rest = rest[n:]
			}
			w.Close()
		}()
		r.Body, r.ContentLength = in, -1
		r.Header.Set("Content-Type", "application/x-ndjson")
		r.Header.Set("Authorization", "Bearer "+s.tokens["rx"])
		var out factsDoc
		s.send(r).into(t, &out)
		if out.Accepted != 500 || out.RefusedTotal != 72 {
			t.Fatalf("taken as %d and %d", out.Accepted, out.RefusedTotal)
		}
	}
}

func TestAPanicIsA500ThatTellsNothing(t *testing.T) {
	s := newSite(t, func(o *Options) {
		o.Permits = panics{}
		o.Report = func(error) {}
	})
	a := s.want(500, "eve", "GET", "/v1/beams/north/permit", "")
	if bytes.Contains(a.body, []byte("secret")) || a.header.Get("Content-Type") != wire.ProblemType {
		t.Errorf("answered %s", a.body)
	}
	s.stage.set(func(s *stage) { s.submits = fmt.Errorf("secret") })
	if a := s.want(500, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"x"}`); bytes.Contains(a.body, []byte("secret")) {
		t.Errorf("answered %s", a.body)
	}
}

type panics struct{ fakePermits }

func (panics) Permit(closures.BeamID, string) ([]byte, error) { panic("secret") }

func TestHeadsHaveNoBody(t *testing.T) {
	s := newSite(t)
	for _, path := range []string{"/v1/beams", "/healthz", "/v1/stream", "/v1/permit-key"} {
		a := s.want(200, "eve", http.MethodHead, path, "")
		if len(a.body) > 0 || a.header.Get("Content-Type") == "" {
			t.Errorf("%s: %d bytes, %v", path, len(a.body), a.header)
		}
	}
}
