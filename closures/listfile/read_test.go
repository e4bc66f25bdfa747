package listfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"
	"testing/iotest"
	"time"

	"beamward/closures"
)

func TestFormatsAreTold(t *testing.T) {
	for name, want := range map[string]Format{"a.yaml": YAML, "b.YML": YAML, "c.json": JSON, "x/d.CSV": CSV, "e.txt": Auto, "csv": Auto} {
		if got := FormatOf(name); got != want {
			t.Errorf("%s is taken for %v, want %v", name, got, want)
		}
	}
	for text, want := range map[string]Format{" \n{": JSON, "# closure_list: 1\n": CSV, csvHeader: CSV, "# of tonight\nclosure_list: 1": YAML, "": YAML} {
		if got := sniff([]byte(text)); got != want {
			t.Errorf("%q is taken for %v, want %v", text, got, want)
		}
	}
	for f := Auto; f <= CSV; f++ {
		if got, ok := ParseFormat(f.String()); !ok || got != f {
			t.Errorf("%v is read as %v", f, got)
		}
	}
}

// BW-013
func TestEveryBadLineIsReported(t *testing.T) {
	for _, n := range native {
		text := undigested(t, n.format)
		text = strings.Replace(text, "orbital-desk", "orbital desk", 1)
		text = strings.Replace(text, "150.1", "1x50.1", 1)
		text = strings.Replace(text, "359.9", "459.9", 1)
		text = strings.ReplaceAll(text, "2031-02-14T03:10:02Z", "2031-02-14T03:10:62Z")
		text = strings.Replace(text, "2031-02-13T23:00:00Z", "2031-02-14T00:45:00Z", 1)
		if n.format == JSON { // a number that is none would end the reading
			text = strings.Replace(text, "1x50.1", "1050.1", 1)
		}
		r, got := refused(t, text, n.format, Limits{})
		if r.Total != 6 || len(r.Lines) != 6 {
			t.Errorf("%v: %d bad lines reported, want 6:\n%s", n.format, r.Total, got)
		}
	}
}

func TestOnlyTheFirstThousandInDetail(t *testing.T) {
	list := generated(5000)
	for _, n := range native {
		var b bytes.Buffer
		if err := n.write(&b, list); err != nil {
			t.Fatal(err)
		}
		head, windows, _ := strings.Cut(b.String(), "A-0000000")
		r, _ := refused(t, head+"A-0000000"+strings.ReplaceAll(windows, "2031-02-14T", "2031-02-30T"), n.format, Limits{})
		if r.Total != 2*4999 || len(r.Lines) != KeptLines { // from and until of all but the first
			t.Errorf("%v: %d bad lines, %d in detail", n.format, r.Total, len(r.Lines))
		}
	}
}

func TestLimits(t *testing.T) {
	for _, n := range native {
		text := string(golden(t, n.format))
		for _, c := range []struct {
			limits Limits
			want   string
		}{
			{Limits{Windows: 6}, "the list has too many windows"},
			{Limits{Regions: 5}, "the list has too many regions"},
			{Limits{Points: 2}, "the list's tracks have too many points"},
			{Limits{Bytes: int64(len(text)) - 1}, "large"},
		} {
			_, got := refused(t, text, n.format, c.limits)
			if c.limits.Bytes > 0 && n.format == YAML {
				c.want = "a YAML list is at most 16 MiB"
			}
			if !strings.Contains(got, c.want) || strings.Count(got, "\n") > 0 {
				t.Errorf("%v, %+v: %s", n.format, c.limits, got)
			}
		}
		if _, _, err := Read(strings.NewReader(text), n.format, Limits{Windows: 7, Regions: 6, Points: 3, Bytes: int64(len(text))}); err != nil {
			t.Errorf("%v at its limits: %v", n.format, err)
		}
	}
}

func TestYAMLOfTooManyWindowsSaysWhatToUse(t *testing.T) {
	var b bytes.Buffer
	if err := WriteYAML(&b, generated(yamlWindows+1)); err != nil {
		t.Fatal(err)
	}
	r, _ := refused(t, b.String(), YAML, Limits{})
	if r.Total != 1 || !strings.Contains(r.Lines[0].Mend, "CSV") {
		t.Errorf("%+v", r)
	}
	for _, text := range []string{"# " + strings.Repeat("x", yamlBytes), "[" + strings.Repeat("a,", yamlItems)} {
		r, _ = refused(t, text, YAML, Limits{})
		if r.Total != 1 || !strings.Contains(r.Lines[0].Mend, "CSV") {
			t.Errorf("%+v", r)
		}
	}
}

func TestReadersAreReadInAnyPieces(t *testing.T) {
	for _, n := range native {
		text := golden(t, n.format)
		for _, r := range []io.Reader{iotest.OneByteReader(bytes.NewReader(text)), iotest.DataErrReader(bytes.NewReader(text)), iotest.HalfReader(bytes.NewReader(text))} {
			if _, _, err := Read(r, Auto, Limits{}); err != nil {
				t.Errorf("%v: %v", n.format, err)
			}
		}
	}
}

func TestAReadersOwnErrorIsNoRefusal(t *testing.T) {
	broken := errors.New("the disk is gone")
	for _, n := range native {
		text := golden(t, n.format)
		for _, at := range []int{0, 100, 700, len(text)} {
			r := io.MultiReader(bytes.NewReader(text[:at]), iotest.ErrReader(broken))
			l, _, err := Read(r, n.format, Limits{})
			var refusal *Refusal
			if !errors.Is(err, broken) || errors.As(err, &refusal) || l != nil {
				t.Errorf("%v broken at %d: %v, %v", n.format, at, l, err)
			}
		}
	}
}

// idle is a reader that never gives anything.
type idle struct{}

func (idle) Read([]byte) (int, error) { return 0, nil }

func TestAReaderThatGivesNothingEnds(t *testing.T) {
	for _, n := range native {
		r := io.MultiReader(bytes.NewReader(golden(t, n.format)[:600]), &idle{})
		if n.format == YAML {
			continue // read whole by io.ReadAll
		}
		if _, _, err := Read(r, n.format, Limits{}); !errors.Is(err, io.ErrNoProgress) {
			t.Errorf("%v: %v", n.format, err)
		}
	}
}

func TestLineEndsOfTwoKinds(t *testing.T) {
	want := mustRead(t, golden(t, YAML), YAML)
	for _, n := range native {
		text := bytes.ReplaceAll(golden(t, n.format), []byte("\n"), []byte("\r\n"))
		if got := mustRead(t, text, n.format); !sameBytes(t, want, got) {
			t.Errorf("%v with \\r\\n is another list", n.format)
		}
	}
}

// TestLeapSecondsMapOutward reads windows that begin or end inside the leap
// second at the end of 2016, during which a clock shows 23:59:59 once more.
func TestLeapSecondsMapOutward(t *testing.T) {
	at := func(s string) int64 {
		v, err := time.Parse(time.RFC3339Nano, s)
		if err != nil {
			t.Fatal(err)
		}
		return v.UnixNano()
	}
	before, after := at("2016-12-31T23:59:59Z"), at("2017-01-01T00:00:00Z")
	far, late := at("2016-12-31T20:00:00Z"), at("2017-01-01T04:00:00Z")
	for _, c := range []struct {
		state, from, until string
		wantFrom           int64
		wantUntil          int64
	}{
		{"closed", "2016-12-31T23:59:60.500Z", "2017-01-01T04:00:00Z", before, late},
		{"closed", "2016-12-31T20:00:00Z", "2016-12-31T23:59:60.001Z", far, after},
		{"closed", "2016-12-31T23:59:60Z", "2016-12-31T23:59:60.999Z", before, after},
		{"closed", "2016-12-31T23:59:59.999Z", "2016-12-31T23:59:60Z", at("2016-12-31T23:59:59.999Z"), after},
		{"open", "2016-12-31T23:59:60Z", "2017-01-01T04:00:00Z", after, late},
		{"open", "2016-12-31T20:00:00Z", "2016-12-31T23:59:60.999Z", far, before},
	} {
		text := fmt.Sprintf(`{"closure_list":1,"id":"a","authority":"b","issued":"2016-12-31T23:59:60Z","covers":{"from":"2016-12-31T12:00:00Z","until":"2017-01-01T12:00:00Z"},
"unlisted_sky":"open","regions":[{"id":"r","whole_sky":true}],"windows":[{"region":"r","%s":{"from":"%s","until":"%s"}}]}`, c.state, c.from, c.until)
		l, _, err := Read(strings.NewReader(text), JSON, Limits{})
		if err != nil {
			t.Errorf("%s %s to %s: %v", c.state, c.from, c.until, err)
			continue
		}
		if w := l.Windows[0]; w.From != c.wantFrom || w.Until != c.wantUntil {
			t.Errorf("%s %s to %s is read as %v", c.state, c.from, c.until, w.Span())
		}
	}
	for covers, want := range map[string]string{
		`{"from":"2016-12-31T23:59:60Z","until":"2017-01-01T12:00:00Z"}`:     "2017-01-01 00:00:00 +0000 UTC to 2017-01-01 12:00:00 +0000 UTC",
		`{"from":"2016-12-31T12:00:00Z","until":"2016-12-31T23:59:60.500Z"}`: "2016-12-31 12:00:00 +0000 UTC to 2016-12-31 23:59:59 +0000 UTC",
	} {
		text := `{"closure_list":1,"id":"a","authority":"b","issued":"2016-12-31T00:00:00Z","covers":` + covers + `,"unlisted_sky":"open","regions":[],"windows":[]}`
		l, _, err := Read(strings.NewReader(text), JSON, Limits{})
		if err != nil {
			t.Fatal(err)
		}
		if got := fmt.Sprintf("%v to %v", l.Covers.From, l.Covers.Until); got != want {
			t.Errorf("covers %s is read as %s", covers, got)
		}
	}
	_, got := refused(t, `{"closure_list":1,"id":"a","authority":"b","issued":"2016-12-31T00:00:00Z","covers":{"from":"2016-12-31T12:00:00Z","until":"2017-01-01T12:00:00Z"},
"unlisted_sky":"open","regions":[{"id":"r","whole_sky":true}],"windows":[
{"region":"r","open":{"from":"2016-12-31T23:59:60.200Z","until":"2016-12-31T23:59:60.800Z"}},
{"region":"r","closed":{"from":"2016-12-31T23:59:60.800Z","until":"2016-12-31T23:59:60.200Z"}}]}`, JSON, Limits{})
	if got != "3: the open window is empty: it lies inside a leap second\n4: the window is empty: from is not before until" {
		t.Error(got)
	}
}

func TestExplainedNamesLines(t *testing.T) {
	l := mustRead(t, golden(t, CSV), CSV)
	bad := *l
	bad.Windows = append([]closures.Window(nil), l.Windows...)
	bad.Windows[3].Until = bad.Windows[3].From
	bad.Regions = append([]closures.Region(nil), l.Regions...)
	bad.Regions[5].Throughout = closures.NotThroughout
	_, err := closures.Index(&bad)
	var r *Refusal
	if !errors.As(Explained(&bad, err), &r) || r.Total != 2 || r.Lines[0].Line != 20 || r.Lines[1].Line != 24 {
		t.Errorf("%v is explained as %+v", err, r)
	}
	if Explained(l, nil) != nil || !errors.Is(Explained(l, io.EOF), io.EOF) {
		t.Error("other errors are changed")
	}
}

func TestShownIsShortAndPlain(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"plain", "plain"},
		{"tab\tand \\ and \x00 and \xff", `tab\tand \\ and \u{0} and \xff`},
		{strings.Repeat("é", 40), strings.Repeat("é", 40)},
		{strings.Repeat("é", 41), strings.Repeat("é", 38) + "..."},
		{"\u202eturned", `\u{202e}turned`},
	} {
		if got := shown([]byte(c.text), 80); got != c.want || len(got) > 80 {
			t.Errorf("%q is shown as %q, want %q", c.text, got, c.want)
		}
	}
}
