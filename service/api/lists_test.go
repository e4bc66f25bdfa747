package api

import (
	"bytes"
	"fmt"
	"strings"
	"testing"

	"beamward/closures"
	"beamward/closures/listfile"
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
	s.want(409, "ann", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`"}`)
	s.want(200, "ben", "POST", path+"/confirm", `{"digest":"`+doc.Digest+`"}`).into(t, &doc)
	if doc.Status != "withdrawn" {
		t.Errorf("withdrawn as %+v", doc)
	}
}
