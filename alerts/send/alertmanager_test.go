package send

import (
	"context"
	"encoding/json"
	"io"
	"net/http"
	"net/http/httptest"
	"testing"
	"time"

	"beamward/alerts"
)

// The form is that of POST /api/v2/alerts in Alertmanager's OpenAPI document:
// an array of labels, annotations, startsAt and endsAt.
func TestAlertmanager(t *testing.T) {
	var got []postable
	var header http.Header
	var path string
	posts := 0
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		posts++
		header, path = r.Header, r.Method+" "+r.URL.Path
		b, _ := io.ReadAll(r.Body)
		got = nil
		if err := json.Unmarshal(b, &got); err != nil {
			t.Error(err)
		}
	}))
	defer s.Close()
	a, err := NewAlertmanager(AlertmanagerOptions{URL: s.URL + "/am", Token: "t0ken", Now: now})
	if err != nil {
		t.Fatal(err)
	}
	ctx := context.Background()
	m := message()
	if err := a.Send(ctx, m); err != nil {
		t.Fatal(err)
	}
	if path != "POST /am/api/v2/alerts" || header.Get("Authorization") != "Bearer t0ken" || header.Get("Content-Type") != "application/json" {
		t.Errorf("%s %v", path, header)
	}
	first := got[0]
	if first.Labels["alertname"] != "shutter-fault" || first.Labels["beam"] != "north" || first.Labels["priority"] != "high" || first.Annotations["action"] == "" ||
		!first.Starts.Equal(evening) || !first.Ends.Equal(evening.Add(Hold)) {
		t.Errorf("raised: %+v", first)
	}
	m.State, m.What, m.At, m.Detail = alerts.Returned, alerts.CameBack, evening.Add(time.Minute), ""
	if err := a.Send(ctx, m); err != nil {
		t.Fatal(err)
	}
	if !got[0].Ends.Equal(m.At) || len(got[0].Labels) != len(first.Labels) || got[0].Annotations["detail"] != "" {
		t.Errorf("returned: %+v", got[0])
	}
	for name, v := range first.Labels {
		if got[0].Labels[name] != v {
			t.Errorf("label %s is %q and was %q: another alert", name, got[0].Labels[name], v)
		}
	}
	before := posts
	for _, o := range []alerts.Message{{What: alerts.Notice, Kind: alerts.ClosesSoon}, {What: alerts.FloodTold}} {
		if err := a.Send(ctx, &o); err != nil {
			t.Error(err)
		}
	}
	if err := a.Refresh(ctx, nil); err != nil || posts != before {
		t.Errorf("%d posts of nothing, %v", posts-before, err)
	}
	machine := alerts.New(alerts.Routing{})
	machine.Step(evening, &alerts.Observation{Damaged: true, Working: true})
	machine.Step(evening.Add(time.Minute), &alerts.Observation{Damaged: true, Working: true})
	if err := a.Refresh(ctx, machine.Standing()); err != nil {
		t.Fatal(err)
	}
	if len(got) != 1 || got[0].Labels["alertname"] != "record-damaged" || !got[0].Starts.Equal(evening.Add(time.Minute)) || !got[0].Ends.Equal(evening.Add(Hold)) {
		t.Errorf("refreshed: %+v", got)
	}
	for _, o := range []AlertmanagerOptions{{URL: s.URL}, {URL: "http://am.example", Now: now}, {URL: s.URL, Now: now, Token: "a\r\nb"}} {
		if _, err := NewAlertmanager(o); err == nil {
			t.Errorf("taken: %+v", o)
		}
	}
}
