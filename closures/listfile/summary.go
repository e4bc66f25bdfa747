package listfile

import (
	"bufio"
	"fmt"
	"io"
	"strings"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// Summary is what was understood of a list, for people to hold against what
// they meant. Times are the list's own, before an authority's lead and tail.
type Summary struct {
	ID           closures.ListID
	Authority    closures.AuthorityID
	Issued       time.Time
	Covers       span.Span
	Replaces     []closures.ListID
	Beams        []closures.BeamID // none: every beam
	UnlistedOpen bool
	Regions      []RegionSummary // in the list's order
	Windows      int
	Digest       closures.Digest
	Proof        closures.Proof
}

// RegionSummary is what was understood of one region.
type RegionSummary struct {
	ID         string
	Shape      closures.Shape
	Throughout closures.Throughout
	Windows    int
	Closed     time.Duration // within the coverage
}

// Summarise sums a list up.
func Summarise(t *closures.ListText) Summary {
	s := Summary{ID: t.ID, Authority: t.Authority, Issued: t.Issued, Covers: t.Covers, Replaces: t.Replaces, Beams: t.Beams,
		UnlistedOpen: t.UnlistedOpen, Windows: len(t.Windows), Digest: t.Digest, Proof: t.Proof, Regions: make([]RegionSummary, len(t.Regions))}
	first := byRegion(t)
	var spans []span.Span
	for i := range t.Regions {
		r := &t.Regions[i]
		one := &s.Regions[i]
		*one = RegionSummary{ID: r.ID, Shape: r.Shape, Throughout: r.Throughout, Windows: len(first[i])}
		switch r.Throughout {
		case closures.ThroughoutClosed:
			one.Closed = t.Covers.Length()
			continue
		case closures.ThroughoutOpen:
			continue
		}
		spans = spans[:0]
		for _, w := range first[i] {
			if t.Windows[w].Open {
				spans = append(spans, t.Windows[w].Span())
			}
		}
		closed := span.Set(nil)
		if len(spans) > 0 || len(first[i]) == 0 { // closed outside its open windows; with no window at all nothing opens it
			closed = span.Make(spans...).Complement(t.Covers)
		}
		spans = spans[:0]
		for _, w := range first[i] {
			if !t.Windows[w].Open {
				spans = append(spans, t.Windows[w].Span())
			}
		}
		one.Closed = closed.Union(span.Make(spans...)).Within(t.Covers).Total()
	}
	return s
}

// byRegion returns the indexes of each region's windows.
func byRegion(t *closures.ListText) [][]int32 {
	counts := make([]int, len(t.Regions))
	for i := range t.Windows {
		if r := t.Windows[i].Region; r >= 0 && int(r) < len(counts) {
			counts[r]++
		}
	}
	all := make([]int32, len(t.Windows))
	of := make([][]int32, len(t.Regions))
	for i, n := range counts {
		of[i], all = all[:0:n], all[n:]
	}
	for i := range t.Windows {
		if r := t.Windows[i].Region; r >= 0 && int(r) < len(of) {
			of[r] = append(of[r], int32(i))
		}
	}
	return of
}

// WriteText writes the summary for reading.
func (s *Summary) WriteText(w io.Writer) error {
	b := bufio.NewWriter(w)
	fmt.Fprintf(b, "list %s of %s, issued %s\n", s.ID, s.Authority, stamp(s.Issued))
	fmt.Fprintf(b, "covers %s to %s (%s)\n", stamp(s.Covers.From), stamp(s.Covers.Until), s.Covers.Length())
	if len(s.Beams) == 0 {
		fmt.Fprintln(b, "for every beam")
	} else {
		fmt.Fprintf(b, "for beams %s\n", joined(s.Beams))
	}
	if len(s.Replaces) > 0 {
		fmt.Fprintf(b, "replaces %s\n", joined(s.Replaces))
	}
	fmt.Fprintf(b, "the sky outside its regions is %s\n", stateWord(s.UnlistedOpen))
	fmt.Fprintf(b, "%d regions, %d windows%s\n", len(s.Regions), s.Windows, said(s.Proof.Count, ", as the list counts them"))
	fmt.Fprintf(b, "%s%s\n", s.Digest, said(s.Proof.Digest, ", as the list says"))
	wide := len("region")
	for i := range s.Regions {
		wide = max(wide, len(s.Regions[i].ID))
	}
	if len(s.Regions) > 0 {
		fmt.Fprintf(b, "%-*s  %-9s  %8s  %12s\n", wide, "region", "shape", "windows", "closed_s")
	}
	for _, r := range s.Regions {
		windows := fmt.Sprint(r.Windows)
		switch r.Throughout {
		case closures.ThroughoutClosed:
			windows = "closed"
		case closures.ThroughoutOpen:
			windows = "open"
		}
		fmt.Fprintf(b, "%-*s  %-9s  %8s  %12.3f\n", wide, r.ID, r.Shape, windows, r.Closed.Seconds())
	}
	return b.Flush()
}

func stamp(t time.Time) string { return string(appendTime(nil, t.UnixNano())) }

func said(yes bool, words string) string {
	if yes {
		return words
	}
	return ""
}

func joined[T ~string](names []T) string {
	words := make([]string, len(names))
	for i, n := range names {
		words[i] = string(n)
	}
	return strings.Join(words, ", ")
}
