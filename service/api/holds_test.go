package api

import (
	"net/http"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

func TestAHoldClosesAtOnceAndIsReleased(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	var h holdDoc
	placed := s.want(201, "eve", "POST", "/v1/holds", `{"beam":"*","reason":"smoke"}`)
	placed.into(t, &h)
	if h.By != "eve" || !h.Now || h.Order != "site" || h.Until != nil || placed.header.Get("ETag") != h.ETag || placed.header.Get("Location") != "/v1/holds/"+string(h.ID) {
		t.Errorf("placed as %+v", h)
	}
	for _, b := range []closures.BeamID{"north", "south"} {
		if d := s.stage.View().Beam(b).Decision; d.Open || !d.Codes.Has(closures.CodeHold) {
			t.Errorf("beam %s is not held", b)
		}
	}
	path := "/v1/holds/" + string(h.ID)
	s.want(200, "eve", "GET", path, "")
	s.want(403, "eve", "POST", path+"/release", "")
	s.want(412, "ann", "POST", path+"/release", "", `If-Match: "other"`)
	s.want(200, "ann", "POST", path+"/release", "", "If-Match: "+h.ETag)
	s.want(404, "ann", "POST", path+"/release", "")
	if n := len(s.stage.View().Holds); n != 0 {
		t.Errorf("%d holds are left", n)
	}
}

func TestAnAuthoritysOrderTakesASecondPersonAndAReference(t *testing.T) {
	s := newSite(t)
	var h holdDoc
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"stop","order":"authority","caller":"duty officer","call_back":"+00 1"}`).into(t, &h)
	if h.Order != "authority" || h.Caller != "duty officer" || h.CallBack != "+00 1" {
		t.Errorf("placed as %+v", h)
	}
	path := "/v1/holds/" + string(h.ID) + "/release"
	s.want(409, "ann", "POST", path, `{"reference":"R 1"}`)
	s.want(422, "ben", "POST", path, "")
	s.want(200, "ben", "POST", path, `{"reference":"R 1"}`)
}

func TestWithoutTokensThereIsNoSecondPerson(t *testing.T) {
	s := newLocal(t)
	var h holdDoc
	s.want(201, "", "POST", "/v1/holds", `{"beam":"north","reason":"stop","order":"authority"}`).into(t, &h)
	s.want(409, "", "POST", "/v1/holds/"+string(h.ID)+"/release", `{"reference":"R 1"}`)
	var l listDoc
	s.want(201, "", "POST", "/v1/lists", listText("orbital-desk", "A", openDome), yaml).into(t, &l)
	s.want(409, "", "POST", "/v1/lists/orbital-desk/A/confirm", `{"digest":"`+l.Digest+`"}`)
	s.want(409, "", "POST", "/v1/lists/orbital-desk/A/withdraw", "")
	// A list that somebody else brought waits for a second person all the same.
	if err := s.stage.apply(closures.ListOffered{List: openList(t, "orbital-desk", "B"), By: "folder"}); err != nil {
		t.Fatal(err)
	}
	s.want(409, "", "POST", "/v1/lists/orbital-desk/B/confirm", `{"digest":"`+openList(t, "orbital-desk", "B").Digest().String()+`"}`)
	// One person is enough where the authority's rule asks for one.
	s.want(201, "", "POST", "/v1/lists", listText("one-desk", "A", openDome), yaml).into(t, &l)
	s.want(200, "", "POST", "/v1/lists/one-desk/A/confirm", `{"digest":"`+l.Digest+`"}`)
}

func TestHoldsHaveRegionsAndTimes(t *testing.T) {
	s := newSite(t)
	for _, region := range []string{
		`{"icrs":{"ra_deg":150.1,"dec_deg":2.2,"radius_deg":0.05}}`,
		`{"horizon":{"az_from_deg":350,"az_to_deg":10,"el_from_deg":30,"el_to_deg":45,"observed":true}}`,
		`{"track":{"radius_deg":0.1,"points":[{"at":"2031-02-14T02:00:00Z","ra_deg":10,"dec_deg":5},{"at":"2031-02-14T04:00:00Z","ra_deg":10.1,"dec_deg":5}]}}`,
	} {
		var h, again holdDoc
		s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"test","from":"2031-02-14T02:00:00Z","until":"2031-02-14T04:00:00Z","region":`+region+`}`).into(t, &h)
		s.want(200, "eve", "GET", "/v1/holds/"+string(h.ID), "").into(t, &again)
		if h.Region == nil || h.Now || h.Until == nil || !h.From.Equal(evening.Add(time.Hour)) {
			t.Errorf("%s: placed as %+v", region, h)
		}
		if c := h.Region.ICRS; c != nil && (c.RA-150.1 > 1e-9 || c.Radius-0.05 > 1e-12) {
			t.Errorf("the cone came back as %+v", c)
		}
	}
	var h holdDoc
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"test","region":{"whole_sky":true}}`).into(t, &h)
	if h.Region != nil {
		t.Error("the whole sky has a region")
	}
}

func TestHoldsAreDoneOnceForAKey(t *testing.T) {
	s := newSite(t)
	key := "Idempotency-Key: k-1"
	first := s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`, key)
	again := s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`, key)
	if string(first.body) != string(again.body) || again.header.Get("Idempotency-Replayed") != "true" || again.header.Get("Location") != first.header.Get("Location") {
		t.Errorf("the same request is answered %s, then %s", first.body, again.body)
	}
	if n := len(s.stage.View().Holds); n != 1 {
		t.Fatalf("%d holds were placed", n)
	}
	// A hold is placed whatever is wrong with its key.
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"b"}`, key)
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"c"}`, "Idempotency-Key: "+strings.Repeat("x", 300))
	s.want(201, "ben", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`, key)
	if n := len(s.stage.View().Holds); n != 4 {
		t.Errorf("%d holds were placed, want 4", n)
	}
	// A list is not.
	s.want(201, "ann", "POST", "/v1/lists", listText("quick-desk", "A", openDome), yaml, key)
	s.want(422, "ann", "POST", "/v1/lists", listText("quick-desk", "B", openDome), yaml, key)
	s.want(400, "ann", "POST", "/v1/lists", listText("quick-desk", "B", openDome), yaml, "Idempotency-Key: "+strings.Repeat("x", 300))
	// A refusal is forgotten: what was wrong may be mended.
	s.want(404, "ann", "POST", "/v1/lists", listText("no-desk", "A", openDome), yaml, "Idempotency-Key: k-2")
	s.want(201, "ann", "POST", "/v1/lists", listText("quick-desk", "C", openDome), yaml, "Idempotency-Key: k-2")
}

func TestAHoldThatIsNotOnRecordIsNotAnsweredAsDone(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Durable = 50 * time.Millisecond })
	hang := make(chan struct{})
	s.stage.set(func(s *stage) { s.hang = hang })
	a := s.want(503, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`)
	if !strings.Contains(string(a.body), "may be in force") || a.header.Get("Retry-After") == "" {
		t.Errorf("answered %s", a.body)
	}
	close(hang)
	s.stage.set(func(s *stage) {
		s.hang, s.submits = nil, closures.Errorf(closures.Busy, "wait", "the record's queue is full")
	})
	if a := s.want(429, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`); a.header.Get("Retry-After") != "1" {
		t.Errorf("no time to try again: %v", a.header)
	}
	s.stage.set(func(s *stage) { s.stopped = true })
	s.want(503, "ann", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`)
}

func TestReadingDoesNotTakeTheBudgetOfHolds(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Limits.Requests = Rate{0.001, 3}; o.Limits.Writes = Rate{0.001, 1} })
	refused := 0
	for range 5 {
		if a := s.do("eve", "GET", "/v1/holds", ""); a.status == http.StatusTooManyRequests {
			if refused++; a.header.Get("Retry-After") == "" {
				t.Error("no Retry-After")
			}
		}
	}
	if refused != 2 {
		t.Errorf("%d of 5 reads were refused, want 2", refused)
	}
	s.want(201, "eve", "POST", "/v1/holds", `{"beam":"north","reason":"a"}`)
	s.want(200, "ann", "GET", "/v1/holds", "") // another client
	s.want(422, "ann", "POST", "/v1/lists", "x", yaml)
	s.want(429, "ann", "POST", "/v1/lists", "x", yaml)
}
