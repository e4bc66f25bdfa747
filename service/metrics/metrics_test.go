package metrics

import (
	"net/http/httptest"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func scrape(t *testing.T, m *Metrics) string {
	t.Helper()
	w := httptest.NewRecorder()
	m.ServeHTTP(w, httptest.NewRequest("GET", "/metrics", nil))
	if w.Code != 200 {
		t.Fatalf("status %d: %s", w.Code, w.Body)
	}
	return w.Body.String()
}

func TestFigures(t *testing.T) {
	f := Figures{
		Beams: []Beam{{ID: "north", Open: true}, {ID: "south", Reasons: []string{"hold", "aircraft"}}},
		Facts: []Facts{{Kind: "aircraft", Accepted: 10, Superseded: 3, Refused: 1}}, Lists: map[string]int{"in-force": 2, "waiting": 1},
		Sources:      []Source{{ID: "rx-1", Required: true, Heard: true, Age: 1500 * time.Millisecond}, {ID: "mast"}},
		Decide:       Histogram{Bounds: []time.Duration{time.Millisecond, time.Second}, Counts: []uint64{5, 2, 1}, Sum: 3 * time.Second},
		RecordBehind: 20 * time.Millisecond, RecordDurable: 77, RecordHealthy: true, Permits: 4, Turns: 8, Ready: true, ViewAge: 50 * time.Millisecond,
	}
	m := New(Options{Read: func() Figures { return f }, Build: "v1"})
	m.Seen(10*time.Second, f.Beams)
	m.Seen(12*time.Second, f.Beams)
	m.Seen(11*time.Second, f.Beams) // a clock that goes back
	m.Seen(11500*time.Millisecond, []Beam{{ID: "north", Reasons: []string{"fault"}}})
	out := scrape(t, m)
	for _, want := range []string{
		`beamward_beam_open{beam="north"} 1`, `beamward_beam_open{beam="south"} 0`, `beamward_beam_reason{beam="south",reason="aircraft"} 1`,
		`beamward_beam_state_seconds_total{beam="north",reason="open"} 2.5`, `beamward_beam_state_seconds_total{beam="south",reason="hold"} 2.5`,
		`beamward_facts_total{kind="aircraft",outcome="superseded"} 3`, `beamward_source_age_seconds{required="yes",source="rx-1"} 1.5`,
		`beamward_source_silent{required="no",source="mast"} 1`, `beamward_lists{status="waiting"} 1`,
		`beamward_decision_seconds_bucket{le="0.001"} 5`, `beamward_decision_seconds_bucket{le="1"} 7`, `beamward_decision_seconds_bucket{le="+Inf"} 8`, `beamward_decision_seconds_sum 3`,
		`beamward_record_behind_seconds 0.02`, `beamward_record_durable_seq 77`, `beamward_permits_signed_total 4`, `beamward_ready 1`, `beamward_build_info{`, `go_goroutines`,
	} {
		if !strings.Contains(out, want) {
			t.Errorf("no line %s", want)
		}
	}
	if strings.Contains(out, `source_age_seconds{required="no",source="mast"}`) {
		t.Error("a source that was never heard has an age")
	}
	if strings.Contains(out, `reason="fault"} 0`) || strings.Contains(out, `state_seconds_total{beam="north",reason="fault"}`) {
		t.Error("no time has passed with the newest reasons yet")
	}
}

func TestScrapesWhileBeamsChange(t *testing.T) {
	m := New(Options{Read: func() Figures { return Figures{} }})
	var wait sync.WaitGroup
	wait.Go(func() {
		for i := range 200 {
			m.Seen(time.Duration(i)*time.Millisecond, []Beam{{ID: "north", Open: i%2 == 0, Reasons: []string{"hold"}}})
		}
	})
	for range 5 {
		scrape(t, m)
	}
	wait.Wait()
}
