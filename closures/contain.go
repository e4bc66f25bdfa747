package closures

import (
	"slices"

	"beamward/geometry"
	"beamward/geometry/span"
)

// contains reports whether it is proven that list l closes every beam and aim
// at every instant at which old does, so that it can take old's place without
// opening anything. It may say false of lists for which that is true; it never
// says true where it is not.
//
// The proof is by parts. l speaks of every beam and of all the time that old
// does. Every region of old that can close has its twin in l: a region that
// holds it, closed whenever it is. And where old does not open the unlisted
// sky, neither does l, and every region of l that can open lies within one of
// old's that opens at least as long.
func contains(l, old *List) bool {
	n, o := l.Text(), old.Text()
	if !n.Covers.Covers(o.Covers) || len(n.Beams) != 0 && (len(o.Beams) == 0 || slices.ContainsFunc(o.Beams, func(b BeamID) bool { return !slices.Contains(n.Beams, b) })) {
		return false
	}
	if n.UnlistedOpen && !o.UnlistedOpen {
		return false
	}
	larger := func(j, i int) bool { return sameOrLarger(&n.Regions[j], &o.Regions[i]) && closesAsLong(l, j, old, i) }
	smaller := func(i, j int) bool { return sameOrLarger(&o.Regions[i], &n.Regions[j]) && closesAsLong(l, j, old, i) }
	if !everyHasTwin(o.Regions, n.Regions, larger, func(int) bool { return false }) {
		return false
	}
	// Where old closes only by its regions, each of which has its twin, that
	// is all.
	return o.UnlistedOpen || everyHasTwin(n.Regions, o.Regions, smaller, func(j int) bool { return opensNothing(l, j) })
}

// mostPairs bounds the pairs of regions that are tried beyond those of one
// name: a longer comparison gives up, which calls the list loosening.
const mostPairs = 4_000_000

// everyHasTwin reports whether each of the regions wants, but those excused,
// has one of the regions have for which twin(have, want) holds. The one of the
// same name is tried first.
func everyHasTwin(want, have []Region, twin func(have, want int) bool, excused func(want int) bool) bool {
	byName := make(map[string]int, len(have))
	for i := range have {
		byName[have[i].ID] = i
	}
	pairs := 0
	for w := range want {
		if h, ok := byName[want[w].ID]; ok && twin(h, w) {
			continue
		}
		if excused(w) {
			continue
		}
		if pairs += len(have); pairs > mostPairs {
			return false
		}
		found := false
		for h := range have {
			if found = twin(h, w); found {
				break
			}
		}
		if !found {
			return false
		}
	}
	return true
}

// sameOrLarger reports whether region a surely holds all of region b. Shapes
// of different kinds are not compared, but that the whole sky holds all.
func sameOrLarger(a, b *Region) bool {
	if a.Shape == WholeSky {
		return true
	}
	if a.Shape != b.Shape {
		return false
	}
	switch a.Shape {
	case ICRSCone:
		return a.Direction == b.Direction && a.Radius >= b.Radius ||
			(geometry.Separation(a.Direction, b.Direction)+b.Radius).Radians() <= a.Radius.Radians()-1e-12
	case HorizonBox:
		return a.Box == b.Box && a.Observed == b.Observed
	case TrackCone:
		return a.Radius >= b.Radius && slices.Equal(a.Points, b.Points)
	}
	return false
}

// closesAsLong reports whether region j of l is closed by its own windows
// whenever region i of old is, within old's coverage and beyond it.
func closesAsLong(l *List, j int, old *List, i int) bool {
	over := hull(old, i)
	a := l.closedRaw(int32(j), over, nil)
	for _, s := range old.closedRaw(int32(i), over, nil) {
		if !a.Covers(s) {
			return false
		}
	}
	return true
}

// hull returns a span that holds the coverage of l and every window of region
// i.
func hull(l *List, i int) span.Span {
	h := l.Covers()
	t := &l.regions[i]
	for _, w := range [][]window{t.closed, t.open} {
		if len(w) == 0 {
			continue
		}
		if s := w[0].span(); s.From.Before(h.From) {
			h.From = s.From
		}
		if s := w[len(w)-1].span(); s.Until.After(h.Until) {
			h.Until = s.Until
		}
	}
	return h
}

// opensNothing reports whether region j of l is closed throughout its list's
// coverage.
func opensNothing(l *List, j int) bool {
	return span.Set(l.closedRaw(int32(j), l.Covers(), nil)).Covers(l.Covers())
}
