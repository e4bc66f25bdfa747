package render

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry/earth"
	"beamward/geometry/span"
)

// chartOf is a night of rows, each with every reason that can be foreseen.
func chartOf(names ...string) *Chart {
	dusk := time.Date(2031, 2, 13, 19, 0, 0, 0, time.UTC)
	part := func(from, until float64) span.Span {
		return span.Span{From: dusk.Add(time.Duration(from * float64(time.Hour))), Until: dusk.Add(time.Duration(until * float64(time.Hour)))}
	}
	c := &Chart{
		Title: "beam north", Over: part(0, 12), Zone: time.FixedZone("here", -3600), Notes: []string{"a note"},
		Sun: []Band{{part(0, 1), "day", 0}, {part(1, 1.4), "civil", 1}, {part(1.4, 2), "nautical", 2}, {part(2, 2.5), "astronomical", 3}, {part(2.5, 12), "night", 4}},
	}
	for _, n := range names {
		c.Rows = append(c.Rows, ChartRow{
			Name: n, Allowed: span.Set{part(3, 5), part(6, 7)}, Placed: []Place{{part(3, 3.5), "1"}},
			Blocked: []closures.Finding{
				{Code: closures.CodeDaylight, Over: part(-1, 2)}, {Code: closures.CodeElevationLimit, Over: part(0, 3)}, {Code: closures.CodeListedClosure, Over: part(5, 5.01)},
				{Code: closures.CodeFieldCrossing, Over: part(5, 6)}, {Code: closures.CodeHold, Over: part(7, 8)}, {Code: closures.CodeNotCovered, Over: part(8, 13)},
			},
		})
	}
	return c
}

func drawn(t *testing.T, c *Chart) string {
	t.Helper()
	var out bytes.Buffer
	if err := c.SVG(&out); err != nil {
		t.Fatal(err)
	}
	return out.String()
}

// What is drawn is whole XML, whatever the names are, needs nothing from
// elsewhere, and no number in it is none.
func TestChartsAreWhole(t *testing.T) {
	names := []string{"f-101", `<script>alert("x")</script>`, "a&b ]]> --", "line\nbreak\x00\x1b[31m", "\xff\xfe", strings.Repeat("wide ", 40), "", "日本語の名前です"}
	svg := drawn(t, chartOf(names...))
	d := xml.NewDecoder(strings.NewReader(svg))
	text := map[string]bool{}
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		switch o := token.(type) {
		case xml.StartElement:
			if n := o.Name.Local; n == "script" || n == "image" || n == "a" || n == "foreignObject" {
				t.Errorf("an element %s", n)
			}
			seen := map[string]bool{}
			for _, a := range o.Attr {
				if seen[a.Name.Local] {
					t.Errorf("attribute %s twice", a.Name.Local)
				}
				seen[a.Name.Local] = true
				if strings.Contains(a.Value, "NaN") || strings.Contains(a.Value, "Inf") || strings.HasPrefix(a.Name.Local, "on") && a.Name.Local != "onload" {
					t.Errorf("%s=%q", a.Name.Local, a.Value)
				}
			}
		case xml.CharData:
			text[string(o)] = true
		}
	}
	for _, want := range []string{names[0], names[1], names[2], "daylight", "elevation-limit", "not-covered", "hold", "listed-closure", "field-crossing", "allowed", "Sun: astronomical", "here", "2 h 00"} {
		if !text[want] {
			t.Errorf("%q is not written", want)
		}
	}
	if strings.Contains(svg, "http") && strings.Count(svg, "http") != strings.Count(svg, "http://www.w3.org/2000/svg") {
		t.Error("something from elsewhere")
	}
	if svg != drawn(t, chartOf(names...)) {
		t.Error("two drawings differ")
	}
}

// Empty and odd charts are drawn or refused.
func TestOddCharts(t *testing.T) {
	if err := (&Chart{}).SVG(io.Discard); err == nil {
		t.Error("an empty span")
	}
	c := chartOf()
	drawn(t, c)
	c.Sun, c.Zone, c.Notes = nil, nil, nil
	drawn(t, c)
	many := make([]string, MaxChartRows+7)
	for i := range many {
		many[i] = fmt.Sprint("t", i)
	}
	if svg := drawn(t, chartOf(many...)); !strings.Contains(svg, "and 7 more targets") || strings.Contains(svg, fmt.Sprint(">t", MaxChartRows, "<")) {
		t.Error("the rest is not said")
	}
	for _, length := range []time.Duration{time.Second, time.Minute, time.Hour, 14 * 24 * time.Hour} {
		c := chartOf("a")
		c.Over.Until = c.Over.From.Add(length)
		drawn(t, c)
	}
	odd := chartOf("a")
	odd.Rows[0].Blocked = append(odd.Rows[0].Blocked, closures.Finding{Code: 99, Over: odd.Over}, closures.Finding{Code: closures.CodeFault, Over: odd.Over}, closures.Finding{Code: closures.CodeHold})
	drawn(t, odd)
}

// Every foreseeable reason has a pattern and a mark of its own, so that colour
// never stands alone.
func TestReasonsAreToldApartWithoutColour(t *testing.T) {
	lines := regexp.MustCompile(`class="l-[a-z]+" d="([^"]*)"`)
	marks := regexp.MustCompile(`class="mark [^"]*" d="([^"]*)"[^/]*/>`)
	colour := regexp.MustCompile(`#[0-9a-f]{6}`)
	seenLines, seenMarks := map[string]string{}, map[string]string{}
	n := 0
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		if !closures.ForeseeableCodes().Has(c) {
			continue
		}
		n++
		d := &drawing{}
		d.pattern(c, 12, 24, 60, 16)
		d.shape(c, 0, 0)
		out := d.out.String()
		line := lines.FindStringSubmatch(out)[1]
		mark := colour.ReplaceAllString(marks.FindString(out), "")
		mark = regexp.MustCompile(`class="[^"]*"`).ReplaceAllString(mark, "")
		if was := seenLines[line]; was != "" || line == "" {
			t.Errorf("%v has the pattern of %q", c, was)
		}
		if was := seenMarks[mark]; was != "" || mark == "" {
			t.Errorf("%v has the mark of %q", c, was)
		}
		seenLines[line], seenMarks[mark] = c.String(), c.String()
	}
	if n != 6 {
		t.Errorf("%d reasons", n)
	}
}

// No line of a pattern leaves its rectangle.
func TestPatternsStayInside(t *testing.T) {
	numbers := regexp.MustCompile(`([ML])(-?[0-9.]+) (-?[0-9.]+)`)
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		for _, r := range [][4]float64{{10, 20, 50, 16}, {10.3, 20.7, 3.1, 5.33}, {700, 33, 900, 8}, {0, 0, 3, 1}} {
			d := &drawing{}
			d.pattern(c, r[0], r[1], r[2], r[3])
			for _, m := range numbers.FindAllStringSubmatch(d.out.String(), -1) {
				x, _ := strconv.ParseFloat(m[2], 64)
				y, _ := strconv.ParseFloat(m[3], 64)
				if x < r[0]-0.01 || x > r[0]+r[2]+0.01 || y < r[1]-0.01 || y > r[1]+r[3]+0.01 {
					t.Fatalf("%v: %v %v outside %v", c, x, y, r)
				}
			}
		}
	}
}

// Text is readable in both looks: a contrast of 4.5 to 1 at least (WCAG 2.2,
// 1.4.3), and 3 to 1 for shapes (1.4.11).
func TestContrast(t *testing.T) {
	fill := regexp.MustCompile(`fill="(#[0-9a-f]{6})"`)
	light := func(class string) string {
		return fill.FindStringSubmatch(attributes(class))[1]
	}
	dark := map[string]string{}
	for _, rule := range regexp.MustCompile(`([.a-z0-9,-]+)\{([^}]*)\}`).FindAllStringSubmatch(chartStyle, -1) {
		if m := regexp.MustCompile(`fill:(#[0-9a-f]{6})`).FindStringSubmatch(rule[2]); m != nil {
			for _, class := range strings.Split(rule[1], ",") {
				dark[strings.TrimPrefix(class, ".")] = m[1]
			}
		}
	}
	for _, o := range []struct {
		on, of string
		least  float64
	}{
		{"title", "page", 4.5}, {"name", "page", 4.5}, {"small", "page", 4.5}, {"tiny", "page", 4.5}, {"tiny", "plate", 4.5}, {"tiny", "placed", 4.5},
		{"tiny", "sun0", 4.5}, {"tiny", "sun1", 4.5}, {"tiny", "sun2", 4.5}, {"tiny", "sun3", 4.5}, {"tiny", "sun4", 4.5}, {"onallowed", "allowed", 4.5},
		{"allowed", "page", 3}, {"allowed", "sun4", 3}, {"allowed", "b-elevation", 3}, {"allowed", "b-listed", 3},
		{"mark-listed", "sun4", 3}, {"mark-hold", "sun4", 3}, {"mark-elevation", "sun4", 3}, {"mark-listed", "sun0", 3}, {"mark-hold", "sun0", 3}, {"mark-daylight", "sun0", 3},
	} {
		if r := contrast(light(o.on), light(o.of)); !(r >= o.least) {
			t.Errorf("light: %s on %s: %.1f", o.on, o.of, r)
		}
		if r := contrast(dark[o.on], dark[o.of]); !(r >= o.least) {
			t.Errorf("dark: %s %q on %s %q: %.1f", o.on, dark[o.on], o.of, dark[o.of], r)
		}
	}
}

// contrast is the ratio of WCAG 2.2 of two colours.
func contrast(a, b string) float64 {
	luminance := func(s string) float64 {
		v, err := strconv.ParseUint(strings.TrimPrefix(s, "#"), 16, 32)
		if err != nil {
			return math.NaN()
		}
		part := func(shift int) float64 {
			c := float64(v>>shift&0xff) / 255
			if c <= 0.04045 {
				return c / 12.92
			}
			return math.Pow((c+0.055)/1.055, 2.4)
		}
		return 0.2126*part(16) + 0.7152*part(8) + 0.0722*part(0)
	}
	x, y := luminance(a), luminance(b)
	return (max(x, y) + 0.05) / (min(x, y) + 0.05)
}

// A pixel in which an allowed span and a closure meet is blocked.
func TestBlockedIsDrawnOverAllowed(t *testing.T) {
	svg := drawn(t, chartOf("a"))
	allowed, blocked := strings.Index(svg, `class="allowed"`), strings.Index(svg, `class="b-hold"`)
	if allowed < 0 || blocked < allowed {
		t.Errorf("allowed at %d, blocked at %d", allowed, blocked)
	}
}

// The bands of the sky follow one another and leave nothing out.
func TestTwilight(t *testing.T) {
	r := &closures.Rules{Site: closures.SiteRules{Position: earth.Position{Lat: -31.5 * s1.Degree, Lon: -4 * s1.Degree, Height: 2450}}}
	noon := time.Date(2031, 2, 13, 12, 0, 0, 0, time.UTC)
	over := span.Span{From: noon, Until: noon.Add(24 * time.Hour)}
	nights, err := plan.Nights(r, over)
	if err != nil {
		t.Fatal(err)
	}
	var words []string
	at := noon
	for _, b := range Twilight(nights, over) {
		words = append(words, b.Word)
		if b.Over.From.Sub(at).Abs() > 2*time.Second {
			t.Errorf("a gap at %v", at)
		}
		at = b.Over.Until
	}
	if got := strings.Join(words, " "); got != "day civil nautical astronomical night astronomical nautical civil day" || !at.Equal(over.Until) {
		t.Errorf("%s until %v", got, at)
	}
}
