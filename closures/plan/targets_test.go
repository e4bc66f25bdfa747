package plan_test

import (
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry"
)

// Every form that a target can have, in CSV and in JSON: the same targets.
func TestTargetsAreReadAlike(t *testing.T) {
	csv := `name,ra_deg,dec_deg,pm_ra_mas_yr,pm_dec_mas_yr,rate_ra_arcsec_s,rate_dec_arcsec_s,rate_at,az_deg,el_deg,refracted,point_at,length_s,priority,min_span_s,reacquire_s
plain,150.1,2.2,,,,,,,,,,,,,
"with, all",0,-90,-1000.5,3,,,,,,,,1800,2.5,60,45.5
drifting,10,20,,,0.1,-0.02,2031-02-14T02:00:00.5Z,,,,,600,,,
zenith,,,,,,,,0,90,true,,,,,
pole,,,,,,,,359.5,31.5,false,,,,,
comet,10,5,,,,,,,,,2031-02-14T02:00:00Z,900,3,,
comet,10.1,5,,,,,,,,,2031-02-14T03:00:00Z,,,,
comet,10.2,5.1,,,,,,,,,2031-02-14T04:00:00Z,,,,
last,360,0,,,,,,,,,,,,,
`
	json := ` [
 {"name": "plain", "ra_deg": 150.1, "dec_deg": 2.2},
 {"name": "with, all", "ra_deg": 0, "dec_deg": -90, "pm_ra_mas_yr": -1000.5, "pm_dec_mas_yr": 3, "length_s": 1800, "priority": 2.5, "min_span_s": 60, "reacquire_s": 45.5},
 {"name": "drifting", "ra_deg": 10, "dec_deg": 20, "rate_ra_arcsec_s": 0.1, "rate_dec_arcsec_s": -0.02, "rate_at": "2031-02-14T02:00:00.5Z", "length_s": 600},
 {"name": "zenith", "az_deg": 0, "el_deg": 90, "refracted": true}, {"name": "pole", "az_deg": 359.5, "el_deg": 31.5, "refracted": false},
 {"name": "comet", "length_s": 900, "priority": 3, "table": [
   {"at": "2031-02-14T02:00:00Z", "ra_deg": 10, "dec_deg": 5}, {"at": "2031-02-14T03:00:00Z", "ra_deg": 10.1, "dec_deg": 5}, {"at": "2031-02-14T04:00:00Z", "ra_deg": 10.2, "dec_deg": 5.1}]},
 {"name": "last", "ra_deg": 360, "dec_deg": 0}
]
`
	read := func(s string) []plan.Target {
		t.Helper()
		out, err := plan.ReadTargets(strings.NewReader(s))
		if err != nil {
			t.Fatal(err)
		}
		return out
	}
	a, b := read(csv), read(json)
	marked := read("\ufeff\r\n" + strings.ReplaceAll(csv, "\n", "\r\n"))
	for _, other := range [][]plan.Target{b, marked} {
		if fmt.Sprint(show(a)) != fmt.Sprint(show(other)) {
			t.Errorf("not alike:\n%v\n%v", show(a), show(other))
		}
	}
	if len(a) != 7 {
		t.Fatalf("%d targets", len(a))
	}
	const arcsec = math.Pi / 180 / 3600
	at := time.Date(2031, 2, 14, 2, 0, 0, 5e8, time.UTC)
	if o := a[1]; o.Length != 30*time.Minute || o.Priority != 2.5 || o.Use != (plan.Use{MinSpan: time.Minute, Reacquire: 45500 * time.Millisecond}) || !near15(o.Aim.PMRA, -1000.5*arcsec/1000) {
		t.Errorf("with all: %+v", o)
	}
	if o := a[2].Aim; !near15(o.RateRA, 0.1*arcsec) || !near15(o.RateDec, -0.02*arcsec) || !o.Reference.Equal(at) {
		t.Errorf("drifting: %+v", o)
	}
	if o := a[3].Aim; o.Frame != closures.Horizon || !o.Refracted || o.Motion != closures.Fixed || o.Direction.Z < 1-1e-15 {
		t.Errorf("zenith: %+v", o)
	}
	if o := a[4].Aim; o.Refracted || geometry.Separation(o.Direction, geometry.FromHorizon(359.5*s1.Degree, 31.5*s1.Degree)) > 1e-12 {
		t.Errorf("pole: %+v", o)
	}
	if o := a[5]; o.Aim.Frame != closures.Table || len(o.Aim.Points) != 3 || o.Length != 15*time.Minute || !o.Aim.Points[2].At.Equal(at.Add(2*time.Hour-5e8)) {
		t.Errorf("comet: %+v", o)
	}
	for _, o := range a {
		if !o.Aim.Valid() {
			t.Errorf("%s: the aim is not valid", o.Name)
		}
	}
}

// near15 is equality but for rounding.
func near15(a, b float64) bool { return math.Abs(a-b) <= 1e-15*math.Abs(b) }

func show(list []plan.Target) (out []string) {
	for _, o := range list {
		out = append(out, fmt.Sprintf("%s %v %v %v %+v\n", o.Name, o.Length, o.Priority, o.Use, *o.Aim))
	}
	return out
}

// What cannot be meant, each with the line and the cause that are reported.
func TestMalformedTablesAreRefused(t *testing.T) {
	const head = "name,ra_deg,dec_deg\n"
	const eph = "name,ra_deg,dec_deg,point_at,length_s\n"
	long := strings.Repeat("x", 129)
	for _, c := range []struct {
		name, text string
		line       int
		cause      string
	}{
		{"empty", "", 1, "is empty"},
		{"blank", " \n\t\r\n ", 1, "is empty"},
		{"header only", head, 1, "no targets"},
		{"no header", "a,1,2\n", 1, "column 1 is unknown"},
		{"unknown column", "name,ra_deg,dec_deg,colour\na,1,2,red\n", 1, "column 4 is unknown"},
		{"column twice", "name,ra_deg,dec_deg,ra_deg\na,1,2,3\n", 1, "column 4 is unknown or named twice"},
		{"column missing", "name,ra_deg\na,1\n", 1, "a column is missing"},
		{"no name column", "ra_deg,dec_deg\n1,2\n", 1, "a column is missing"},
		{"capitals", "Name,RA_deg,dec_deg\na,1,2\n", 1, "column 1 is unknown"},
		{"semicolons", "name;ra_deg;dec_deg\na;1;2\n", 1, "column 1 is unknown"},
		{"blanks in the header", "name, ra_deg, dec_deg\na,1,2\n", 1, "column 2 is unknown"},
		{"too few cells", head + "a,1\n", 2, "has 2 cells, not 3"},
		{"too many cells", head + "a,1,2,3\n", 2, "has 4 cells, not 3"},
		{"open quote", head + "a,1,2\n\"b,1,2\n", 3, "no CSV"},
		{"bare quote", head + "a\"b,1,2\nc,1,2\n", 2, "no CSV"},
		{"no name", head + ",1,2\n", 2, "name is not usable"},
		{"name too long", head + long + ",1,2\n", 2, "name is not usable"},
		{"control character", head + "a\x01b,1,2\n", 2, "name is not usable"},
		{"name over two lines", head + "\"a\nb\",1,2\n", 2, "name is not usable"},
		{"blank about the name", head + " a,1,2\n", 2, "name is not usable"},
		{"not UTF-8", head + "a\xff,1,2\n", 2, "name is not usable"},
		{"name twice", head + "a,1,2\nb,1,2\na,3,4\n", 4, "already on line 2"},
		{"NaN", head + "a,NaN,2\n", 2, "ra_deg is not a number"},
		{"Inf", head + "a,1,Inf\n", 2, "dec_deg is not a number"},
		{"hexadecimal", head + "a,0x10,2\n", 2, "ra_deg is not a number"},
		{"underscore", head + "a,1_0,2\n", 2, "ra_deg is not a number"},
		{"plus", head + "a,1,+2\n", 2, "dec_deg is not a number"},
		{"decimal comma", head + "a,\"1,5\",2\n", 2, "ra_deg is not a number"},
		{"blank before a number", head + "a, 1,2\n", 2, "ra_deg is not a number"},
		{"sexagesimal", head + "a,10:00:00,2\n", 2, "ra_deg is not a number"},
		{"too large to be finite", head + "a,1e999,2\n", 2, "ra_deg is not a number"},
		{"right ascension too large", head + "a,360.1,2\n", 2, "ra_deg is outside 0 to 360"},
		{"right ascension below zero", head + "a,-0.1,2\n", 2, "ra_deg is outside"},
		{"declination too large", head + "a,1,90.0001\n", 2, "dec_deg is outside -90 to 90"},
		{"declination missing", head + "a,1,\n", 2, "go together"},
		{"nowhere", head + "a,,\n", 2, "in one way where"},
		{"length below zero", "name,ra_deg,dec_deg,length_s\na,1,2,-1\n", 2, "length_s is outside"},
		{"length of a year", "name,ra_deg,dec_deg,length_s\na,1,2,3e7\n", 2, "length_s is outside"},
		{"priority below zero", "name,ra_deg,dec_deg,priority\na,1,2,-1\n", 2, "priority is outside"},
		{"proper motion too large", "name,ra_deg,dec_deg,pm_ra_mas_yr\na,1,2,1e6\n", 2, "pm_ra_mas_yr is outside"},
		{"rate without instant", "name,ra_deg,dec_deg,rate_ra_arcsec_s,rate_at\na,1,2,0.1,\n", 2, "rate and rate_at go together"},
		{"instant without rate", "name,ra_deg,dec_deg,rate_ra_arcsec_s,rate_at\na,1,2,,2031-02-14T02:00:00Z\n", 2, "rate and rate_at go together"},
		{"instant in another zone", "name,ra_deg,dec_deg,rate_ra_arcsec_s,rate_at\na,1,2,1,2031-02-14T02:00:00+01:00\n", 2, "rate_at is not an instant"},
		{"rate and proper motion", "name,ra_deg,dec_deg,pm_ra_mas_yr,rate_ra_arcsec_s,rate_at\na,1,2,5,1,2031-02-14T02:00:00Z\n", 2, "a proper motion and a rate"},
		{"two ways", "name,ra_deg,dec_deg,az_deg,el_deg,refracted\na,1,2,3,4,true\n", 2, "in one way where"},
		{"azimuth without refracted", "name,az_deg,el_deg,refracted\na,3,4,\n", 2, "refracted goes with"},
		{"refracted without azimuth", "name,ra_deg,dec_deg,az_deg,el_deg,refracted\na,1,2,,,true\n", 2, "refracted goes with"},
		{"refracted yes", "name,az_deg,el_deg,refracted\na,3,4,yes\n", 2, "neither true nor false"},
		{"motion of a fixed direction", "name,az_deg,el_deg,refracted,pm_ra_mas_yr\na,3,4,true,5\n", 2, "a motion needs"},
		{"ephemeris of one point", eph + "a,1,2,2031-02-14T02:00:00Z,\nb,1,2,,\n", 2, "has one point"},
		{"ephemeris not in order", eph + "a,1,2,2031-02-14T02:00:00Z,\na,1,2,2031-02-14T01:00:00Z,\n", 3, "not in order of time"},
		{"ephemeris with an instant twice", eph + "a,1,2,2031-02-14T02:00:00Z,\na,1,2,2031-02-14T02:00:00Z,\n", 3, "not in order of time"},
		{"ephemeris taken up again", eph + "a,1,2,2031-02-14T02:00:00Z,\na,1,2,2031-02-14T03:00:00Z,\nb,1,2,,\na,1,2,2031-02-14T04:00:00Z,\na,1,2,2031-02-14T05:00:00Z,\n", 5, "already on line 2"},
		{"length on a later point", eph + "a,1,2,2031-02-14T02:00:00Z,\na,1,2,2031-02-14T03:00:00Z,60\n", 3, "more than its place"},
		{"point without place", eph + "a,1,2,2031-02-14T02:00:00Z,\na,,,2031-02-14T03:00:00Z,\n", 3, "needs ra_deg and dec_deg"},
		{"ephemeris across the sky", eph + "a,1,2,2031-02-14T02:00:00Z,\na,181,2,2031-02-14T03:00:00Z,\n", 2, "steps of 90 degrees"},

		{"array not closed", `[{"name":"a","ra_deg":1,"dec_deg":2}`, 1, "not closed"},
		{"array of nothing", `[]`, 1, "no targets"},
		{"two arrays", `[{"name":"a","ra_deg":1,"dec_deg":2}] []`, 1, "something follows"},
		{"comma at the end", "[{\"name\":\"a\",\"ra_deg\":1,\"dec_deg\":2},\n]", 2, "cannot be read"},
		{"no object", "[1]", 1, "cannot be read"},
		{"unknown member", "[{\"name\":\"a\",\n\"ra_deg\":1,\n\"dec_deg\":2,\"colour\":1}]", 3, "cannot be read"},
		{"member twice", `[{"name":"a","ra_deg":1,"ra_deg":1,"dec_deg":2}]`, 1, "cannot be read"},
		{"member in capitals", `[{"Name":"a","ra_deg":1,"dec_deg":2}]`, 1, "cannot be read"},
		{"number as text", `[{"name":"a","ra_deg":"1","dec_deg":2}]`, 1, "cannot be read"},
		{"null", `[{"name":"a","ra_deg":1,"dec_deg":2},{"name":null,"ra_deg":1,"dec_deg":2}]`, 1, "cannot be read"},
		{"bracket astray", "[{\"name\":\"a\"}}}]", 1, "cannot be read"},
		{"out of bounds", "[{\"name\":\"a\",\"ra_deg\":1,\"dec_deg\":2},\n\n{\"name\":\"b\",\"ra_deg\":1,\"dec_deg\":-91}]", 3, "dec_deg is outside"},
		{"twice in JSON", "[{\"name\":\"a\",\"ra_deg\":1,\"dec_deg\":2},\n{\"name\":\"a\",\"ra_deg\":1,\"dec_deg\":2}]", 2, "already on line 1"},
		{"table of one", `[{"name":"a","table":[{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":2}]}]`, 1, "fewer than two points"},
		{"table with a gap", `[{"name":"a","table":[{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":2},{"at":"2031-02-14T03:00:00Z","ra_deg":1}]}]`, 1, "point 2 of the ephemeris is not whole"},
		{"table and place", `[{"name":"a","ra_deg":1,"dec_deg":2,"table":[{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":2},{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":2}]}]`, 1, "in one way where"},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, err := plan.ReadTargets(strings.NewReader(c.text))
			var r *plan.Refusal
			if !errors.As(err, &r) || out != nil {
				t.Fatalf("%v, %v", out, err)
			}
			for _, o := range r.Rows {
				if o.Line == c.line && strings.Contains(o.Cause, c.cause) && o.Mend != "" {
					return
				}
			}
			t.Errorf("%+v", r.Rows)
		})
	}
}

// Every bad row is reported, and the good ones do not save the table.
func TestEveryBadRowIsReported(t *testing.T) {
	var csv, json strings.Builder
	csv.WriteString("name,ra_deg,dec_deg\n")
	json.WriteString("[")
	for i := range 3000 {
		ra := "1"
		if i%2 == 0 {
			ra = "400"
		}
		fmt.Fprintf(&csv, "t%d,%s,1\n", i, ra)
		fmt.Fprintf(&json, "{\"name\":\"t%d\",\"ra_deg\":%s,\"dec_deg\":1},\n", i, ra)
	}
	json.WriteString(`{"name":"last","ra_deg":1,"dec_deg":1}]`)
	for first, text := range map[int]string{2: csv.String(), 1: json.String()} {
		_, err := plan.ReadTargets(strings.NewReader(text))
		var r *plan.Refusal
		if !errors.As(err, &r) || r.Total != 1500 || len(r.Rows) != 1000 || r.Rows[3].Line != first+6 {
			t.Errorf("%v", err)
		}
	}
}

// A table is bounded, in targets and in bytes, and a reader's own fault is told
// apart.
func TestTablesAreBounded(t *testing.T) {
	var b strings.Builder
	b.WriteString("name,ra_deg,dec_deg\n")
	for i := range plan.MaxTargets + 5 {
		fmt.Fprintf(&b, "%d,1,1\n", i)
	}
	_, err := plan.ReadTargets(strings.NewReader(b.String()))
	if r := (*plan.Refusal)(nil); !errors.As(err, &r) || r.Total != 1 || r.Rows[0].Line != plan.MaxTargets+2 {
		t.Errorf("too many: %v", err)
	}
	for _, head := range []string{"name,ra_deg,dec_deg\n", "["} {
		_, err = plan.ReadTargets(io.MultiReader(strings.NewReader(head), &endless{}))
		if r := (*plan.Refusal)(nil); !errors.As(err, &r) || !strings.Contains(r.Error(), "64 MiB") {
			t.Errorf("endless: %v", err)
		}
		broken := errors.New("the line went dead")
		if _, err = plan.ReadTargets(io.MultiReader(strings.NewReader(head+"a"), faulty{broken})); !errors.Is(err, broken) {
			t.Errorf("broken: %v", err)
		}
	}
}

type endless struct{}

func (*endless) Read(p []byte) (int, error) {
	for i := range p {
		p[i] = 'x'
	}
	return len(p), nil
}

type faulty struct{ err error }

func (f faulty) Read([]byte) (int, error) { return 0, f.err }

// What is read is within its bounds, whatever the bytes.
func FuzzReadTargets(f *testing.F) {
	f.Add([]byte("name,ra_deg,dec_deg,point_at\na,1,2,2031-02-14T02:00:00Z\na,1,2,2031-02-14T03:00:00Z\n"))
	f.Add([]byte("name,az_deg,el_deg,refracted,length_s,priority\n\"a,b\",1,2,true,1,1\n"))
	f.Add([]byte(`[{"name":"a","ra_deg":1,"dec_deg":2,"rate_ra_arcsec_s":1,"rate_at":"2031-02-14T02:00:00Z"}]`))
	f.Add([]byte(`[{"name":"a","table":[{"at":"2031-02-14T02:00:00Z","ra_deg":1,"dec_deg":2},{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":2}]}]`))
	f.Add([]byte("\ufeff\n [{}]"))
	f.Fuzz(func(t *testing.T, data []byte) {
		out, err := plan.ReadTargets(strings.NewReader(string(data)))
		var r *plan.Refusal
		switch {
		case err == nil && len(out) == 0:
			t.Fatal("nothing was read and nothing is wrong")
		case err != nil && (out != nil || !errors.As(err, &r) || r.Total < 1 || len(r.Rows) < 1):
			t.Fatalf("%v, %v", out, err)
		}
		if r != nil {
			for _, o := range r.Rows {
				if o.Line < 1 || o.Line > 2+strings.Count(string(data), "\n") || o.Cause == "" || len(o.Text) > 90 {
					t.Fatalf("%+v", o)
				}
			}
		}
		names := map[string]bool{}
		for _, o := range out {
			if names[o.Name] || o.Name == "" || len(o.Name) > 128 || !o.Aim.Valid() || o.Length < 0 || o.Length > 14*24*time.Hour ||
				!(o.Priority >= 0 && o.Priority <= 1e6) || o.Use.MinSpan < 0 || o.Use.Reacquire < 0 {
				t.Fatalf("%+v", o)
			}
			names[o.Name] = true
		}
	})
}
