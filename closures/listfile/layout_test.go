package listfile

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"beamward/closures"
)

const layoutsDir = "../../testdata/lists/layouts"

var invented = []string{"report", "table", "message"}

func file(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(layoutsDir, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func compiled(t testing.TB, text []byte) *Layout {
	t.Helper()
	l, err := CompileLayout(text)
	if err != nil {
		t.Fatalf("%v\n%+v", err, err)
	}
	return l
}

// goldenFile holds got against a file, which -update writes.
func goldenFile(t *testing.T, name string, got []byte) {
	t.Helper()
	if *update {
		if err := os.WriteFile(name, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), string(got)); diff != "" {
		t.Errorf("%s: %s", name, diff)
	}
}

func TestInventedLayouts(t *testing.T) {
	for _, name := range invented {
		l := compiled(t, file(t, name+".yaml"))
		text := file(t, name+".txt")
		list, report, err := l.Load(bytes.NewReader(text), Limits{})
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		want := Report{Format: Text, Layout: l.Name(), Bytes: int64(len(text)), Lines: bytes.Count(text, []byte("\n"))}
		if report != want || !list.Text().Proof.Count {
			t.Errorf("%s: report %+v, proof %+v", name, report, list.Text().Proof)
		}
		var native bytes.Buffer
		if err := WriteCSV(&native, list.Text()); err != nil {
			t.Fatal(err)
		}
		goldenFile(t, filepath.Join(layoutsDir, name+".csv"), native.Bytes())

		lines, again, _, err := l.Explain(bytes.NewReader(text), Limits{})
		if err != nil || !sameBytes(t, list.Text(), again) {
			t.Errorf("%s is explained as another list: %v", name, err)
		}
		var b bytes.Buffer
		if err := WriteExplanation(&b, lines); err != nil {
			t.Fatal(err)
		}
		goldenFile(t, filepath.Join("testdata", name+".explained.txt"), b.Bytes())
	}
}

// TestNoCutTextIsRead cuts each invented text after every byte: all of them
// end in a line that the layout needs.
func TestNoCutTextIsRead(t *testing.T) {
	for _, name := range invented {
		l := compiled(t, file(t, name+".yaml"))
		text := file(t, name+".txt")
		want, _, err := l.Read(bytes.NewReader(text), Limits{})
		if err != nil {
			t.Fatal(err)
		}
		for i := range text {
			if got, _, err := l.Read(bytes.NewReader(text[:i]), Limits{}); err == nil && !sameBytes(t, want, got) {
				t.Errorf("%s cut after %d bytes is read as another list", name, i)
			}
		}
	}
}

// TestALayoutsTextsAreRefused changes the invented texts in one place each.
func TestALayoutsTextsAreRefused(t *testing.T) {
	for _, c := range []struct{ name, layout, old, new, want string }{
		{"a line that nothing takes", "report", "=== MOVERS", "by order\n=== MOVERS", "15: no rule of the layout takes the line"},
		{"a window in capitals", "report", "   clear  06", "   CLEAR  06", "10: no rule of the layout takes the line"},
		{"more on a line than the rule takes", "message", "0245:30Z BECAUSE BALLOON", "0245:30Z OR SO BECAUSE BALLOON", "5: no rule of the layout takes the line"},
		{"the end lost", "report", "end of report 0412/31\n", "", "0: the text has no line for the layout's rule on line 66, which it needs"},
		{"two texts in one", "message", "MSG SK77", "MSG SK76 OF 13FEB31 1705Z\nMSG SK77", "3: the line stands a second time, and the layout wants it once\n3: id stands a second time, and otherwise\n3: issued stands a second time, and otherwise"},
		{"a count that is wrong", "table", "rows 5", "rows 6", "17: window_count is 6 and the list has 5 windows"},
		{"a row lost", "table", " s-01    |  10.006667 | +02.2000 |  180 | 21:10:02     |    39 | A17\n", "", "16: window_count is 5 and the list has 4 windows"},
		{"a region described otherwise", "table", "+02.2000 |  180 | 22", "+02.2001 |  180 | 22", "11: the region \"s-01\" is described otherwise than on line 10"},
		{"a track described twice", "report", "=== END", "MOVER Wren 3     7'\n=== END", "21: the region \"Wren-3\" is described otherwise than on line 16"},
		{"a window under no region", "report", "FIELD K 17       10 00 24.00   +02 12 00.0    3.0'\n", "", "8: the window stands under no region\n9: the window stands under no region"},
		{"a window under the section before", "report", "MOVER Wren 3     6'\n", "", "16: the point stands under no region\n17: the point stands under no region\n18: the point stands under no region\n19: the window stands under no region"},
		{"an hour that does not exist", "report", "06:31:10-09", "26:31:10-09", "10: from \"26:31:10\" does not fit its form"},
		{"a month that does not exist", "message", "OF 13FEB31", "OF 13FEV31", "2: issued \"13FEV31 1805Z\" does not fit its form"},
		{"a day that does not exist", "message", "14FEB31 0210Z", "30FEB31 0210Z", "4: from \"30FEB31 0210Z\" is on a day that does not exist"},
		{"a day of the year that does not exist", "report", "at 044/20", "at 366/20", "17: at \"366/20:00:00\" is on a day that does not exist"},
		{"a leap second that is none", "message", "0245:30Z", "0245:60Z", "5: until \"14FEB31 0245:60Z\" is no leap second"},
		{"a declination out of range", "table", "-89.9000", "-91.9000", "15: dec_deg \"-91.9\" is out of range"},
		{"an angle that is none", "table", "|   90 | 07", "|  9 0 | 07", "15: radius \"9 0\" is not an angle in arcsec"},
		{"seconds of arc over 59", "report", "-00 30 07", "-00 30 67", "11: dec \"-00 30 67\" is not an angle in dms"},
		{"a duration that is none", "table", "|  60.5 | C3", "|   0.0 | C3", "15: for \"0.0\" is not a duration in s"},
		{"windows with something between", "report", "03:10:02  03:10:41", "03:10:02, 03:10:41", "9: until \"03:10:02,\" does not fit its form"},
		{"an end before its start", "message", "0605+0100", "0505+0100", "6: the window is empty: from is not before until"},
		{"a window outside the coverage", "message", "14FEB31 0210Z UNTIL 14FEB31 0230Z", "15FEB31 0210Z UNTIL 15FEB31 0230Z", "4: the window lies outside covers"},
		{"points out of order", "report", "at 044/21", "at 044/19", "18: the track's points are not in order of time"},
		{"a control character", "message", "BALLOON", "BALLOON\x07", "4: the line holds the control character U+0007"},
		{"bytes that are not UTF-8", "message", "BALLOON", "BALL\xd6N", "4: the line holds bytes that are not UTF-8"},
		{"a line too long", "message", "BALLOON", strings.Repeat("B", layoutLine), "4: the line is too long; nothing after it was read"},
		{"a window stated twice", "message", "DARKEN EVERYWHERE", "DARKEN AZ 060 TO 120 EL 30 TO 45 14FEB31 0210Z UNTIL 14FEB31 0230Z BECAUSE BALLOON\nDARKEN EVERYWHERE", "6: the window stands on line 4 already\n9: window_count is 3 and the list has 4 windows"},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := string(file(t, c.layout+".txt"))
			if !strings.Contains(text, c.old) {
				t.Fatalf("the text has no %q", c.old)
			}
			l := compiled(t, file(t, c.layout+".yaml"))
			list, _, err := l.Read(strings.NewReader(strings.Replace(text, c.old, c.new, 1)), Limits{})
			var r *Refusal
			if !errors.As(err, &r) || list != nil {
				t.Fatalf("accepted, or another error: %v", err)
			}
			var got []string
			for _, e := range r.Lines {
				got = append(got, fmt.Sprintf("%d: %s", e.Line, e.Cause))
				if e.Mend == "" || len(e.Text) > 80 {
					t.Errorf("%+v", e)
				}
			}
			if s := strings.Join(got, "\n"); s != c.want {
				t.Errorf("got:\n%s\nwant:\n%s", s, c.want)
			}
		})
	}
}

func TestALayoutForgivesPrinters(t *testing.T) {
	l := compiled(t, file(t, "report.yaml"))
	text := string(file(t, "report.txt"))
	want, _, err := l.Read(strings.NewReader(text), Limits{})
	if err != nil {
		t.Fatal(err)
	}
	for _, same := range []string{
		strings.ReplaceAll(text, "\n", "\r\n"), strings.ReplaceAll(text, "\n", "  \t\n"), strings.ReplaceAll(text, "LIGHT", "\fLIGHT"),
		"\uFEFF" + text, strings.TrimSuffix(text, "\n"), text + "\n\n",
	} {
		got, _, err := l.Read(strings.NewReader(same), Limits{})
		if err != nil || !sameBytes(t, want, got) {
			t.Errorf("%.40q: %v", same, err)
		}
	}
}

func TestLatinTexts(t *testing.T) {
	yaml := strings.Replace(string(file(t, "message.yaml")), "name: tower-message", "name: tower-message\nencoding: latin-1", 1)
	text := strings.ReplaceAll(string(file(t, "message.txt")), "BALLOON", "BALL\xd6N")
	list, _, err := compiled(t, []byte(yaml)).Read(strings.NewReader(text), Limits{})
	if err != nil || list.Windows[0].Ref != "BALLÖN" {
		t.Errorf("%v, %+v", err, list)
	}
}

// TestRepeatedWindowsCanBeDropped reads a text whose authority states windows
// twice, which the layout says.
func TestRepeatedWindowsCanBeDropped(t *testing.T) {
	yaml := strings.Replace(string(file(t, "message.yaml")), "name: tower-message", "name: tower-message\nrepeated_windows: drop", 1)
	text := string(file(t, "message.txt"))
	line := strings.SplitAfter(text, "\n")[3]
	double := strings.Replace(strings.Replace(text, "THAT IS", line+line+"THAT IS", 1), "3 LINES", "5 LINES", 1)
	list, _, err := compiled(t, []byte(yaml)).Read(strings.NewReader(double), Limits{})
	if err != nil || len(list.Windows) != 3 || len(list.Lines) != 3 {
		t.Fatalf("%v, %+v", err, list)
	}
	plain, _, err := compiled(t, []byte(yaml)).Read(strings.NewReader(text), Limits{})
	if err != nil || !sameBytes(t, plain, list) {
		t.Errorf("dropping repeats changes the list: %v", err)
	}
}

// rowLayout reads one window a row, with every value written out.
const rowLayout = `
layout: 1
name: rows
zone: "+00:00"
head: {id: rows, authority: orbital-desk, unlisted_sky: closed}
times: {stamp: ["YYYY-MM-DD hh:mm:ss", "YYYY-MM-DD hh:mm:ss.f"]}
as: {issued: stamp, covers_from: stamp, covers_until: stamp, from: stamp, until: stamp, ra: deg, dec: deg, radius: deg}
lines:
  - {is: head, match: 'H (?P<issued>.{19,23})\|(?P<covers_from>.+)\|(?P<covers_until>.+)', example: "H 2031-02-13 18:00:00|2031-02-14 00:00:00|2031-02-14 12:00:00.5"}
  - {is: region, shape: icrs, match: 'R (?P<region>\S+) (?P<ra>\S+) (?P<dec>\S+) (?P<radius>\S+) ?(?P<throughout>\w*)', example: R f-101 150.1 2.2 0.05 open}
  - {is: window, match: 'W (?P<region>\S+) (?P<state>SHUT|FREE) (?P<from>[^|]+)\|(?P<until>[^|]+)\|(?P<ref>.*)', example: "W f-101 SHUT 2031-02-14 03:10:02|2031-02-14 03:10:41.25|A-17",
     words: {SHUT: closed, FREE: open}}
`

// TestALayoutReadsWhatIsWritten writes lists as rows and reads them back.
func TestALayoutReadsWhatIsWritten(t *testing.T) {
	l := compiled(t, []byte(rowLayout))
	stamp := func(at time.Time) string { return at.UTC().Format("2006-01-02 15:04:05.999") }
	rapid.Check(t, func(t *rapid.T) {
		list := lists.Draw(t, "list")
		list.ID, list.Authority, list.Replaces, list.Beams, list.UnlistedOpen = "rows", "orbital-desk", nil, nil, false
		var b strings.Builder
		fmt.Fprintf(&b, "H %s|%s|%s\n", stamp(list.Issued), stamp(list.Covers.From), stamp(list.Covers.Until))
		for i := range list.Regions {
			r := &list.Regions[i]
			if r.Shape != closures.ICRSCone {
				*r = closures.Region{ID: r.ID, Shape: closures.ICRSCone, Throughout: r.Throughout,
					Direction: equator(rightAscensions.Draw(t, "ra"), declinations.Draw(t, "dec")), Radius: radii.Draw(t, "radius").angle()}
			}
			ra, dec := unitsOfEquator(r.Direction)
			fmt.Fprintf(&b, "R %s %s %s %s ", r.ID, appendDegrees(nil, ra), appendDegrees(nil, dec), appendDegrees(nil, unitsOf(r.Radius)))
			if r.Throughout != closures.NotThroughout {
				b.WriteString(stateWord(r.Throughout == closures.ThroughoutOpen))
			}
			b.WriteByte('\n')
		}
		for i := range list.Windows {
			w := &list.Windows[i]
			w.Ref = strings.Trim(w.Ref, " \t")
			s := w.Span()
			fmt.Fprintf(&b, "W %s %s %s|%s|%s\n", list.Regions[w.Region].ID, map[bool]string{true: "FREE", false: "SHUT"}[w.Open], stamp(s.From), stamp(s.Until), w.Ref)
		}
		list.Digest = Digest(list)
		got, _, err := l.Read(strings.NewReader(b.String()), Limits{})
		if err != nil {
			t.Fatalf("%v\n%s", err, b.String())
		}
		if diff := cmp.Diff(list, got, meaning); diff != "" {
			t.Fatal(diff)
		}
	})
}

// TestWorkIsBounded reads with a small allowance, by a rule and by each.
func TestWorkIsBounded(t *testing.T) {
	heavy := strings.Replace(rowLayout, "lines:", "lines:\n  - {is: ignore, match: '(?:.{0,200}x){4}y', example: xxxxy}", 1)
	for _, c := range []struct{ layout, line string }{
		{heavy, strings.Repeat("x", 4000)},
		{string(file(t, "report.yaml")), "   clear  " + strings.Repeat("18:00:00-03:10:02 ", 400) + "1"},
	} {
		d := newDraft(Limits{}.filled())
		g := newReading(compiled(t, []byte(c.layout)), d, [][]byte{[]byte(c.line)})
		g.section, g.region, g.work = "fields", "K-17", 300_000
		g.date = written{has: hasYear | hasDay, year: 2031, month: 2, day: 14}
		g.all()
		if r := d.refusal(); !slices.ContainsFunc(r.Lines, func(e LineError) bool { return strings.Contains(e.Cause, "too long for the layout") }) {
			t.Errorf("%+v", r)
		}
	}
}
