package api

import (
	"bytes"
	"fmt"
	"os"
	"strings"
	"testing"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/closures/wire"
)

// listText is a list over two days about evening whose one region has windows.
func listText(authority, id, more string) string {
	return fmt.Sprintf(`closure_list: 1
id: %s
authority: %s
issued: 2031-02-13T18:05:00Z
covers: {from: 2031-02-13T00:00:00Z, until: 2031-02-16T00:00:00Z}
%s`, id, authority, more)
}

const openDome = `unlisted_sky: open
regions:
  - {id: dome, whole_sky: true, throughout: open}
windows: []
`

const closedField = `unlisted_sky: open
regions:
  - {id: f-101, icrs: {ra_deg: 150.1, dec_deg: 2.2, radius_deg: 0.05}}
windows:
  - {region: f-101, closed: {from: 2031-02-14T03:10:02Z, until: 2031-02-14T03:10:41Z}, ref: A-17}
`

func openList(t testing.TB, authority, id string) *closures.List {
	t.Helper()
	l, _, err := listfile.Load(strings.NewReader(listText(authority, id, openDome)), listfile.YAML, listfile.Limits{})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

var yaml = "Content-Type: application/yaml"

func TestAListTakesTwoPeople(t *testing.T) {
	s := newSite(t)
	text := listText("orbital-desk", "2031-045-B", closedField)
	var check checkDoc
	s.want(200, "eve", "POST", "/v1/lists/check", text, yaml).into(t, &check)
	if check.Class != "loosening" || check.Would != "wait-for-second-person" || check.Windows != 1 || check.RegionList[0].ClosedS != 39 || check.Change.ClosedS != 39 || len(check.Change.CoverAdded) != 1 {
		t.Errorf("checked as %+v", check)
	}
	if len(s.stage.View().Book) != 0 {
		t.Fatal("a check kept the list")
	}
	added := s.want(201, "ann", "POST", "/v1/lists", text, yaml)
	var doc listDoc
	added.into(t, &doc)
	if doc.Status != "waiting" || doc.Needs != "second-person" || doc.By != "ann" || doc.Digest != check.Digest {
		t.Errorf("added as %+v", doc)
	}
	if got := s.want(200, "ann", "POST", "/v1/lists", text, yaml); !bytes.Contains(got.body, []byte(check.Digest)) {
		t.Error("the same list again is not answered with what is there")
	}
	path := added.header.Get("Location")
	s.want(409, "ann", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`"}`)
	s.want(400, "ben", "POST", path+"/confirm", "")
	s.want(412, "ben", "POST", path+"/confirm", `{"digest":"`+closures.Digest{9}.String()+`"}`)
	s.want(412, "ben", "POST", path+"/confirm", "", `If-Match: "x"`)
	s.want(403, "eve", "POST", path+"/confirm", "", "If-Match: "+doc.ETag)
	s.want(200, "ben", "POST", path+"/confirm", "", "If-Match: "+doc.ETag).into(t, &doc)
	if doc.Status != "in-force" || doc.Confirmed != "ben" || doc.Needs != "nothing" {
		t.Errorf("confirmed as %+v", doc)
	}
	s.want(200, "ann", "POST", path+"/withdraw", `{"reference":"T 12"}`).into(t, &doc)
	if doc.Status != "in-force" || doc.Withdrawal != "ann" || doc.Needs != "second-person" {
		t.Errorf("withdrawal asked: %+v", doc)
	}
	s.want(409, "ann", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`","withdrawal":true}`)
	// Who means the list must not confirm its withdrawal by the same digest.
	s.want(409, "ben", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`"}`)
	s.want(200, "ben", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`","withdrawal":true}`).into(t, &doc)
	s.want(409, "ben", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`","withdrawal":true}`)
	if doc.Status != "withdrawn" {
		t.Errorf("withdrawn as %+v", doc)
	}
}

// A text that no native format reads is read by a layout of the site's config.
func TestAListIsReadByALayout(t *testing.T) {
	text, err := os.ReadFile("../../testdata/lists/layouts/message.yaml")
	if err != nil {
		t.Fatal(err)
	}
	layout, err := listfile.CompileLayout(text)
	if err != nil {
		t.Fatal(err)
	}
	message, err := os.ReadFile("../../testdata/lists/layouts/message.txt")
	if err != nil {
		t.Fatal(err)
	}
	s := newSite(t, func(o *Options) { o.Layouts = map[string]*listfile.Layout{"message": layout} })
	plain := "Content-Type: text/plain"
	a := s.do("ann", "POST", "/v1/lists/check?layout=message", string(message), plain)
	if a.status != 200 && !(a.status == 404 && bytes.Contains(a.body, []byte("its authority is not configured"))) {
		t.Errorf("read as %d %s", a.status, a.body)
	}
	s.want(422, "ann", "POST", "/v1/lists/check?layout=message", "nonsense", plain)
	s.want(422, "ann", "POST", "/v1/lists/check", string(message), plain)
	s.want(400, "ann", "POST", "/v1/lists/check?layout=other", string(message), plain)
	s.want(400, "ann", "POST", "/v1/lists/check?layout=message&format=csv", string(message), plain)
}

// BW-013: every bad line is told, and what is in force stays.
func TestEveryBadLineIsTold(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	before := s.stage.View().Book.Digest()
	var b strings.Builder
	b.WriteString("# closure_list: 1\n# id: X\n# authority: orbital-desk\n# issued: 2031-02-13T19:05:00Z\n# covers: 2031-02-14T00:00:00Z 2031-02-14T12:00:00Z\n# unlisted_sky: open\n")
	b.WriteString("region,shape,ra_deg,dec_deg,radius_deg,az_from_deg,az_to_deg,el_from_deg,el_to_deg,throughout,window,from,until,ref\n")
	for i := range 50 {
		fmt.Fprintf(&b, "r%d,icrs,NaN,1,1,,,,,,closed,2031-02-14T01:00:00Z,2031-02-14T24:00:00Z,<b>\n", i)
	}
	a := s.want(422, "ann", "POST", "/v1/lists", b.String(), csvHeader)
	p, err := wire.ParseProblem(a.body)
	if err != nil || len(p.Errors) < 50 {
		t.Fatalf("%d errors, %v: %.300s", len(p.Errors), err, a.body)
	}
	lines := map[int]bool{}
	for _, e := range p.Errors {
		lines[e.Line] = true
		if e.Detail == "" || e.Mend == "" {
			t.Errorf("line %d without cause or mend: %+v", e.Line, e)
		}
	}
	if len(lines) < 50 || bytes.Contains(a.body, []byte("<b>")) {
		t.Errorf("%d lines are told", len(lines))
	}
	if s.stage.View().Book.Digest() != before {
		t.Error("what is in force changed")
	}
}

// Sent again with its key, a confirmation is answered as before, though what
// was looked at has changed by it.
func TestAConfirmationIsDoneOnceForAKey(t *testing.T) {
	s := newSite(t)
	var doc listDoc
	s.want(201, "ann", "POST", "/v1/lists", listText("orbital-desk", "A", openDome), yaml).into(t, &doc)
	for range 2 {
		var now listDoc
		s.want(200, "ben", "POST", "/v1/lists/orbital-desk/A/confirm", "", "If-Match: "+doc.ETag, "Idempotency-Key: k-1").into(t, &now)
		if now.Status != "in-force" {
			t.Errorf("confirmed as %+v", now)
		}
	}
	s.want(412, "ben", "POST", "/v1/lists/orbital-desk/A/confirm", "", "If-Match: "+doc.ETag)
	s.want(422, "ben", "POST", "/v1/lists/orbital-desk/A/confirm", `{"digest":"x"}`, "Idempotency-Key: k-1")
	s.want(409, "ben", "POST", "/v1/lists/orbital-desk/A/confirm", `{"digest":"`+doc.Digest+`"}`)
}

func TestAListCanBeReadBack(t *testing.T) {
	s := newSite(t)
	s.want(201, "ann", "POST", "/v1/lists", listText("quick-desk", "A", closedField), yaml)
	for accept, format := range map[string]listfile.Format{"application/yaml": listfile.YAML, "text/csv": listfile.CSV} {
		a := s.want(200, "eve", "GET", "/v1/lists/quick-desk/A", "", "Accept: "+accept)
		l, _, err := listfile.Load(bytes.NewReader(a.body), format, listfile.Limits{})
		if err != nil || l.Digest() != s.stage.View().Book.Find("quick-desk", "A").List.Digest() {
			t.Errorf("as %s: %v", accept, err)
		}
	}
}
