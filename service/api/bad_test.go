package api

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"beamward/closures/wire"
)

// bad is one request that is refused, and how.
type bad struct {
	status int
	who    string // ann where empty
	method string
	path   string
	body   string
	header string // one more, "Name: value"
}

const (
	ndjsonHeader = "Content-Type: application/x-ndjson"
	csvHeader    = "Content-Type: text/csv"
	deep         = `{"beam":"north","reason":"x","region":`
)

// manyTargets are rows of a table that are good.
func manyTargets(n int) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, "target-%d,1,1\n", i)
	}
	return b.String()
}

func badRequests() []bad {
	out := []bad{
		// Paths and methods.
		{404, "", "GET", "/", "", ""}, {404, "", "GET", "/v1", "", ""}, {404, "", "GET", "/v2/beams", "", ""}, {404, "", "GET", "/v1/beams/", "", ""},
		{404, "", "GET", "/v1/beams/west", "", ""}, {404, "", "GET", "/v1/beams/../../etc/passwd", "", ""}, {404, "", "GET", "/v1/beams/..%2f..%2fetc%2fpasswd", "", ""},
		{404, "", "GET", "/v1/beams/%2e%2e/permit", "", ""}, {404, "", "GET", "/v1/beams/north%00/permit", "", ""}, {404, "", "GET", "/v1/beams/NORTH/permit", "", ""},
		{404, "", "GET", "/v1/beams/" + strings.Repeat("x", 300), "", ""}, {404, "", "GET", "/v1/lists/orbital-desk/..", "", ""}, {404, "", "GET", "/v1/lists/..%2F..%2Fetc/passwd", "", ""},
		{404, "", "GET", "/v1/holds/none", "", ""}, {404, "", "POST", "/v1/holds/none/release", "", ""}, {404, "", "POST", "/v1/lists/orbital-desk/none/confirm", `{"digest":"x"}`, ""},
		{404, "", "GET", "/v1//beams", "", ""}, {404, "", "GET", "/V1/BEAMS", "", ""},
		{405, "", "POST", "/v1/beams", "{}", ""}, {405, "", "DELETE", "/v1/holds", "", ""}, {405, "", "PUT", "/v1/lists/orbital-desk/A", "{}", ""}, {405, "", "GET", "/v1/facts", "", ""},
		{405, "", "PATCH", "/v1/beams/north", "{}", ""}, {405, "", "OPTIONS", "/v1/beams", "", ""}, {405, "", "TRACE", "/v1/beams", "", ""}, {405, "", "POST", "/healthz", "{}", ""},
		// Queries.
		{400, "", "GET", "/v1/beams?x=1", "", ""}, {400, "", "GET", "/v1/beams?beam=north", "", ""}, {400, "", "GET", "/v1/beams/north/permit?nonce=a&nonce=b", "", ""}, {400, "", "GET", "/v1/beams/north/permit?Nonce=a", "", ""},
		{400, "", "GET", "/v1/beams?a=%zz", "", ""}, {400, "", "GET", "/v1/beams?a;b", "", ""}, {400, "", "GET", "/v1/beams?" + strings.Repeat("a", 5000), "", ""}, {400, "", "GET", "/healthz?deep=1", "", ""},
		{400, "", "GET", "/v1/beams/north/permit?nonce=" + strings.Repeat("a", 65), "", ""}, {400, "", "GET", "/v1/beams/north/permit?nonce=a%20b", "", ""}, {400, "", "GET", "/v1/beams/north/permit?nonce=%3Cscript%3E", "", ""},
		{400, "", "GET", "/v1/beams/north/permit?nonce=%C3%A4", "", ""}, {400, "", "GET", "/v1/beams/north/permit?nonce=a%0d%0aSet-Cookie:x", "", ""},
		{400, "", "GET", "/v1/lists?limit=0", "", ""}, {400, "", "GET", "/v1/lists?limit=1001", "", ""}, {400, "", "GET", "/v1/lists?limit=1e2", "", ""}, {400, "", "GET", "/v1/lists?limit=-1", "", ""},
		{400, "", "GET", "/v1/lists?limit=010", "", ""}, {400, "", "GET", "/v1/lists?limit=", "", ""}, {400, "", "GET", "/v1/lists?cursor=xyz", "", ""}, {400, "", "GET", "/v1/lists?cursor=", "", ""}, {400, "", "GET", "/v1/lists?status=open", "", ""},
		{400, "", "GET", "/v1/closures?ra_deg=10", "", ""}, {400, "", "GET", "/v1/closures?format=pdf", "", ""}, {404, "", "GET", "/v1/closures?beam=west", "", ""},
		{400, "", "GET", "/v1/closures?from=2031-02-14T01:00:00Z&until=2031-02-14T01:00:00Z", "", ""}, {400, "", "GET", "/v1/closures?until=2031-02-14T00:00:00Z", "", ""}, {400, "", "GET", "/v1/closures?until=2032-02-14T00:00:00Z", "", ""},
		{400, "", "GET", "/v1/record?kinds=A", "", ""}, {400, "", "GET", "/v1/record?order=random", "", ""}, {400, "", "GET", "/v1/record?after=1.0", "", ""}, {400, "", "GET", "/v1/record?after=18446744073709551616", "", ""},
		// Who may not.
		{401, "nobody", "GET", "/v1/beams", "", ""}, {401, "", "GET", "/v1/beams", "", "Authorization: Bearer bw_wrong"}, {401, "", "GET", "/v1/beams", "", "Authorization: Basic YTpi"}, {401, "nobody", "GET", "/nothing", "", ""},
		{403, "eve", "POST", "/v1/facts", "{}", ndjsonHeader}, {403, "eve", "POST", "/v1/lists", "x", yaml}, {403, "rx", "GET", "/v1/beams", "", ""}, {403, "rx", "GET", "/v1/stream", "", ""}, {403, "eve", "POST", "/v1/beams/north/rearm", "", ""},
		{403, "", "POST", "/v1/holds", "{}", "Origin: http://evil.example"}, {403, "", "POST", "/v1/holds", "{}", "Sec-Fetch-Site: cross-site"},
		// What is wanted and what is sent.
		{406, "", "GET", "/v1/beams", "", "Accept: text/html"}, {406, "", "GET", "/v1/stream", "", "Accept: application/json"}, {406, "", "GET", "/v1/beams", "", "Accept: application/json;q=0"}, {406, "", "GET", "/v1/beams", "", "Accept: application/json;q=x"},
		{415, "", "POST", "/v1/holds", "{}", "Content-Type: text/plain"}, {415, "", "POST", "/v1/holds", "{}", "Content-Type: -"}, {415, "", "POST", "/v1/holds", "{}", "Content-Type: application/json; charset=latin1"},
		{415, "", "POST", "/v1/holds", "{}", "Content-Type: application/json; boundary=x"}, {415, "", "POST", "/v1/holds", "{}", "Content-Encoding: gzip"}, {415, "", "POST", "/v1/facts", "{}", ""}, {415, "", "POST", "/v1/lists", "x", "Content-Type: image/png"},
		{415, "", "POST", "/v1/plan?beam=north", "x", "Content-Type: application/yaml"}, {415, "", "POST", "/v1/holds", "{}", "Content-Type: application/x-www-form-urlencoded"},
		{413, "", "POST", "/v1/holds", `{"beam":"north","reason":"` + strings.Repeat("a", 70_000) + `"}`, ""}, {413, "", "POST", "/v1/beams/north/rearm", strings.Repeat(" ", 70_000), ""}, {413, "", "POST", "/v1/facts", strings.Repeat("\n", 2<<20), ndjsonHeader},
		{413, "", "POST", "/v1/plan?beam=north", "name,ra_deg,dec_deg\n" + manyTargets(100_000), csvHeader},
		// JSON.
		{400, "", "POST", "/v1/holds", ``, "Content-Type: application/json"}, {400, "", "POST", "/v1/holds", `null x`, ""}, {400, "", "POST", "/v1/holds", `[]`, ""}, {400, "", "POST", "/v1/holds", `"x"`, ""}, {400, "", "POST", "/v1/holds", `{`, ""},
		{400, "", "POST", "/v1/holds", `{"beam":"north","reason":"x"} {}`, ""}, {400, "", "POST", "/v1/holds", `{"beam":"north","reason":"x",}`, ""}, {400, "", "POST", "/v1/holds", `{'beam':'north'}`, ""},
		{400, "", "POST", "/v1/holds", `{"beam":"north","beam":"south","reason":"x"}`, ""}, {400, "", "POST", "/v1/holds", `{"Beam":"north","reason":"x"}`, ""}, {400, "", "POST", "/v1/holds", `{"beam":"north","BEAM":"north","reason":"x"}`, ""},
		{400, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","open":true}`, ""}, {400, "", "POST", "/v1/holds", `{"beam":null,"reason":"x"}`, ""}, {400, "", "POST", "/v1/holds", `{"beam":1,"reason":"x"}`, ""}, {400, "", "POST", "/v1/holds", "{\"beam\":\"north\",\"reason\":\"\xff\"}", ""},
		{400, "", "POST", "/v1/holds", `{"beam":"north","reason":"\ud800"}`, ""}, {400, "", "POST", "/v1/holds", strings.Repeat(`{"region":`, 40) + "1" + strings.Repeat("}", 40), ""}, {400, "", "POST", "/v1/holds", "\ufeff{}", ""},
		{400, "", "POST", "/v1/beams/north/rearm", `{"note":["x"]}`, ""}, {400, "", "POST", "/v1/lists/orbital-desk/2031-045-A/confirm", `{"digest":7}`, ""},
		// What cannot be meant.
		{422, "", "POST", "/v1/holds", `{}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":""}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north/..","reason":"x"}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":"a\nb"}`, ""},
		{422, "", "POST", "/v1/holds", `{"beam":"north","reason":"a\u202eb"}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","order":"me"}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","by":"ben"}`, ""},
		{404, "", "POST", "/v1/holds", `{"beam":"west","reason":"x"}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","until":"2031-02-14T00:00:00Z"}`, ""}, {422, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","from":"2031-02-14T05:00:00Z","until":"2031-02-14T04:00:00Z"}`, ""},
		{422, "", "POST", "/v1/holds", deep + `{}}`, ""}, {422, "", "POST", "/v1/holds", deep + `{"whole_sky":true,"icrs":{"ra_deg":1,"dec_deg":1,"radius_deg":1}}}`, ""}, {422, "", "POST", "/v1/holds", deep + `{"icrs":{"ra_deg":361,"dec_deg":1,"radius_deg":1}}}`, ""},
		{422, "", "POST", "/v1/holds", deep + `{"icrs":{"ra_deg":1,"dec_deg":1,"radius_deg":0}}}`, ""}, {422, "", "POST", "/v1/holds", deep + `{"horizon":{"az_from_deg":1,"az_to_deg":1,"el_from_deg":1,"el_to_deg":2}}}`, ""},
		{422, "", "POST", "/v1/holds", deep + `{"track":{"radius_deg":1,"points":[]}}}`, ""}, {422, "", "POST", "/v1/holds", deep + `{"track":{"radius_deg":1,"points":[{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":1},{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":1}]}}}`, ""},
		{422, "", "POST", "/v1/lists/orbital-desk/2031-045-A/withdraw", `{"reference":"a\tb"}`, ""},
		// Lists and tables.
		{422, "", "POST", "/v1/lists", "\x00\x01", "Content-Type: application/octet-stream"}, {422, "", "POST", "/v1/lists", `{"closure_list":1}`, ""}, {400, "", "POST", "/v1/lists?format=xml", "x", yaml}, {422, "", "POST", "/v1/lists?format=json", "closure_list: 1", yaml},
		{404, "", "POST", "/v1/lists", listText("no-desk", "A", openDome), yaml}, {404, "eve", "POST", "/v1/lists/check", listText("no-desk", "A", openDome), yaml}, {409, "", "POST", "/v1/lists", listText("orbital-desk", "2031-045-A", closedField), yaml}, {409, "eve", "POST", "/v1/lists/check", listText("orbital-desk", "2031-045-A", closedField), yaml},
		{422, "", "POST", "/v1/lists", listText("orbital-desk", "C", "replaces: [none]\n"+openDome), yaml}, {422, "", "POST", "/v1/lists", strings.Replace(listText("orbital-desk", "C", openDome), "covers: {from", "covers: {frm", 1), yaml},
		{400, "", "POST", "/v1/plan", "name,ra_deg,dec_deg\na,1,1\n", csvHeader}, {404, "", "POST", "/v1/plan?beam=west", "name,ra_deg,dec_deg\na,1,1\n", csvHeader}, {422, "", "POST", "/v1/plan?beam=north", "name,ra_deg\na,1\n", csvHeader}, {422, "", "POST", "/v1/plan?beam=north", "", csvHeader + "; charset=utf-8"},
		{422, "", "POST", "/v1/plan?beam=north", `[{"name":"a","ra_deg":1,"dec_deg":91}]`, ""}, {422, "", "POST", "/v1/plan?beam=north", `[{"name":"a","name":"b","ra_deg":1,"dec_deg":1}]`, ""}, {400, "", "POST", "/v1/plan?beam=north&until=2031-03-14T01:00:00Z", "name,ra_deg,dec_deg\na,1,1\n", csvHeader},
		{503, "", "GET", "/v1/record", "", ""},
	}
	// Odd numbers and times, wherever there is one.
	for _, n := range []string{"NaN", "Inf", "-Inf", "infinity", "0x10", "1_0", "+1", "1.", ".5", "01", "1e", "1,5", "٣", "1%20", "", "1e999", "--1"} {
		out = append(out,
			bad{400, "", "GET", "/v1/beams/north/outlook?hours=" + n, "", ""},
			bad{400, "", "GET", "/v1/closures?dec_deg=0&ra_deg=" + n, "", ""},
		)
		if n != "" && n != "1%20" {
			out = append(out, bad{400, "", "POST", "/v1/holds", deep + `{"icrs":{"ra_deg":` + n + `,"dec_deg":1,"radius_deg":1}}}`, ""})
		}
	}
	for _, n := range []string{"0", "-1", "48.1", "1e3"} {
		out = append(out, bad{400, "", "GET", "/v1/beams/north/outlook?hours=" + n, "", ""})
	}
	for _, when := range []string{
		"2031-02-14T24:00:00Z", "2031-02-14T03:10:60Z", "2031-02-14T03:60:00Z", "2031-02-30T03:10:00Z", "2031-02-14T03:10:00", "2031-02-14T03:10:00+01:00", "2031-02-14T03:10:00%2B00:00", "2031-02-14t03:10:00z", "2031-02-14 03:10:00Z",
		"2031-02-14T3:10:00Z", "2031-02-14T03:10:00,5Z", "2031-02-14T03:10Z", "2031-2-14T03:10:00Z", "31-02-14T03:10:00Z", "1923910202", "now", "", "2031-02-14T03:10:00.Z", "0000-02-14T03:10:00Z", "9999-02-14T03:10:00Z",
	} {
		out = append(out, bad{400, "", "GET", "/v1/closures?from=" + strings.ReplaceAll(when, " ", "%20"), "", ""})
		out = append(out, bad{400, "", "POST", "/v1/holds", `{"beam":"north","reason":"x","from":"` + when + `"}`, ""})
	}
	return out
}

// Each is refused with its status by a problem document that repeats nothing
// unescaped, and nothing comes of it.
func TestBadRequestsAreRefused(t *testing.T) {
	s := newSite(t, func(o *Options) {
		o.Limits = Limits{Facts: 1 << 20, Targets: 1 << 20, Requests: Rate{1e6, 1e6}, Writes: Rate{1e6, 1e6}, Holds: Rate{1e6, 1e6}, Feeds: Rate{1e6, 1e6}}
	})
	s.tokens["nobody"] = ""
	s.stage.opened(t)
	book, holds := fmt.Sprint(s.stage.View().Book.Digest()), len(s.stage.View().Holds)
	all := badRequests()
	if len(all) < 80 {
		t.Fatalf("only %d bad requests", len(all))
	}
	for _, b := range all {
		who := b.who
		if who == "" {
			who = "ann"
		}
		if who == "nobody" {
			who = ""
		}
		var headers []string
		if b.header != "" {
			headers = append(headers, b.header)
		}
		a := s.do(who, b.method, b.path, b.body, headers...)
		name := fmt.Sprintf("%s %.80s %.60q %s", b.method, b.path, b.body, b.header)
		if a.status != b.status {
			t.Errorf("%s: %d, want %d: %.200s", name, a.status, b.status, a.body)
			continue
		}
		if a.header.Get("Content-Type") != wire.ProblemType || a.header.Get("X-Content-Type-Options") != "nosniff" || a.header.Get("Cache-Control") != "no-store" {
			t.Errorf("%s: headers %v", name, a.header)
		}
		p, err := wire.ParseProblem(a.body)
		if err != nil || p.Status != b.status || p.Title == "" || p.Type == "" {
			t.Errorf("%s: no problem document: %s", name, a.body)
		}
		if bytes.ContainsAny(a.body, "<>\x00\r\n") || !json.Valid(a.body) {
			t.Errorf("%s: the answer is not escaped: %q", name, a.body)
		}
		if (b.status == 405) != (a.header.Get("Allow") != "") {
			t.Errorf("%s: Allow is %q", name, a.header.Get("Allow"))
		}
		if (b.status == 401) != (a.header.Get("Www-Authenticate") != "") {
			t.Errorf("%s: WWW-Authenticate is %q", name, a.header.Get("Www-Authenticate"))
		}
	}
	if fmt.Sprint(s.stage.View().Book.Digest()) != book || len(s.stage.View().Holds) != holds || !s.stage.View().Beam("north").Decision.Open {
		t.Error("something came of a bad request")
	}
}

// What a client sent comes back only as JSON strings that stand for it.
func TestInputIsNotEchoed(t *testing.T) {
	s := newSite(t)
	const script = `<script>alert(1)</script>`
	for _, a := range []answer{
		s.do("ann", "POST", "/v1/lists", script, yaml), s.do("ann", "POST", "/v1/lists", "a,"+script, csvHeader), s.do("ann", "POST", "/v1/holds", `{"`+script+`":1}`),
		s.do("ann", "GET", "/v1/beams?"+strings.NewReplacer("<", "%3C", ">", "%3E").Replace(script), ""), s.do("ann", "POST", "/v1/plan?beam=north", "name,ra_deg,dec_deg\n"+script+",x,1\n", csvHeader),
	} {
		if a.status < 400 || bytes.Contains(a.body, []byte("<")) {
			t.Errorf("%d %s", a.status, a.body)
		}
	}
}

// The Host header is checked where nobody signs in by name: a page may have
// pointed a name of its own at the loopback address.
func TestHostIsChecked(t *testing.T) {
	s := newLocal(t)
	s.want(200, "", "GET", "/v1/beams", "")
	for _, host := range []string{"evil.example", "localhost.evil.example", "8.8.8.8:80"} {
		r := s.request("GET", "/v1/beams")
		r.Host = host
		a := s.send(r)
		if a.status != 403 {
			t.Errorf("Host %s: %d", host, a.status)
		}
	}
}
