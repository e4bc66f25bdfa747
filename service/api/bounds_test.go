package api

import (
	"fmt"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"beamward/closures/wire"
	"beamward/service/access"
)

// What is remembered of keys and of clients has an end.
func TestMemoryIsBounded(t *testing.T) {
	as := answers{keep: time.Hour}
	for i := range answersKept + 500 {
		id := answerKey{key: fmt.Sprint(i)}
		one, mine := as.find(id, [32]byte{})
		if !mine {
			t.Fatal("a new key is known")
		}
		as.settle(id, one, &answered{status: 201, body: make([]byte, 5000)}, nil)
	}
	if len(as.by) > answersKept || as.bytes > answerBytes+5000 || len(as.order) > answersKept {
		t.Errorf("%d answers of %d bytes are kept", len(as.by), as.bytes)
	}
	if _, mine := as.find(answerKey{key: fmt.Sprint(answersKept + 499)}, [32]byte{}); mine {
		t.Error("the newest is forgotten")
	}
	if _, mine := as.find(answerKey{key: "0"}, [32]byte{}); !mine {
		t.Error("the oldest is remembered")
	}
	as.keep = 0
	if _, mine := as.find(answerKey{key: fmt.Sprint(answersKept + 499)}, [32]byte{}); !mine {
		t.Error("it is remembered past its time")
	}

	limits := DefaultLimits()
	cs := clients{limits: &limits}
	for i := range clientsKept + 100 {
		c := &call{r: httptest.NewRequest("GET", "/", nil), who: access.Person{Name: fmt.Sprint(i), Token: true}}
		if err := cs.take(c, forReading); err != nil {
			t.Fatal(err)
		}
	}
	if len(cs.by) > clientsKept {
		t.Errorf("%d clients are told apart", len(cs.by))
	}
}

func TestNegotiation(t *testing.T) {
	gives := []string{"application/json", "text/csv", "text/calendar"}
	for accept, want := range map[string]string{
		"*/*": "application/json", "text/*": "text/csv", "text/calendar": "text/calendar", "text/csv;q=0.5, text/calendar;q=0.6": "text/calendar", "application/json;q=0, */*": "text/csv",
		"TEXT/CSV": "text/csv", "text/html, */*;q=0.1": "application/json", "image/png": "", "": "", "text/csv;q=2": "", "application/*;q=0.2,text/csv ; q=0.3": "text/csv",
	} {
		got, err := negotiate([]string{accept}, gives)
		if got != want || (err == nil) != (want != "") {
			t.Errorf("%q: %q %v, want %q", accept, got, err, want)
		}
	}
}

// Every line that is not blank is taken or refused, whatever it is, and no
// more than what a line says is taken.
func FuzzFacts(f *testing.F) {
	f.Add([]byte(interlock(now, "") + "\n\nno\r\n" + interlock(now, "")))
	f.Add([]byte("\n\r\n\x00\n{}"))
	f.Add([]byte(strings.Repeat("x", wire.MaxFactLine+70_000) + "\n" + interlock(now, "")))
	s := newStage(f)
	g, err := access.New(access.Options{})
	if err != nil {
		f.Fatal(err)
	}
	a, err := New(Options{Engine: taker{s}, Clock: s, Guard: g, Limits: Limits{Feeds: Rate{1e9, 1e9}}})
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, body []byte) {
		r := local("POST", "/v1/facts", body)
		r.Header.Set("Content-Type", "application/x-ndjson")
		w := httptest.NewRecorder()
		a.ServeHTTP(w, r)
		var out factsDoc
		answer{w.Code, w.Header(), w.Body.Bytes()}.into(t, &out)
		lines := 0
		for _, line := range wire.Lines(body) {
			if len(line) > 0 {
				lines++
			}
		}
		if w.Code != 200 || out.Accepted+out.RefusedTotal != lines || len(out.Refused) > maxRefused {
			t.Fatalf("%d: %d taken and %d refused of %d lines", w.Code, out.Accepted, out.RefusedTotal, lines)
		}
	})
}
