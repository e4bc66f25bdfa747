package api

import (
	"context"
	"encoding/csv"
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	ics "github.com/arran4/golang-ical"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
)

// scene adds aircraft, a neighbour's aim, a list with windows and a hold.
func (s *site) scene() {
	s.t.Helper()
	at, _ := s.stage.Read()
	nan := geometry.Length(nanValue())
	for i := range 5 {
		err := s.stage.apply(closures.AircraftSeen{
			Source: "rx-1", Said: at, Aircraft: fmt.Sprintf("a%d", 9-i), Located: true, AltitudeFrom: closures.AboveEllipsoid,
			Position: earth.Position{Lat: -30 * s1.Degree, Lon: -4 * s1.Degree, Height: 9000}, Speed: 200, Track: 90 * s1.Degree, Climb: geometry.Speed(nan), Error: nan, VerticalError: nan, VelocityError: geometry.Speed(nan), VerticalVelError: geometry.Speed(nan),
		})
		if err != nil {
			s.t.Fatal(err)
		}
	}
	aim := &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(10*s1.Degree, 50*s1.Degree), Reference: at, Error: geometry.Arcsecond, Motion: closures.Tracking}
	if err := s.stage.apply(closures.AimSeen{Telescope: "ridge-2", Said: at, Aim: aim, Exposing: closures.Yes}); err != nil {
		s.t.Fatal(err)
	}
	s.want(201, "ann", "POST", "/v1/lists", listText("quick-desk", "W", closedField), yaml)
	s.want(201, "ann", "POST", "/v1/holds", `{"beam":"south","reason":"=work at the dome","from":"2031-02-14T05:00:00.3Z","until":"2031-02-14T06:00:00Z"}`)
}

// fakeRecord is a record of so many entries, numbered from 1.
type fakeRecord int

func (n fakeRecord) Read(_ context.Context, q RecordQuery) ([]RecordEntry, error) {
	var out []RecordEntry
	for i := 1; i <= int(n); i++ {
		seq := uint64(i)
		if seq <= q.After || q.Before != 0 && seq >= q.Before {
			continue
		}
		e := RecordEntry{Seq: seq, At: evening.Add(time.Duration(i) * time.Second), Kind: "tick", Body: []byte(`{"n":` + fmt.Sprint(i) + `}`)}
		if i%3 == 0 {
			e.Kind, e.Body = "raw", []byte("\xff no JSON")
		}
		if len(q.Kinds) == 0 || slices.Contains(q.Kinds, e.Kind) {
			out = append(out, e)
		}
	}
	if q.NewestFirst {
		slices.Reverse(out)
	}
	return out[:min(len(out), q.Limit)], nil
}

func TestPagesGiveEachThingOnce(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Record = fakeRecord(25) })
	s.scene()
	for _, c := range []struct{ path, field string }{{"/v1/record?limit=4", "entries"}, {"/v1/record?limit=4&order=newest", "entries"}, {"/v1/record?limit=3&kinds=raw", "entries"}, {"/v1/aircraft?limit=2", "aircraft"}, {"/v1/lists?limit=1", "lists"}, {"/v1/closures?limit=1", "closures"}} {
		seen := map[string]bool{}
		path, pages := c.path, 0
		for path != "" && pages < 50 {
			var page map[string]any
			s.want(200, "eve", "GET", path, "").into(t, &page)
			for _, e := range arr(page[c.field]) {
				key := fmt.Sprint(e)
				if seen[key] {
					t.Errorf("%s: %s comes twice", c.path, key)
				}
				seen[key] = true
			}
			path = ""
			if cursor := str(page["cursor"]); cursor != "" {
				path = c.path + "&cursor=" + cursor
			}
			pages++
		}
		want := map[string]int{"/v1/record?limit=4": 25, "/v1/record?limit=4&order=newest": 25, "/v1/record?limit=3&kinds=raw": 8, "/v1/aircraft?limit=2": 5, "/v1/lists?limit=1": 1}[c.path]
		if want != 0 && len(seen) != want || len(seen) < 1 {
			t.Errorf("%s: %d in %d pages, want %d", c.path, len(seen), pages, want)
		}
	}
	// A cursor fits its own query and no other.
	var page recordDoc
	s.want(200, "eve", "GET", "/v1/record?limit=4", "").into(t, &page)
	s.want(400, "eve", "GET", "/v1/record?limit=4&order=newest&cursor="+page.Cursor, "")
	s.want(400, "eve", "GET", "/v1/aircraft?cursor="+page.Cursor, "")
	s.want(200, "eve", "GET", "/v1/record?limit=9&cursor="+page.Cursor, "")
}

func TestWhatIsKnownIsShown(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	s.scene()
	var src sourcesDoc
	s.want(200, "eve", "GET", "/v1/sources", "").into(t, &src)
	if len(src.Sources) != 3 || src.Sources[0].ID != "catwalk" || src.Sources[0].State != "heard" || src.Sources[0].Safe == nil || !*src.Sources[0].Safe || src.Sources[2].State != "silent" || src.Sources[2].AgeS != nil {
		t.Errorf("sources %+v", src.Sources)
	}
	var air aircraftDoc
	s.want(200, "eve", "GET", "/v1/aircraft", "").into(t, &air)
	if air.Total != 5 || air.Aircraft[0].Aircraft != "a5" || air.Aircraft[0].RangeM == nil || *air.Aircraft[0].RangeM < 160e3 || air.Aircraft[0].ClimbMPS != nil || air.Aircraft[0].Az == nil {
		t.Errorf("aircraft %+v", air)
	}
	var near neighboursDoc
	s.want(200, "eve", "GET", "/v1/neighbours", "").into(t, &near)
	if n := near.Neighbours; len(n) != 1 || n[0].State != "heard" || n[0].Horizon == nil || n[0].Horizon.Az < 9.9 || n[0].Horizon.Az > 10.1 || n[0].Exposing == nil || n[0].WhenSilent != "ignore" {
		t.Errorf("neighbours %+v", n)
	}
}

func TestClosuresInEachForm(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	s.scene()
	var d closuresDoc
	s.want(200, "eve", "GET", "/v1/closures?from=2031-02-14T01:00:00Z&until=2031-02-14T12:00:00Z", "").into(t, &d)
	find := func(code, region string) *closureDoc {
		for i := range d.Closures {
			if d.Closures[i].Code == code && d.Closures[i].Region == region {
				return &d.Closures[i]
			}
		}
		t.Fatalf("no closure %s %s in %+v", code, region, d.Closures)
		return nil
	}
	// from - lead - margin time - clock error, and until + tail + clock error.
	margin, clockError := 700*time.Millisecond, siteRules().PlanClockError()
	w := find("listed-closure", "f-101")
	if from := time.Date(2031, 2, 14, 3, 10, 2, 0, time.UTC).Add(-5*time.Second - margin - clockError); !w.From.Equal(from) || !w.Until.Equal(time.Date(2031, 2, 14, 3, 10, 41, 0, time.UTC).Add(clockError)) || w.Ref != "A-17" || w.Beam != "" {
		t.Errorf("the window is closed %v to %v", w.From, w.Until)
	}
	if h := find("hold", ""); h.Beam != "south" || !strings.HasPrefix(h.Detail, "=work") {
		t.Errorf("hold %+v", h)
	}
	if day := find("daylight", ""); day.From.Before(evening) {
		t.Errorf("daylight %+v", day)
	}
	// Of one direction, only what stands against it.
	s.want(200, "eve", "GET", "/v1/closures?beam=north&ra_deg=150.1&dec_deg=2.2&from=2031-02-14T01:00:00Z&until=2031-02-14T04:00:00Z", "").into(t, &d)
	if w := find("listed-closure", "f-101"); w.Beam != "north" {
		t.Errorf("%+v", w)
	}
	s.want(200, "eve", "GET", "/v1/closures?beam=north&ra_deg=151&dec_deg=2.2&from=2031-02-14T01:00:00Z&until=2031-02-14T04:00:00Z", "").into(t, &d)
	for _, c := range d.Closures {
		if c.Region == "f-101" {
			t.Errorf("a region a degree off closes: %+v", c)
		}
	}
	table := s.want(200, "eve", "GET", "/v1/closures?format=csv", "")
	rows := csv.NewReader(strings.NewReader(string(table.body)))
	rows.Comment = '#'
	all, err := rows.ReadAll()
	if err != nil || len(all) < 3 || !strings.HasPrefix(string(table.body), "# for information, not for control\n") || strings.Contains(string(table.body), ",=work") {
		t.Errorf("table %v: %s", err, table.body)
	}
	cal := s.want(200, "eve", "GET", "/v1/closures", "", "Accept: text/calendar")
	parsed, err := ics.ParseCalendar(strings.NewReader(string(cal.body)))
	if err != nil || len(parsed.Events()) != len(all)-1 || !strings.HasPrefix(cal.header.Get("Content-Type"), "text/calendar") {
		t.Errorf("calendar %v with %d events, want %d", err, len(parsed.Events()), len(all)-1)
	}
}

func TestPlansAreStreamed(t *testing.T) {
	s := newSite(t)
	s.stage.opened(t)
	s.scene()
	var table strings.Builder
	table.WriteString("name,ra_deg,dec_deg\nf-101,150.1,2.2\n")
	for i := range 600 {
		fmt.Fprintf(&table, "t%d,%d,%d\n", i, i%360, i%90-60)
	}
	path := "/v1/plan?beam=north&from=2031-02-14T01:00:00Z&until=2031-02-14T05:00:00Z"
	var d planDoc
	s.want(200, "eve", "POST", path, table.String(), csvHeader).into(t, &d)
	if len(d.Targets) != 601 || d.Targets[0].Name != "f-101" || d.Targets[600].Name != "t599" || len(d.LeftOut) == 0 || d.Notice == "" {
		t.Fatalf("%d targets, head %+v", len(d.Targets), d.PlanHead)
	}
	blocked := false
	for _, b := range d.Targets[0].Blocked {
		blocked = blocked || b.Region == "f-101"
	}
	if !blocked {
		t.Errorf("the listed window does not block: %+v", d.Targets[0])
	}
	for _, target := range d.Targets {
		for _, a := range target.Allowed {
			for _, b := range target.Blocked {
				if b.From != nil && b.Until != nil && a.From.Before(*b.Until) && b.From.Before(a.Until) {
					t.Fatalf("%s is allowed %v to %v and blocked %v to %v", target.Name, a.From, a.Until, b.From, b.Until)
				}
			}
		}
	}
	lines := strings.Split(strings.TrimSpace(string(s.want(200, "eve", "POST", path, table.String(), csvHeader, "Accept: application/x-ndjson").body)), "\n")
	if len(lines) != 603 || lines[602] != `{"done":true,"targets":601}` {
		t.Errorf("%d lines, the last %s", len(lines), lines[len(lines)-1])
	}
	rows := csv.NewReader(strings.NewReader(string(s.want(200, "eve", "POST", path+"&format=csv", table.String(), csvHeader).body)))
	rows.Comment = '#'
	if all, err := rows.ReadAll(); err != nil || len(all) < 600 {
		t.Errorf("table of %d rows: %v", len(all), err)
	}
	s.want(200, "eve", "POST", path+"&format=ics", `[{"name":"a","ra_deg":150.1,"dec_deg":2.2}]`)
}

func TestReadinessSaysWhatIsMissing(t *testing.T) {
	s := newSite(t)
	s.want(200, "", "GET", "/healthz", "")
	s.want(200, "", "GET", "/readyz", "")
	s.stage.set(func(s *stage) { s.record = Condition{Failed: true, Behind: 2 * time.Second} })
	var d readyDoc
	a := s.want(503, "eve", "GET", "/readyz", "")
	a.into(t, &d)
	if d.Ready || len(d.Missing) != 2 || a.header.Get("Retry-After") == "" {
		t.Errorf("%+v", d)
	}
	if a := s.want(503, "", "GET", "/readyz", ""); strings.Contains(string(a.body), "disk") {
		t.Errorf("anybody is told %s", a.body)
	}
}
