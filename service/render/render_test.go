package render

import (
	"bytes"
	"encoding/csv"
	"strings"
	"testing"
	"time"

	ics "github.com/arran4/golang-ical"
	"pgregory.net/rapid"

	"beamward/geometry/span"
)

var evening = time.Date(2031, 2, 14, 3, 10, 2, 0, time.UTC)

func closure(from, length time.Duration) Item {
	return Item{Beam: "north", Code: "listed-closure", Source: "orbital-desk", List: "2031-045-B", Region: "f-101", Ref: "A-17", Detail: "a region that may hold the aim is closed",
		Span: span.Span{From: evening.Add(from), Until: evening.Add(from + length)}}
}

func TestCalendarReadsBack(t *testing.T) {
	items := []Item{
		closure(300*time.Millisecond, 38400*time.Millisecond),
		{Code: "hold", Ref: "h-1", Detail: "comma, semicolon; back\\slash\r\nBEGIN:VEVENT " + strings.Repeat("long äöü ", 40), Span: span.Span{From: evening, Until: evening.Add(time.Hour)}},
		{Beam: "north", Target: "f-101", Open: true, Span: span.Span{From: evening.Add(time.Millisecond), Until: evening.Add(1999 * time.Millisecond)}},
		{Beam: "north", Target: "f-101", Open: true, Span: span.Span{From: evening.Add(time.Millisecond), Until: evening.Add(2999 * time.Millisecond)}},
	}
	var out bytes.Buffer
	c := Calendar{Name: "Skerry Peak", At: evening}
	if err := c.Write(&out, append(items, items[0])); err != nil {
		t.Fatal(err)
	}
	for _, line := range strings.SplitAfter(out.String(), "\n") {
		if line != "" && !strings.HasSuffix(line, "\r\n") {
			t.Errorf("line without CRLF: %q", line)
		}
		if len(line) > 77 { // RFC 5545, section 3.1: 75 octets besides the line break
			t.Errorf("line of %d octets: %q", len(line), line)
		}
	}
	cal, err := ics.ParseCalendar(&out)
	if err != nil {
		t.Fatal(err)
	}
	events := cal.Events()
	if len(events) != 3 {
		t.Fatalf("%d events, want 3: the span shorter than a second is not allowed, and the twin is one", len(events))
	}
	start, _ := events[0].GetStartAt()
	end, _ := events[0].GetEndAt()
	if !start.Equal(evening) || !end.Equal(evening.Add(39*time.Second)) {
		t.Errorf("the closure is %v to %v: not rounded outward", start, end)
	}
	start, _ = events[2].GetStartAt()
	end, _ = events[2].GetEndAt()
	if !start.Equal(evening.Add(time.Second)) || !end.Equal(evening.Add(2*time.Second)) {
		t.Errorf("the allowed span is %v to %v: not rounded inward", start, end)
	}
	if d := events[1].GetProperty(ics.ComponentPropertyDescription).Value; !strings.HasPrefix(d, Notice) || !strings.Contains(d, `comma, semicolon; back\slash  BEGIN:VEVENT`) {
		t.Errorf("the description reads back as %q", d)
	}
	if !strings.HasPrefix(events[0].GetProperty(ics.ComponentPropertyDescription).Value, Notice) {
		t.Error("the notice is missing")
	}
}

func TestUIDsAreStable(t *testing.T) {
	a, b := closure(0, time.Minute), closure(0, time.Minute)
	b.Detail = "another wording"
	if a.uid() != b.uid() {
		t.Error("the wording changes the uid")
	}
	seen := map[string]bool{a.uid(): true}
	for _, change := range []func(*Item){
		func(i *Item) { i.Ref = "A-18" }, func(i *Item) { i.Region = "f-102" }, func(i *Item) { i.List = "x" }, func(i *Item) { i.Source = "x" }, func(i *Item) { i.Code = "hold" },
		func(i *Item) { i.Beam = "south" }, func(i *Item) { i.Span.Until = i.Span.Until.Add(time.Second) }, func(i *Item) { i.Target = "x" }, func(i *Item) { i.Open = true },
	} {
		c := closure(0, time.Minute)
		change(&c)
		if seen[c.uid()] {
			t.Errorf("%+v has a uid that stands for another", c)
		}
		seen[c.uid()] = true
	}
}

func TestCSVReadsBack(t *testing.T) {
	items := []Item{closure(300*time.Microsecond, time.Second), {Code: "hold", Ref: "=1+1", Source: "@ann", Detail: "a \"quoted\", text\nof two lines", Span: span.Span{From: evening, Until: evening.Add(time.Hour)}}}
	var out bytes.Buffer
	if err := CSV(&out, items); err != nil {
		t.Fatal(err)
	}
	r := csv.NewReader(&out)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 3 || rows[1][3] != "2031-02-14T03:10:02.000Z" || rows[1][4] != "2031-02-14T03:10:03.001Z" || rows[2][0] != "*" || rows[2][9] != "'=1+1" || rows[2][6] != "'@ann" || rows[2][10] != "a \"quoted\", text of two lines" {
		t.Errorf("read back as %q", rows)
	}
}

// What is written to the second closes at least as long, and allows at most as
// long, as what it stands for.
func TestRoundingIsOutwardForClosures(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		from := evening.Add(time.Duration(rapid.Int64Range(-1e12, 1e12).Draw(t, "from")))
		it := Item{Open: rapid.Bool().Draw(t, "open"), Span: span.Span{From: from, Until: from.Add(time.Duration(rapid.Int64Range(1, 1e11).Draw(t, "length")))}}
		a, b, ok := it.seconds()
		rounded := span.Span{From: a, Until: b}
		switch {
		case !it.Open && (!ok || !rounded.Covers(it.Span) || rounded.Length() >= it.Span.Length()+2*time.Second):
			t.Fatalf("closure %v became %v", it.Span, rounded)
		case it.Open && ok && !it.Span.Covers(rounded):
			t.Fatalf("allowed %v became %v", it.Span, rounded)
		}
	})
}

func TestSortIsTotal(t *testing.T) {
	items := []Item{closure(time.Second, time.Second), closure(0, 2*time.Second), closure(0, time.Second)}
	Sort(items)
	for i, want := range []time.Duration{0, 0, time.Second} {
		if !items[i].Span.From.Equal(evening.Add(want)) {
			t.Fatalf("not in order: %v", items)
		}
	}
	if items[0].Span.Length() != time.Second {
		t.Fatal("of equal starts the shorter goes first")
	}
}
