package closures

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/span"
)

// List is one closure list made ready for use: immutable, and safe to share.
type List struct {
	text    *ListText
	regions []timetable
	cones   []coneKey // the ICRS cones in order of declination
	widest  s1.Angle  // the largest radius among them
	others  []int32   // regions that are no ICRS cone
}

// timetable holds the windows of one region in order of time. Windows that
// touch or overlap are joined, so both ends rise together.
type timetable struct {
	closed, open []window
}

type window struct {
	from, until int64 // Unix nanoseconds
	index       int32 // of the first window joined, in ListText.Windows
}

type coneKey struct {
	dec    float64
	region int32
}

// ListProblem is one thing wrong with a list as a whole.
type ListProblem struct {
	Region int // index into Regions, or -1
	Window int // index into Windows, or -1
	Cause  string
	Mend   string
}

// ListProblems is every such thing; a list with one is refused whole.
type ListProblems []ListProblem

// Error names the first problem and how many there are.
func (p ListProblems) Error() string {
	if len(p) == 0 {
		return "list: no problem"
	}
	return fmt.Sprintf("list: %s (%s); %d in all", p[0].Cause, p[0].Mend, len(p))
}

// Index checks a list's text as a whole and makes it ready for use. It is
// pure and may be slow, so it runs away from the engine. The text must not
// change afterwards. The error is ListProblems.
func Index(text *ListText) (*List, error) {
	if problems := text.problems(); len(problems) > 0 {
		return nil, problems
	}
	l := &List{text: text, regions: make([]timetable, len(text.Regions))}
	l.fill()
	for i := range text.Regions {
		r := &text.Regions[i]
		if r.Shape != ICRSCone {
			l.others = append(l.others, int32(i))
			continue
		}
		l.cones = append(l.cones, coneKey{dec: math.Atan2(r.Direction.Z, math.Hypot(r.Direction.X, r.Direction.Y)), region: int32(i)})
		l.widest = max(l.widest, r.Radius)
	}
	slices.SortFunc(l.cones, func(a, b coneKey) int {
		return cmp.Or(cmp.Compare(a.dec, b.dec), cmp.Compare(a.region, b.region))
	})
	return l, nil
}

// fill sorts the windows into their regions' timetables. Two passes over one
// backing array keep a million windows cheap.
func (l *List) fill() {
	counts := make([][2]int32, len(l.regions))
	for i := range l.text.Windows {
		w := &l.text.Windows[i]
		counts[w.Region][kind(w.Open)]++
	}
	all := make([]window, len(l.text.Windows))
	for i := range l.regions {
		c, o := counts[i][0], counts[i][1]
		l.regions[i].closed, all = all[:0:c], all[c:]
		l.regions[i].open, all = all[:0:o], all[o:]
	}
	for i := range l.text.Windows {
		w := &l.text.Windows[i]
		t := &l.regions[w.Region]
		one := window{from: w.From, until: w.Until, index: int32(i)}
		if w.Open {
			t.open = append(t.open, one)
		} else {
			t.closed = append(t.closed, one)
		}
	}
	for i := range l.regions {
		l.regions[i].closed = join(l.regions[i].closed)
		l.regions[i].open = join(l.regions[i].open)
	}
}

func kind(open bool) int {
	if open {
		return 1
	}
	return 0
}

// join sorts windows by their start and joins those that touch.
func join(w []window) []window {
	if len(w) < 2 {
		return w
	}
	byStart := func(a, b window) int { return cmp.Or(cmp.Compare(a.from, b.from), cmp.Compare(a.index, b.index)) }
	if !slices.IsSortedFunc(w, byStart) {
		slices.SortFunc(w, byStart)
	}
	out := w[:1]
	for _, next := range w[1:] {
		last := &out[len(out)-1]
		if next.from <= last.until {
			last.until = max(last.until, next.until)
			continue
		}
		out = append(out, next)
	}
	return out
}

// Text returns what the list says. It must not be changed.
func (l *List) Text() *ListText { return l.text }

// ID returns the list's identifier.
func (l *List) ID() ListID { return l.text.ID }

// Authority returns whose list it is.
func (l *List) Authority() AuthorityID { return l.text.Authority }

// Covers returns the time the list speaks for.
func (l *List) Covers() span.Span { return l.text.Covers }

// Digest returns the digest over the list's canonical form.
func (l *List) Digest() Digest { return l.text.Digest }

// For reports whether the list speaks of beam b.
func (l *List) For(b BeamID) bool {
	return len(l.text.Beams) == 0 || slices.Contains(l.text.Beams, b)
}

// overlapping returns the windows of w that overlap [from, until).
func overlapping(w []window, from, until int64) []window {
	i := sort.Search(len(w), func(i int) bool { return w[i].until > from })
	j := i
	for j < len(w) && w[j].from < until {
		j++
	}
	return w[i:j]
}

const maxProblems = 1000 // kept in detail

func (t *ListText) problems() ListProblems {
	var p ListProblems
	add := func(region, window int, cause, mend string) {
		if len(p) < maxProblems {
			p = append(p, ListProblem{Region: region, Window: window, Cause: cause, Mend: mend})
		}
	}
	if !ValidName(string(t.ID)) {
		add(-1, -1, "the id is not a name", "use 1 to 64 of A-Z a-z 0-9 . _ -")
	}
	if !ValidName(string(t.Authority)) {
		add(-1, -1, "the authority is not a name", "use 1 to 64 of A-Z a-z 0-9 . _ -")
	}
	for _, b := range t.Beams {
		if !ValidName(string(b)) {
			add(-1, -1, "a beam is not a name", "use 1 to 64 of A-Z a-z 0-9 . _ -")
		}
	}
	if t.Issued.IsZero() {
		add(-1, -1, "the list has no time of issue", "give issued")
	}
	if t.Covers.Empty() {
		add(-1, -1, "the coverage is empty", "covers.from must be before covers.until")
	}
	if slices.Contains(t.Replaces, t.ID) {
		add(-1, -1, "the list replaces itself", "name an older list in replaces")
	}
	if len(t.Regions) > math.MaxInt32 || len(t.Windows) > math.MaxInt32 {
		add(-1, -1, "the list is too long", "split it")
		return p
	}
	windows := make([]int32, len(t.Regions))
	covFrom, covUntil := t.Covers.From.UnixNano(), t.Covers.Until.UnixNano()
	for i := range t.Windows {
		w := &t.Windows[i]
		switch {
		case w.Region < 0 || int(w.Region) >= len(t.Regions):
			add(-1, i, "the window names no region of the list", "define the region")
			continue
		case w.From >= w.Until:
			add(-1, i, "the window is empty", "from must be before until")
		case w.Until <= covFrom || w.From >= covUntil:
			add(-1, i, "the window lies outside the coverage", "correct the window or covers")
		}
		windows[w.Region]++
	}
	seen := make(map[string]int, len(t.Regions))
	for i := range t.Regions {
		r := &t.Regions[i]
		if !ValidName(r.ID) {
			add(i, -1, "the region's id is not a name", "use 1 to 64 of A-Z a-z 0-9 . _ -")
		}
		if _, twice := seen[r.ID]; twice {
			add(i, -1, "the region's id is used twice", "define each region once")
		}
		seen[r.ID] = i
		if cause, mend := r.problem(); cause != "" {
			add(i, -1, cause, mend)
		}
		switch {
		case windows[i] == 0 && r.Throughout == NotThroughout:
			add(i, -1, "the region has neither windows nor a standing state", "give windows, or throughout: open or closed")
		case windows[i] > 0 && r.Throughout != NotThroughout:
			add(i, -1, "the region has windows and a standing state", "give windows or throughout, not both")
		}
	}
	return p
}

// problem says what is wrong with a region's shape and how to mend it.
func (r *Region) problem() (cause, mend string) {
	radiusOK := r.Radius > 0 && r.Radius <= 90*s1.Degree
	switch r.Shape {
	case ICRSCone:
		if !unit(r.Direction) || !radiusOK {
			return "the cone is not valid", "give ra_deg, dec_deg and a radius_deg over 0, at most 90"
		}
	case HorizonBox:
		if !r.Box.Valid() {
			return "the box is not valid", "give azimuths from 0 to 360 and el_from_deg below el_to_deg, from -90 to 90"
		}
	case TrackCone:
		if !radiusOK || len(r.Points) < 2 {
			return "the track is not valid", "give at least two points and a radius_deg over 0, at most 90"
		}
		for i, p := range r.Points {
			if !unit(p.Direction) {
				return "a point of the track is not valid", "give ra_deg and dec_deg"
			}
			if i > 0 && (!p.At.After(r.Points[i-1].At) || !(p.Direction.Dot(r.Points[i-1].Direction) > 0)) {
				return "the track's points are out of order or too far apart", "put them in order of time, less than 90 degrees apart"
			}
		}
	case WholeSky:
	default:
		return "the region has no shape", "give icrs, horizon, track or whole_sky"
	}
	return "", ""
}

// String names the list as people do.
func (l *List) String() string {
	return strings.Join([]string{string(l.text.Authority), string(l.text.ID)}, "/")
}

// might returns the regions of l, in order, that an ICRS direction of
// declination from lo to hi, within pad, could touch.
func (l *List) might(dst []int32, lo, hi, pad float64) []int32 {
	dst = append(dst, l.others...)
	reach := pad + l.widest.Radians()
	lo, hi = lo-reach, hi+reach
	i := sort.Search(len(l.cones), func(i int) bool { return l.cones[i].dec >= lo })
	if !geometry.Finite(lo, hi) {
		i, hi = 0, math.Inf(1)
	}
	for ; i < len(l.cones) && !(l.cones[i].dec > hi); i++ {
		dst = append(dst, l.cones[i].region)
	}
	return dst
}
