package listfile

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"testing"
	"time"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/span"
)

// anglesFrom draws angles over the whole range and crowds its ends, where the
// way through a unit vector is hardest.
func anglesFrom(lo, hi picodegrees) *rapid.Generator[picodegrees] {
	return rapid.Custom(func(t *rapid.T) picodegrees {
		switch rapid.IntRange(0, 4).Draw(t, "kind") {
		case 0:
			return min(hi, lo+picodegrees(rapid.Int64Range(0, 1000).Draw(t, "above")))
		case 1:
			return max(lo, hi-picodegrees(rapid.Int64Range(0, 1000).Draw(t, "below")))
		case 2: // few digits, as people write them
			return min(hi, max(lo, picodegrees(rapid.Int64Range(int64(lo/1e10), int64(hi/1e10)).Draw(t, "hundredths"))*1e10))
		}
		return picodegrees(rapid.Int64Range(int64(lo), int64(hi)).Draw(t, "angle"))
	})
}

var (
	rightAscensions = anglesFrom(0, fullTurn-1)
	declinations    = anglesFrom(-90*perDegree, 90*perDegree)
	radii           = anglesFrom(1, 90*perDegree)
)

func TestAnglesComeBackToTheDigit(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		ra, dec, r := rightAscensions.Draw(t, "ra"), declinations.Draw(t, "dec"), radii.Draw(t, "radius")
		if a, d := unitsOfEquator(equator(ra, dec)); a != ra || d != dec {
			t.Fatalf("%d, %d through a unit vector is %d, %d", ra, dec, a, d)
		}
		if got := unitsOf(r.angle()); got != r {
			t.Fatalf("%d through radians is %d", r, got)
		}
		text := appendDegrees(nil, dec)
		v, err := wire.ParseNumber(string(text))
		if err != nil || v != dec.degrees() || roundDegrees(v) != dec {
			t.Fatalf("%s: %v, %v, want %v", text, v, err, dec.degrees())
		}
		if again := appendDegrees(nil, roundDegrees(v)); !bytes.Equal(again, text) {
			t.Fatalf("%s is written again as %s", text, again)
		}
	})
}

func TestTimesComeBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		ms := rapid.Int64Range(firstInstant/1e6, lastInstant/1e6-1).Draw(t, "ms")
		if rapid.Bool().Draw(t, "whole") {
			ms -= ms % 1000
		}
		text := appendTime(nil, ms*1e6)
		want := time.UnixMilli(ms).UTC()
		form := "2006-01-02T15:04:05Z"
		if ms%1000 != 0 {
			form = "2006-01-02T15:04:05.000Z"
		}
		if string(text) != want.Format(form) {
			t.Fatalf("%s, want %s", text, want.Format(form))
		}
		at, cause, _ := parseInstant(text)
		if cause != "" || at.early != ms*1e6 || !at.exact() {
			t.Fatalf("%s is read as %+v, %s", text, at, cause)
		}
	})
}

var (
	names      = rapid.StringMatching(`[A-Za-z0-9._-]{1,64}`).Filter(closures.ValidName)
	references = rapid.Custom(func(t *rapid.T) string {
		s := rapid.OneOf(rapid.Just(""), rapid.StringMatching(`[ -~]{1,20}`), rapid.StringN(1, 20, 80)).Draw(t, "ref")
		if s == "" || s[0] == ' ' || s[len(s)-1] == ' ' || len(s) > maxRef || !utf8.ValidString(s) || !printable([]byte(s)) {
			return ""
		}
		return s
	})
)

// lists draws lists that can be accepted.
var lists = rapid.Custom(func(t *rapid.T) *closures.ListText {
	ms := func(from, until time.Time, label string) time.Time {
		return time.UnixMilli(rapid.Int64Range(from.UnixMilli(), until.UnixMilli()).Draw(t, label)).UTC()
	}
	early := time.Unix(0, firstInstant).UTC()
	late := time.Unix(0, lastInstant).UTC().Add(-5 * maxCovers)
	l := &closures.ListText{ID: closures.ListID(names.Draw(t, "id")), Authority: closures.AuthorityID(names.Draw(t, "authority")),
		Issued: ms(early, late, "issued"), UnlistedOpen: rapid.Bool().Draw(t, "unlisted")}
	l.Covers.From = ms(early, late, "covers")
	l.Covers.Until = ms(l.Covers.From.Add(time.Millisecond), l.Covers.From.Add(maxCovers), "until")
	unique := map[string]bool{string(l.ID): true}
	for range rapid.IntRange(0, 2).Draw(t, "replaces") {
		if id := names.Draw(t, "replaced"); !unique[id] {
			unique[id] = true
			l.Replaces = append(l.Replaces, closures.ListID(id))
		}
	}
	unique = map[string]bool{}
	for range rapid.IntRange(0, 2).Draw(t, "beams") {
		if id := names.Draw(t, "beam"); !unique[id] {
			unique[id] = true
			l.Beams = append(l.Beams, closures.BeamID(id))
		}
	}
	l.Windows = []closures.Window{}
	seen := map[string]bool{}
	for i := range rapid.IntRange(0, 5).Draw(t, "regions") {
		r := region(t, l.Covers, fmt.Sprintf("%s.%d", names.Filter(func(s string) bool { return len(s) < 60 }).Draw(t, "region"), i))
		for range rapid.IntRange(0, 4).Draw(t, "windows") {
			over := l.Covers
			if r.Shape == closures.TrackCone {
				over = span.Span{From: r.Points[0].At, Until: r.Points[len(r.Points)-1].At}.Intersect(over)
			}
			if over.Length() < 2*time.Millisecond {
				break
			}
			w := closures.Window{Region: int32(i), Open: rapid.Bool().Draw(t, "open"), Ref: references.Draw(t, "ref")}
			from := ms(over.From, over.Until.Add(-time.Millisecond), "from")
			w.From, w.Until = from.UnixNano(), ms(from.Add(time.Millisecond), over.Until, "until").UnixNano()
			if key := fmt.Sprint(w); !seen[key] {
				seen[key] = true
				l.Windows = append(l.Windows, w)
				r.Throughout = closures.NotThroughout
			}
		}
		l.Regions = append(l.Regions, r)
	}
	// Windows in any order, as long as each format keeps it.
	l.Windows = rapid.Permutation(l.Windows).Draw(t, "order")
	if len(l.Windows) == 0 {
		l.Windows = nil
	}
	l.Digest = Digest(l)
	return l
})

func region(t *rapid.T, covers span.Span, id string) closures.Region {
	r := closures.Region{ID: id, Throughout: closures.Throughout(rapid.IntRange(1, 2).Draw(t, "throughout"))}
	r.Shape = closures.Shape(rapid.IntRange(1, 4).Draw(t, "shape"))
	switch r.Shape {
	case closures.ICRSCone:
		r.Direction, r.Radius = equator(rightAscensions.Draw(t, "ra"), declinations.Draw(t, "dec")), radii.Draw(t, "radius").angle()
	case closures.HorizonBox:
		az := anglesFrom(0, fullTurn)
		from := az.Draw(t, "az_from")
		to := az.Filter(func(p picodegrees) bool { return p%fullTurn != from%fullTurn || p-from == fullTurn }).Draw(t, "az_to")
		low := anglesFrom(-90*perDegree, 90*perDegree-1).Draw(t, "el_from")
		high := anglesFrom(low+1, 90*perDegree).Draw(t, "el_to")
		r.Box = geometry.Box{AzFrom: from.angle(), AzTo: to.angle(), ElFrom: low.angle(), ElTo: high.angle()}
		r.Observed = rapid.Bool().Draw(t, "observed")
	case closures.TrackCone:
		r.Radius = radii.Draw(t, "radius").angle()
		ra, dec := rightAscensions.Draw(t, "ra"), anglesFrom(-80*perDegree, 80*perDegree).Draw(t, "dec")
		for i := range rapid.IntRange(2, 4).Draw(t, "points") {
			step := anglesFrom(0, perDegree).Draw(t, "step")
			ra, dec = (ra+step)%fullTurn, dec+step
			at := covers.From.Add(time.Duration(i) * covers.Length()).Truncate(time.Millisecond)
			r.Points = append(r.Points, closures.AimPoint{At: at, Direction: equator(ra, dec)})
		}
	}
	return r
}

// TestRoundTrips writes any list in each format and as canonical bytes, and
// reads it back to the same bits and the same digest.
func TestRoundTrips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := lists.Draw(t, "list")
		var first bytes.Buffer
		if err := Canonical(&first, l); err != nil {
			t.Fatal(err)
		}
		back, _, err := Load(bytes.NewReader(first.Bytes()), JSON, Recorded())
		if err != nil {
			t.Fatalf("%v\n%s", err, first.Bytes())
		}
		if diff := cmp.Diff(l, back.Text(), meaning); diff != "" {
			t.Fatal(diff)
		}
		var second bytes.Buffer
		if err := Canonical(&second, back.Text()); err != nil || !bytes.Equal(first.Bytes(), second.Bytes()) {
			t.Fatalf("canonical of canonical differs: %v\n%s\n%s", err, first.Bytes(), second.Bytes())
		}
		l.Proof = closures.Proof{Digest: true, Count: true}
		for _, n := range native {
			var b bytes.Buffer
			if err := n.write(&b, l); err != nil {
				t.Fatal(err)
			}
			back, _, err := Load(bytes.NewReader(b.Bytes()), Auto, Limits{})
			if err != nil {
				t.Fatalf("%v\n%s", err, b.Bytes())
			}
			if diff := cmp.Diff(l, back.Text(), meaning); diff != "" {
				t.Fatalf("%v: %s\n%s", n.format, diff, b.Bytes())
			}
		}
		var proven bytes.Buffer
		if err := Canonical(&proven, l); err != nil {
			t.Fatal(err)
		}
		again, _, err := Read(&proven, JSON, Limits{})
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(l, again, meaning); diff != "" {
			t.Fatalf("the proof is lost: %s", diff)
		}
	})
}

// TestWhatNoTextCanHoldIsNotWritten damages a list in its own fields.
func TestWhatNoTextCanHoldIsNotWritten(t *testing.T) {
	for name, damage := range map[string]func(*closures.ListText){
		"an id with a line end":         func(l *closures.ListText) { l.ID = "a\nb" },
		"no authority":                  func(l *closures.ListText) { l.Authority = "" },
		"a replaced list unnamed":       func(l *closures.ListText) { l.Replaces = []closures.ListID{""} },
		"a beam with a comma":           func(l *closures.ListText) { l.Beams = []closures.BeamID{"a, b"} },
		"issued between milliseconds":   func(l *closures.ListText) { l.Issued = l.Issued.Add(1) },
		"coverage from year 1":          func(l *closures.ListText) { l.Covers.From = time.Time{} },
		"a region without shape":        func(l *closures.ListText) { l.Regions[0].Shape = closures.NoShape },
		"a region of no direction":      func(l *closures.ListText) { l.Regions[0].Direction.X = math.NaN() },
		"a region without radius":       func(l *closures.ListText) { l.Regions[0].Radius = 0 },
		"a box upside down":             func(l *closures.ListText) { l.Regions[2].Box.ElFrom = l.Regions[2].Box.ElTo },
		"a point of no direction":       func(l *closures.ListText) { l.Regions[4].Points[0].Direction.Z = 2 },
		"a window of no region":         func(l *closures.ListText) { l.Windows[0].Region = 6 },
		"a window between milliseconds": func(l *closures.ListText) { l.Windows[0].Until-- },
		"a ref with a line end":         func(l *closures.ListText) { l.Windows[0].Ref = "a\nb" },
		"a ref that is not UTF-8":       func(l *closures.ListText) { l.Windows[0].Ref = "\xff" },
	} {
		l := mustRead(t, golden(t, YAML), YAML)
		damage(l)
		for _, write := range []func(io.Writer, *closures.ListText) error{Canonical, WriteJSON, WriteCSV, WriteYAML} {
			var b bytes.Buffer
			if err := write(&b, l); err == nil || b.Len() > 0 {
				t.Errorf("%s is written: %v", name, err)
			}
		}
	}
}
