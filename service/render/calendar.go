package render

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"strings"
	"time"

	ics "github.com/arran4/golang-ical"
)

// Calendar is the head of a calendar.
type Calendar struct {
	Name string    // such as the site's
	At   time.Time // of writing
}

// product names what wrote the calendar (RFC 5545, section 3.7.3).
const product = "-//beamward//closures//EN"

// Write writes items as iCalendar (RFC 5545): one event each, in whole seconds,
// with a UID that stays the same as long as the item does. Lines end in CRLF
// and are folded.
func (c *Calendar) Write(w io.Writer, items []Item) error {
	cal := ics.NewCalendarFor("beamward")
	cal.SetProductId(product)
	cal.SetMethod(ics.MethodPublish)
	cal.SetXWRCalName(plain(c.Name))
	cal.SetXWRCalDesc(Notice)
	seen := map[string]int{}
	for i := range items {
		it := &items[i]
		from, until, ok := it.seconds()
		if !ok {
			continue
		}
		uid := it.uid()
		if seen[uid]++; seen[uid] > 1 {
			continue // the same closure twice is one closure
		}
		e := cal.AddEvent(uid)
		e.SetDtStampTime(c.At.UTC().Truncate(time.Second))
		e.SetStartAt(from)
		e.SetEndAt(until)
		e.SetSummary(plain(it.summary()))
		e.SetDescription(plain(it.description()))
		e.SetTimeTransparency(ics.TransparencyTransparent) // it keeps nobody busy
	}
	if err := cal.SerializeTo(w, ics.WithNewLineWindows); err != nil {
		return fmt.Errorf("writing a calendar: %w", err)
	}
	return nil
}

// uid names an item by all that tells it from others, its times included: what
// has moved is another closure.
func (it *Item) uid() string {
	h := sha256.New()
	for _, s := range []string{it.Beam, it.Target, it.Code, it.Source, it.List, it.Region, it.Ref, fmt.Sprint(it.Open), stamp(it.Span.From.UTC()), stamp(it.Span.Until.UTC())} {
		h.Write([]byte(s))
		h.Write([]byte{0})
	}
	return hex.EncodeToString(h.Sum(nil)[:16]) + "@beamward"
}

func (it *Item) summary() string {
	beam := it.Beam
	if beam == "" {
		beam = "every beam"
	}
	if it.Open {
		return beam + ": allowed for " + it.Target
	}
	s := beam + ": " + it.Code
	if it.Region != "" {
		s += " (" + it.Region + ")"
	}
	return s
}

func (it *Item) description() string {
	parts := []string{Notice}
	for _, p := range []struct{ name, value string }{{"source", it.Source}, {"list", it.List}, {"region", it.Region}, {"ref", it.Ref}, {"", it.Detail}} {
		switch {
		case p.value == "":
		case p.name == "":
			parts = append(parts, p.value)
		default:
			parts = append(parts, p.name+" "+p.value)
		}
	}
	return strings.Join(parts, "; ")
}
