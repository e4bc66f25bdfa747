package api

import (
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

func TestBeamsAreShownAsDecided(t *testing.T) {
	s := newSite(t)
	var all beamsDoc
	s.want(200, "eve", "GET", "/v1/beams", "").into(t, &all)
	if len(all.Beams) != 2 || all.Beams[0].Now.State != wire.Shuttered || len(all.Beams[0].Now.Reasons) == 0 || all.BootID != "boot-1" {
		t.Errorf("at the start: %+v", all)
	}
	s.stage.opened(t)
	var one beamDoc
	a := s.want(200, "eve", "GET", "/v1/beams/north", "")
	a.into(t, &one)
	if one.Now.State != wire.Open || len(one.Now.Reasons) != 0 || one.Now.Target != "f-101" || one.WavelengthNM < 589 || a.header.Get("ETag") == "" {
		t.Errorf("open: %+v", one)
	}
	var aim aimDoc
	s.want(200, "eve", "GET", "/v1/beams/north/aim", "").into(t, &aim)
	if !aim.Known || aim.Horizon == nil || aim.Horizon.El < 64 || aim.Horizon.El > 66 || aim.ICRS == nil || aim.Motion != "tracking" || aim.ErrorArcsec == nil || *aim.ErrorArcsec < 35 {
		t.Errorf("aim: %+v", aim)
	}
	var out outlookDoc
	s.want(200, "eve", "GET", "/v1/beams/north/outlook?hours=1", "").into(t, &out)
	if !out.AimKnown || len(out.Allowed) == 0 || len(out.LeftOut) == 0 {
		t.Errorf("outlook: %+v", out)
	}
}

// BW-009: an old view is answered shuttered, wherever it is shown.
func TestAnOldViewIsShownShuttered(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	for name, move := range map[string]func(*stage){
		"wall clock": func(s *stage) { s.wall = s.wall.Add(301 * time.Millisecond) },
		"boot clock": func(s *stage) { s.boot += 301 * time.Millisecond },
		"wall back":  func(s *stage) { s.wall = s.wall.Add(-time.Millisecond) },
		"boot back":  func(s *stage) { s.boot -= time.Millisecond },
	} {
		s.stage.mu.Lock()
		wall, boot := s.stage.wall, s.stage.boot
		move(s.stage)
		s.stage.mu.Unlock()
		var one beamDoc
		s.want(200, "eve", "GET", "/v1/beams/north", "").into(t, &one)
		if one.Now.State != wire.Shuttered || len(one.Now.Reasons) != 1 || one.Now.Reasons[0].Code != "fault" || one.Now.OpenUntil != nil {
			t.Errorf("%s: %+v", name, one.Now)
		}
		var aim aimDoc
		s.want(200, "eve", "GET", "/v1/beams/north/aim", "").into(t, &aim)
		if aim.State != wire.Shuttered {
			t.Errorf("%s: the aim says open", name)
		}
		if a := s.want(503, "eve", "GET", "/readyz", ""); !strings.Contains(string(a.body), "too old") {
			t.Errorf("%s: ready: %s", name, a.body)
		}
		s.stage.mu.Lock()
		s.stage.wall, s.stage.boot = wall, boot
		s.stage.mu.Unlock()
	}
	var one beamDoc
	s.want(200, "eve", "GET", "/v1/beams/north", "").into(t, &one)
	if one.Now.State != wire.Open {
		t.Errorf("a fresh view is shown %+v", one.Now)
	}
}

func TestRearmNeedsAPersonWhoLooked(t *testing.T) {
	s := newSite(t)
	s.stage.steady(t, 2)
	_ = s.stage.apply(closures.InterlockSeen{Source: "catwalk", Said: evening.Add(time.Second), Safe: false})
	var b beamDoc
	a := s.want(200, "eve", "GET", "/v1/beams/north", "")
	a.into(t, &b)
	if len(b.Now.Rearm) == 0 {
		t.Fatal("nothing waits for a person")
	}
	tag := "If-Match: " + a.header.Get("ETag")
	s.want(403, "eve", "POST", "/v1/beams/north/rearm", "")
	s.want(412, "ann", "POST", "/v1/beams/north/rearm", "", `If-Match: "old"`)
	s.want(400, "ann", "POST", "/v1/beams/*/rearm", "", tag)
	s.want(404, "ann", "POST", "/v1/beams/west/rearm", "")
	var out rearmDoc
	s.want(200, "ann", "POST", "/v1/beams/north/rearm", `{"note":"walked the deck"}`, tag).into(t, &out)
	if len(out.Beams) != 1 || out.Beams[0].Beam != "north" {
		t.Errorf("re-armed: %+v", out)
	}
	s.want(200, "ann", "POST", "/v1/beams/*/rearm", "").into(t, &out)
	if len(out.Beams) != 2 {
		t.Errorf("re-armed: %+v", out)
	}
	// BW-011: the cause is still there, so it asks for a person again.
	if d := s.stage.View().Beam("north").Decision; d.Open || !d.Codes.Has(closures.CodeInterlock) {
		t.Errorf("re-arming overrode what is still there: %v", d.Codes.Names())
	}
}

func TestPermitsComeFromTheirSource(t *testing.T) {
	s := newSite(t)
	if a := s.want(200, "eve", "GET", "/v1/beams/north/permit?nonce=a-B_9", ""); string(a.body) != `{"beam":"north","nonce":"a-B_9"}` || a.header.Get("Cache-Control") != "no-store" {
		t.Errorf("answered %s with %v", a.body, a.header)
	}
	if a := s.want(200, "eve", "GET", "/v1/permit-key", "", "Accept: application/jwk+json"); a.header.Get("Content-Type") != "application/jwk+json" {
		t.Errorf("the key is %v", a.header)
	}
	s.want(404, "eve", "GET", "/v1/beams/west/permit", "")
	s.want(403, "rx", "GET", "/v1/beams/north/permit", "")
	without := newSite(t, func(o *Options) { o.Permits = nil })
	without.want(503, "eve", "GET", "/v1/beams/north/permit", "")
	without.want(503, "eve", "GET", "/v1/permit-key", "")
}

func TestExposureHasItsCautions(t *testing.T) {
	s := newSite(t)
	var d exposureDoc
	s.want(200, "eve", "GET", "/v1/beams/north/exposure", "").into(t, &d)
	if len(d.Cautions) < 3 || len(d.Elevations) != 4 || d.Elevations[0].Elevation < 29.9 || d.Elevations[0].Elevation > 30.1 {
		t.Errorf("exposure: %+v", d)
	}
	for _, e := range d.Elevations {
		for _, r := range e.Reaches {
			if r.DistanceM == nil || r.UntilM != nil && *r.DistanceM < *r.UntilM {
				t.Errorf("the distance to keep is shorter than the hazard: %+v", r)
			}
		}
	}
	s.want(200, "eve", "GET", "/v1/beams/north/exposure?elevation_deg=45.5", "").into(t, &d)
	if len(d.Elevations) != 1 {
		t.Errorf("one elevation: %+v", d.Elevations)
	}
}

// BW-028: no route forces open. Whatever one may post opens nothing that the
// core does not open: there are only these.
func TestNoRouteForcesOpen(t *testing.T) {
	s := newSite(t)
	var posts []string
	for path, item := range s.api.document.OpenAPI().Paths {
		if item.Post != nil {
			posts = append(posts, path)
		}
		if item.Put != nil || item.Patch != nil || item.Delete != nil {
			t.Errorf("%s takes more than GET and POST", path)
		}
	}
	want := map[string]bool{
		"/v1/beams/{beam}/rearm": true, "/v1/facts": true, "/v1/lists": true, "/v1/lists/check": true, "/v1/lists/{authority}/{id}/confirm": true,
		"/v1/lists/{authority}/{id}/withdraw": true, "/v1/holds": true, "/v1/holds/{id}/release": true, "/v1/plan": true,
	}
	for _, p := range posts {
		if !want[p] {
			t.Errorf("POST %s is not known to be harmless", p)
		}
	}
	for _, body := range []string{`{"open":true}`, `{"force":true}`, `{"override":true}`, `{"state":"open"}`} {
		s.want(400, "adm", "POST", "/v1/beams/north/rearm", body)
	}
	if s.stage.View().Beam("north").Decision.Open {
		t.Error("the beam opened")
	}
}
