package wire

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
)

var received = time.Date(2031, 2, 14, 3, 10, 2, 0, time.UTC)

const at = `"at":"2031-02-14T03:10:01.5Z"`

var said = time.Date(2031, 2, 14, 3, 10, 1, 500000000, time.UTC)

// near lets numbers differ by what a turn of units and back rounds off.
var near = cmp.Options{
	cmpopts.EquateEmpty(),
	cmp.Comparer(func(a, b r3.Vector) bool { return a == b || a.Sub(b).Norm() < 1e-14 }),
	cmp.Comparer(func(a, b time.Time) bool { return a.Equal(b) }),
	cmp.Comparer(nearly[float64]), cmp.Comparer(nearly[s1.Angle]), cmp.Comparer(nearly[geometry.Length]), cmp.Comparer(nearly[geometry.Speed]),
}

func nearly[T ~float64](a, b T) bool {
	x, y := float64(a), float64(b)
	return x == y || math.IsNaN(x) && math.IsNaN(y) || math.Abs(x-y) <= 1e-15+1e-14*math.Abs(x)
}

// same lets only NaN equal NaN.
var same = cmp.Options{
	cmp.Comparer(sameBits[float64]), cmp.Comparer(sameBits[s1.Angle]), cmp.Comparer(sameBits[geometry.Length]), cmp.Comparer(sameBits[geometry.Speed]),
	cmp.Comparer(func(a, b r3.Vector) bool { return sameBits(a.X, b.X) && sameBits(a.Y, b.Y) && sameBits(a.Z, b.Z) }),
}

func sameBits[T ~float64](a, b T) bool {
	return math.Float64bits(float64(a)) == math.Float64bits(float64(b)) || a != a && b != b
}

const deg = s1.Angle(math.Pi / 180)

func TestFactsSayWhatTheyMean(t *testing.T) {
	nan := math.NaN()
	cases := []struct {
		line string
		name closures.Source
		want closures.Body
	}{
		{
			`{"kind":"aim","beam":"north",` + at + `,"icrs":{"ra_deg":90,"dec_deg":0},"rate_arcsec_s":{"ra":3600,"dec":-1800},"pm_mas_yr":{"ra":1000,"dec":-500},"error_arcsec":30,"from":"encoder","target":"f-101","motion":"tracking"}`,
			"north", closures.AimSeen{
				Beam: "north", Said: said, From: "encoder", Target: "f-101", Aim: &closures.Aim{
					Frame: closures.ICRS, Direction: r3.Vector{Y: 1}, Reference: said, RateRA: math.Pi / 180, RateDec: -math.Pi / 360,
					PMRA: math.Pi / 648000, PMDec: -math.Pi / 1296000, Error: 30 * geometry.Arcsecond, Motion: closures.Tracking,
				},
			},
		},
		{
			`{"kind":"aim","telescope":"ridge-2",` + at + `,"horizon":{"az_deg":90,"el_deg":0},"refracted":true,"rate_arcsec_s":{"az":0,"el":3600},"field_radius_deg":0.25,"exposing":true}`,
			"ridge-2", closures.AimSeen{
				Telescope: "ridge-2", Said: said, Field: 0.25 * deg, Exposing: closures.Yes, Aim: &closures.Aim{
					Frame: closures.Horizon, Direction: r3.Vector{X: 1}, Reference: said, Refracted: true, RateDec: math.Pi / 180,
				},
			},
		},
		{
			`{"kind":"aim","telescope":"ridge-2",` + at + `,"horizon":{"el_deg":90,"az_deg":360},"refracted":false,"exposing":false,"motion":"parked"}`,
			"ridge-2", closures.AimSeen{
				Telescope: "ridge-2", Said: said, Exposing: closures.No, Aim: &closures.Aim{
					Frame: closures.Horizon, Direction: r3.Vector{Z: 1}, Reference: said, Motion: closures.Parked,
				},
			},
		},
		{
			`{"of_date":{"ra_deg":180,"dec_deg":0},"kind":"aim",` + at + `,"beam":"north"}`,
			"north", closures.AimSeen{Beam: "north", Said: said, Aim: &closures.Aim{Frame: closures.OfDate, Direction: r3.Vector{X: -1}, Reference: said}},
		},
		{
			`{"kind":"aim","beam":"north",` + at + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":0,"dec_deg":0},{"ra_deg":0,"dec_deg":45,"at":"2031-02-14T04:00:00Z"}],"motion":"fixed","target":"comet é (a)"}`,
			"north", closures.AimSeen{
				Beam: "north", Said: said, Target: "comet é (a)", Aim: &closures.Aim{Frame: closures.Table, Motion: closures.Fixed, Points: []closures.AimPoint{
					{At: time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC), Direction: r3.Vector{X: 1}},
					{At: time.Date(2031, 2, 14, 4, 0, 0, 0, time.UTC), Direction: r3.Vector{X: math.Sqrt2 / 2, Z: math.Sqrt2 / 2}},
				}},
			},
		},
		{
			`{"kind":"aircraft","source":"rx-1",` + at + `,"aircraft":"a1b2c3","lat_deg":-31.5,"lon_deg":-4,"altitude_m":10000,"altitude_from":"pressure","speed_mps":230,"track_deg":270,"climb_mps":-5,"error_m":50,"vertical_error_m":100,"velocity_error_mps":10,"vertical_velocity_error_mps":2,"on_ground":false}`,
			"rx-1", closures.AircraftSeen{
				Source: "rx-1", Said: said, Aircraft: "a1b2c3", Located: true, Position: earth.Position{Lat: -31.5 * deg, Lon: -4 * deg, Height: 10000},
				AltitudeFrom: closures.PressureAltitude, Speed: 230, Track: 270 * deg, Climb: -5, Error: 50, VerticalError: 100, VelocityError: 10, VerticalVelError: 2,
			},
		},
		{
			`{"kind":"aircraft","source":"rx-1",` + at + `,"aircraft":"a1b2c3","on_ground":true,"drill":true}`,
			"rx-1", closures.AircraftSeen{
				Source: "rx-1", Said: said, Aircraft: "a1b2c3", Position: earth.Position{Lat: s1.Angle(nan), Lon: s1.Angle(nan), Height: geometry.Length(nan)},
				Speed: geometry.Speed(nan), Track: s1.Angle(nan), Climb: geometry.Speed(nan), Error: geometry.Length(nan), VerticalError: geometry.Length(nan),
				VelocityError: geometry.Speed(nan), VerticalVelError: geometry.Speed(nan), OnGround: true, Drill: true,
			},
		},
		{
			`{"kind":"sighting","source":"spotter-east",` + at + `,"az_deg":0,"el_deg":30,"spread_deg":10,"for_s":60.5}`,
			"spotter-east", closures.Sighted{
				Source: "spotter-east", Said: said, HasDirection: true, Direction: r3.Vector{Y: math.Sqrt(3) / 2, Z: 0.5}, Spread: 10 * deg, For: 60500 * time.Millisecond,
			},
		},
		{`{"kind":"sighting","source":"spotter-east",` + at + `}`, "spotter-east", closures.Sighted{Source: "spotter-east", Said: said}},
		{`{"kind":"sighting","source":"spotter-east",` + at + `,"clear":true}`, "spotter-east", closures.Sighted{Source: "spotter-east", Said: said, Clear: true}},
		{`{"kind":"detector","source":"thermal-1",` + at + `,"state":"clear"}`, "thermal-1", closures.DetectorSeen{Source: "thermal-1", Said: said, State: closures.DetectorClear}},
		{`{"kind":"detector","source":"thermal-1",` + at + `,"state":"alarm"}`, "thermal-1", closures.DetectorSeen{Source: "thermal-1", Said: said, State: closures.DetectorAlarm}},
		{`{"kind":"detector","source":"thermal-1",` + at + `,"state":"blind"}`, "thermal-1", closures.DetectorSeen{Source: "thermal-1", Said: said, State: closures.DetectorBlind}},
		{`{"kind":"interlock","source":"catwalk",` + at + `,"safe":true}`, "catwalk", closures.InterlockSeen{Source: "catwalk", Said: said, Safe: true}},
		{`{"kind":"interlock","source":"catwalk",` + at + `,"safe":false}`, "catwalk", closures.InterlockSeen{Source: "catwalk", Said: said}},
		{`{"kind":"shutter","beam":"north",` + at + `,"position":"open"}`, "north", closures.ShutterSeen{Beam: "north", Said: said, Position: closures.ShutterOpen}},
		{`{"kind":"shutter","beam":"north",` + at + `,"position":"moving"}`, "north", closures.ShutterSeen{Beam: "north", Said: said, Position: closures.ShutterMoving}},
		{`{"kind":"shutter","beam":"north",` + at + `,"position":"closed"}`, "north", closures.ShutterSeen{Beam: "north", Said: said, Position: closures.ShutterClosed}},
		{`{"kind":"laser","beam":"north",` + at + `,"emitting":true,"power_w":21.8}`, "north", closures.LaserSeen{Beam: "north", Said: said, Emitting: true, PowerW: 21.8}},
		{`{"kind":"laser","beam":"north",` + at + `,"emitting":false}`, "north", closures.LaserSeen{Beam: "north", Said: said, PowerW: nan}},
		{
			`{"kind":"watch","post":"east-lot",` + at + `,"by":["A. Quill","b"],"until":"2031-02-14T05:00:00Z"}`,
			"east-lot", closures.WatchKept{Post: "east-lot", Said: said, By: []string{"A. Quill", "b"}, Until: time.Date(2031, 2, 14, 5, 0, 0, 0, time.UTC)},
		},
		{`{"kind":"weather","source":"mast",` + at + `,"pressure_hpa":760,"temperature_c":-4}`, "mast", closures.WeatherSeen{Source: "mast", Said: said, PressureHPa: 760, Temperature: -4}},
		{`{"kind":"heard","source":"rx-1",` + at + `,"scope":"reception","messages_per_min":1200}`, "rx-1", closures.Heard{Source: "rx-1", Said: said, Scope: closures.HeardReception, MessagesPerMinute: 1200}},
		{`{"kind":"heard","source":"rx-1",` + at + `,"scope":"link"}`, "rx-1", closures.Heard{Source: "rx-1", Said: said, MessagesPerMinute: nan}},
	}
	p := NewParser(8)
	for _, c := range cases {
		for range 2 {
			name, body, err := p.Fact([]byte(c.line), received)
			if err != nil {
				t.Errorf("%s: %v", c.line, err)
				continue
			}
			if diff := cmp.Diff(c.want, body, near); diff != "" || name != c.name {
				t.Errorf("%s: from %q\n%s", c.line, name, diff)
			}
		}
		line, err := AppendFact([]byte("kept"), c.want)
		if err != nil || !strings.HasPrefix(string(line), "kept{") {
			t.Errorf("%+v: %s, %v", c.want, line, err)
			continue
		}
		if _, back, err := ParseFact(line[4:], received); err != nil || !cmp.Equal(c.want, back, near) {
			t.Errorf("%s: %v\n%s", line, err, cmp.Diff(c.want, back, near))
		}
	}
}

func TestWhiteSpaceAndEscapesChangeNothing(t *testing.T) {
	line := " \t{ \"k\\u0069nd\" : \"detec\\u0074or\" ,\r\"source\": \"a\", \"state\" : \"clear\", " + at + " } \r\n"
	name, body, err := ParseFact([]byte(line), received)
	if err != nil || name != "a" || body != (closures.DetectorSeen{Source: "a", Said: said, State: closures.DetectorClear}) {
		t.Errorf("%q, %v, %v", name, body, err)
	}
}

// TestWhatOneLineSaidStaysOutOfTheNext reads lines of every kind with one
// parser and holds each against a parser of its own.
func TestWhatOneLineSaidStaysOutOfTheNext(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := NewParser(4)
		for range rapid.IntRange(1, 20).Draw(t, "n") {
			line := rapid.SampledFrom(seeds()).Draw(t, "line")
			if rapid.Bool().Draw(t, "broken") {
				line = line[:rapid.IntRange(0, len(line)).Draw(t, "cut")]
			}
			name, body, err := p.Fact([]byte(line), received)
			wantName, want, wantErr := ParseFact([]byte(line), received)
			if name != wantName || !cmp.Equal(body, want, same) || fmt.Sprint(err) != fmt.Sprint(wantErr) {
				t.Fatalf("%s: %v, %v, want %v, %v", line, body, err, want, wantErr)
			}
		}
	})
}

func TestABodyOwnsItsMemory(t *testing.T) {
	p := NewParser(100)
	for _, line := range seeds() {
		b := []byte(line)
		_, body, err := p.Fact(b, received)
		if err != nil {
			t.Fatal(err)
		}
		for i := range b {
			b[i] = 'x'
		}
		for _, other := range seeds() {
			_, _, _ = p.Fact([]byte(other), received)
		}
		_, want, _ := ParseFact([]byte(line), received)
		if !cmp.Equal(body, want, same) {
			t.Errorf("%s: it changed later:\n%s", line, cmp.Diff(want, body, same))
		}
	}
}

func TestTheParserForgetsRatherThanGrows(t *testing.T) {
	p := NewParser(10)
	for i := range 1000 {
		line := fmt.Sprintf(`{"kind":"aircraft","source":"rx-1",%s,"aircraft":"n%d"}`, at, i)
		_, body, err := p.Fact([]byte(line), received)
		if err != nil || body.(closures.AircraftSeen).Aircraft != fmt.Sprintf("n%d", i) {
			t.Fatal(body, err)
		}
		if len(p.names) > 10 {
			t.Fatalf("%d names", len(p.names))
		}
	}
}

func TestTheClockBoundsFacts(t *testing.T) {
	line := `{"kind":"heard","source":"rx-1","scope":"link","at":%q}`
	for _, c := range []struct {
		off time.Duration
		ok  bool
	}{
		{0, true},
		{MaxAhead, true},
		{MaxAhead + 1, false},
		{time.Hour, false},
		{-MaxBehind, true},
		{-MaxBehind - 1, false},
		{-40 * 365 * 24 * time.Hour, false},
		{150 * 365 * 24 * time.Hour, false},
	} {
		_, body, err := ParseFact(fmt.Appendf(nil, line, FormatTime(received.Add(c.off))), received)
		if (err == nil) != c.ok || (body != nil) != c.ok {
			t.Errorf("%v: %v, %v", c.off, body, err)
		}
	}
}

func TestFieldNamesAndKeysAreTheSame(t *testing.T) {
	seen := map[string]bool{}
	for f := field(0); f < numFields; f++ {
		if fieldNames[f] == "" {
			t.Errorf("field %d has no name", f)
		}
		if f >= fRA && f < endNumbers {
			continue // within objects
		}
		if fieldOf([]byte(fieldNames[f])) != f || seen[fieldNames[f]] {
			t.Errorf("%s is not found by its key, or twice", fieldNames[f])
		}
		seen[fieldNames[f]] = true
		used := false
		for k := range may {
			used = used || may[k].has(f)
		}
		if !used {
			t.Errorf("%s is no field of any kind", fieldNames[f])
		}
	}
	for f := endBools; f < endNumbers; f++ {
		if l := limits[f-endBools]; !(l.low < l.high) || l.mend == "" {
			t.Errorf("%s has no range", fieldNames[f])
		}
	}
}

// TestEveryFieldIsHeldToItsKind gives each kind each field of the others.
func TestEveryFieldIsHeldToItsKind(t *testing.T) {
	for _, line := range seeds() {
		for _, other := range seeds() {
			for _, member := range topLevel(other) {
				key := member[:strings.Index(member, `":`)+2]
				if strings.Contains(line, key) {
					continue
				}
				grown := line[:len(line)-1] + "," + member + "}"
				_, body, err := ParseFact([]byte(grown), received)
				var fact *FactError
				if err == nil {
					// Only what the same kind may say too.
					k := kindOf(body)
					if f := fieldOf([]byte(strings.Trim(key, `":`))); !may[k].has(f) {
						t.Errorf("%s was taken", grown)
					}
				} else if !errors.As(err, &fact) || fact.Mend == "" {
					t.Errorf("%s: %v", grown, err)
				}
			}
		}
	}
}

func kindOf(b closures.Body) kind {
	var w writer
	return w.body(b)
}

// topLevel cuts a line into its members.
func topLevel(line string) (members []string) {
	depth, from := 0, 1
	for i, c := range line {
		switch c {
		case '{', '[':
			depth++
		case '}', ']':
			depth--
		}
		if c == ',' && depth == 1 || i == len(line)-1 {
			members = append(members, line[from:i])
			from = i + 1
		}
	}
	return members
}

// TestEachMissingFieldIsMissed drops each field of each line in turn.
func TestEachMissingFieldIsMissed(t *testing.T) {
	for _, line := range seeds() {
		_, body, err := ParseFact([]byte(line), received)
		if err != nil {
			t.Fatal(line, err)
		}
		k := kindOf(body)
		members := topLevel(line)
		for i, member := range members {
			f := fieldOf([]byte(member[1 : 1+strings.Index(member[1:], `"`)]))
			rest := "{" + strings.Join(slices.Delete(slices.Clone(members), i, i+1), ",") + "}"
			_, _, err := ParseFact([]byte(rest), received)
			if must[k].has(f) && err == nil {
				t.Errorf("%s was taken without %s", rest, member)
			}
		}
	}
}

// seeds returns one good line of each kind and variety.
func seeds() []string {
	return []string{
		`{"kind":"aim","beam":"north",` + at + `,"icrs":{"ra_deg":90,"dec_deg":-3.25},"rate_arcsec_s":{"ra":1.5,"dec":0},"error_arcsec":30,"from":"encoder","target":"f-101","motion":"tracking"}`,
		`{"kind":"aim","beam":"north",` + at + `,"icrs":{"ra_deg":359.9,"dec_deg":89.9},"pm_mas_yr":{"ra":10,"dec":-20}}`,
		`{"kind":"aim","telescope":"ridge-2",` + at + `,"horizon":{"az_deg":123.4,"el_deg":56.7},"refracted":true,"field_radius_deg":0.25,"exposing":true}`,
		`{"kind":"aim","beam":"north",` + at + `,"of_date":{"ra_deg":1,"dec_deg":2},"motion":"slewing"}`,
		`{"kind":"aim","beam":"north",` + at + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":2},{"at":"2031-02-14T04:00:00Z","ra_deg":2,"dec_deg":3}]}`,
		`{"kind":"aircraft","source":"rx-1",` + at + `,"aircraft":"a1b2c3","lat_deg":-31.51,"lon_deg":-4.01,"altitude_m":10972.8,"altitude_from":"pressure","speed_mps":231.5,"track_deg":87.25,"climb_mps":-2.5,"error_m":92.6,"vertical_error_m":45,"velocity_error_mps":10,"vertical_velocity_error_mps":3,"on_ground":false}`,
		`{"kind":"aircraft","source":"rx-1",` + at + `,"aircraft":"a1b2c3"}`,
		`{"kind":"sighting","source":"spotter-east",` + at + `,"az_deg":10,"el_deg":30,"spread_deg":10,"for_s":60}`,
		`{"kind":"sighting","source":"spotter-east",` + at + `,"clear":true}`,
		`{"kind":"detector","source":"thermal-1",` + at + `,"state":"alarm"}`,
		`{"kind":"interlock","source":"catwalk",` + at + `,"safe":true}`,
		`{"kind":"shutter","beam":"north",` + at + `,"position":"moving"}`,
		`{"kind":"laser","beam":"north",` + at + `,"emitting":true,"power_w":21.8}`,
		`{"kind":"watch","post":"east-lot",` + at + `,"by":["A. Quill","b"],"until":"2031-02-14T05:00:00Z"}`,
		`{"kind":"weather","source":"mast",` + at + `,"pressure_hpa":760,"temperature_c":4}`,
		`{"kind":"heard","source":"rx-1",` + at + `,"scope":"link","messages_per_min":1200}`,
	}
}

// FuzzParseFact checks that nothing refused leaves anything behind, that errors
// stay short and plain, and that what was taken reads back from AppendFact.
func FuzzParseFact(f *testing.F) {
	for _, line := range seeds() {
		f.Add([]byte(line))
	}
	for _, c := range malformed {
		f.Add([]byte(c.line))
	}
	f.Fuzz(func(t *testing.T, line []byte) {
		name, body, err := ParseFact(line, received)
		if err != nil {
			checkRefusal(t, string(line), name, body, err)
			return
		}
		if name == "" || !closures.ValidName(string(name)) {
			t.Fatalf("%q: from %q", line, name)
		}
		out, err := AppendFact(nil, body)
		if err != nil {
			t.Fatalf("%q: %v", line, err)
		}
		again, back, err := ParseFact(out, received)
		if err != nil || again != name || !cmp.Equal(body, back, near) {
			t.Fatalf("%q: %v\n%s", line, err, cmp.Diff(body, back, near))
		}
	})
}

func checkRefusal(t *testing.T, line string, name closures.Source, body closures.Body, err error) {
	t.Helper()
	var fact *FactError
	if !errors.As(err, &fact) || fact.Cause == "" || fact.Mend == "" {
		t.Errorf("%.200q: %v (%T)", line, err, err)
		return
	}
	if name != "" || body != nil {
		t.Errorf("%.200q: refused, and %q %v came back", line, name, body)
	}
	if len(err.Error()) > 400 {
		t.Errorf("%.200q: an error of %d bytes", line, len(err.Error()))
	}
	for _, c := range err.Error() {
		if c < ' ' || c > '~' {
			t.Errorf("%.200q: the error holds %q", line, c)
		}
	}
}
