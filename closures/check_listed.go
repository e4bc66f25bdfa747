package closures

import (
	"math"
	"slices"
	"time"

	"github.com/golang/geo/r3"

	"beamward/geometry"
	"beamward/geometry/span"
)

// listedClosure is the check of the authorities' windows. An aim is open by a
// list only if some region that must hold it, or the unlisted sky, is open,
// and no region that might hold it is closed. Every list that closes must
// agree: closed wins.
type listedClosure struct{}

func (listedClosure) Code() Code { return CodeListedClosure }

func (listedClosure) Look(f *Foreseen, q *Question, sh *Sheet) {
	first := sh.begin()
	for i := range f.Lists {
		l := f.Lists[i].List
		if !l.For(q.Beam.ID) {
			continue
		}
		a := f.Rules.Authority(l.Authority())
		if a == nil {
			continue // its authority has left the rules, which not-covered tells
		}
		l.look(f, q, sh, i, a.Lead, a.Tail)
	}
	sh.sortFrom(first)
	sh.finish(CodeListedClosure, first, Margin{})
}

// look finds when the list closes the aim. Closed windows are widened by lead
// and tail; so is the time in which nothing open holds the aim, which narrows
// the open windows but for an edge at the coverage's own, beyond which this
// list says nothing.
func (l *List) look(f *Foreseen, q *Question, sh *Sheet, list int, lead, tail time.Duration) {
	near := q.Over.Widen(tail, lead) // what starts or ends just outside still reaches in
	covered := l.text.Covers.Intersect(near)
	hits, ok := q.Hits.of(list)
	if !ok {
		lo, hi, pad := q.band()
		sh.hits = l.might(sh.hits[:0], lo, hi, pad)
		hits = sh.hits
	}
	found := Finding{Code: CodeListedClosure, Source: Source(l.Authority()), Verdict: Violated, List: l.ID()}
	opened := sh.scratch[5][:0]
	for _, index := range hits {
		r := &l.text.Regions[index]
		might := q.touches(f, r, near, sh.scratch[0])
		sh.scratch[0] = might
		if len(might) == 0 {
			continue
		}
		closed := l.closedRaw(index, near, sh.scratch[1])
		sh.scratch[1] = closed
		wide := widened(closed, lead, tail, sh.scratch[2])
		sh.scratch[2] = wide
		sh.scratch[3] = span.AppendIntersect(sh.scratch[3], might, wide)
		for _, s := range sh.scratch[3] {
			if part := s.Intersect(q.Over); !part.Empty() {
				found.Over, found.Region = s, r.ID
				found.Detail = "a region that may hold the aim is closed"
				sh.add(found)
			}
		}
		if l.text.UnlistedOpen || covered.Empty() {
			continue
		}
		must, used := q.holds(f, r, covered, sh.scratch[3], sh.scratch[4])
		sh.scratch[3], sh.scratch[4] = must, used
		if len(must) == 0 {
			continue
		}
		open := span.AppendSubtract(sh.scratch[4], must, closed)
		sh.scratch[4] = open
		opened = append(opened, open...)
	}
	sh.scratch[5] = opened
	if l.text.UnlistedOpen || covered.Empty() {
		return
	}
	whole := [1]span.Span{covered}
	shut := span.AppendSubtract(sh.scratch[0], whole[:], span.Tidy(opened))
	sh.scratch[0] = shut
	for _, s := range shut {
		// An edge of near is not an edge of the closure, only of the look.
		found.Over = s.Widen(lead, tail)
		if part := found.Over.Intersect(q.Over); !part.Empty() {
			found.Region, found.Detail = "", "nothing that is open must hold the aim"
			sh.add(found)
		}
	}
}

// closedRaw returns when, near a span, the region is closed by its own
// windows, before they are widened. Outside the coverage only closed windows
// speak.
func (l *List) closedRaw(region int32, near span.Span, dst span.Set) span.Set {
	dst = dst[:0]
	r, t := &l.text.Regions[region], &l.regions[region]
	covered := l.text.Covers.Intersect(near)
	if r.Throughout == ThroughoutClosed {
		return appendSpan(dst, covered)
	}
	from, until := near.From.UnixNano(), near.Until.UnixNano()
	closed := overlapping(t.closed, from, until)
	if len(t.open) == 0 {
		for _, w := range closed {
			dst = appendSpan(dst, w.span())
		}
		return dst
	}
	// Closed outside its open windows: walk the gaps, then join the closed.
	at := covered.From
	var gaps []span.Span
	for _, w := range overlapping(t.open, from, until) {
		s := w.span().Intersect(covered)
		if s.Empty() {
			continue
		}
		if at.Before(s.From) {
			gaps = append(gaps, span.Span{From: at, Until: s.From})
		}
		at = s.Until
	}
	if at.Before(covered.Until) {
		gaps = append(gaps, span.Span{From: at, Until: covered.Until})
	}
	for _, w := range closed {
		gaps = append(gaps, w.span())
	}
	return append(dst, span.Make(gaps...)...)
}

func (w window) span() span.Span {
	return span.Span{From: time.Unix(0, w.from).UTC(), Until: time.Unix(0, w.until).UTC()}
}

// widened is Set.Widen in the caller's memory.
func widened(s span.Set, lead, tail time.Duration, dst span.Set) span.Set {
	dst = dst[:0]
	for _, o := range s {
		dst = appendSpan(dst, o.Widen(lead, tail))
	}
	return dst
}

// band returns between which declinations the aim lies over the question's
// span, and how far beyond light and errors may reach.
func (q *Question) band() (lo, hi, pad float64) {
	pad = q.extent().Radians()
	switch q.Aim.Frame {
	case Table:
		lo, hi = math.Inf(1), math.Inf(-1)
		for _, p := range q.Aim.Points {
			d := declination(p.Direction)
			lo, hi = min(lo, d), max(hi, d)
		}
		return lo, hi, pad + q.Aim.ownRate()*q.longestStep() // between points
	case ICRS:
		lo = declination(q.Aim.Direction)
		if rate := q.Aim.ownRate(); rate > 0 {
			years := q.Over.Until.Sub(time.Date(2000, 1, 1, 12, 0, 0, 0, time.UTC)).Hours() / (24 * 365.25)
			pad += math.Hypot(q.Aim.PMRA, q.Aim.PMDec) * math.Abs(years) * 1.1
			pad += math.Hypot(q.Aim.RateRA, q.Aim.RateDec) * q.farthest() * 1.1
		}
		return lo, lo, pad
	}
	// Fixed to the ground or to the frame of date: the declination is kept but
	// for precession (0.014° a year from J2000) and aberration, and a rate may
	// carry it.
	if len(q.Nights) == 0 {
		return math.Inf(-1), math.Inf(1), pad
	}
	d := declination(q.Aim.Direction)
	if q.Aim.Frame == Horizon {
		n := q.Nights[0]
		d = declination(n.ICRS(q.Aim.Direction, BinOf(n).From))
	}
	const frames = 0.02 // rad; over a degree
	return d, d, pad + frames + math.Hypot(q.Aim.RateRA, q.Aim.RateDec)*q.farthest()*1.1
}

// farthest is the longest time in seconds from the aim's reference to an
// instant of the span.
func (q *Question) farthest() float64 {
	a := math.Abs(q.Over.From.Sub(q.Aim.Reference).Seconds())
	return max(a, math.Abs(q.Over.Until.Sub(q.Aim.Reference).Seconds()))
}

// longestStep is the longest step of a table in seconds.
func (q *Question) longestStep() float64 {
	var s float64
	for i := 1; i < len(q.Aim.Points); i++ {
		s = max(s, q.Aim.Points[i].At.Sub(q.Aim.Points[i-1].At).Seconds())
	}
	return s
}

func declination(v r3.Vector) float64 { return math.Atan2(v.Z, math.Hypot(v.X, v.Y)) }

// Hits holds, for each list, the regions near a fixed aim, so that they are
// looked for once and not at each decision.
type Hits struct {
	centre  r3.Vector
	slack   float64 // aims within this of centre may use them
	regions [][]int32
}

// hitSlack is how far an aim may move before its hits are made again.
const hitSlack = 0.01

// of returns a list's hits; ok is false where they were not looked for.
func (h *Hits) of(list int) (hits []int32, ok bool) {
	if h == nil || list >= len(h.regions) {
		return nil, false
	}
	return h.regions[list], true
}

// MakeHits finds the regions of every list near a fixed ICRS aim; nil for any
// other aim, whose regions are looked up each time.
func MakeHits(f *Foreseen, b *BeamRules, a *Aim) *Hits {
	if a == nil || a.Frame != ICRS || a.ownRate() != 0 || !a.Valid() {
		return nil
	}
	h := &Hits{slack: hitSlack}
	h.find(f, a.Direction, hitSlack+(a.Error+b.Aim.Error+b.Asterism).Radians())
	return h
}

// Along finds, in h's memory, the regions near the way of a question's aim over
// its span, and returns h; nil for an aim that is not fixed to the stars but for
// a slow way of its own.
func (h *Hits) Along(f *Foreseen, q *Question) *Hits {
	a := q.Aim
	if a.Frame != ICRS && a.Frame != Table {
		return nil
	}
	centre, way := a.Direction, 0.0
	if rate := a.ownRate(); rate > 0 {
		half := q.Over.Length() / 2
		centre, way = a.own(q.Over.From.Add(half)), rate*half.Seconds()
	}
	if !unit(centre) || !(way < 0.1) {
		return nil
	}
	h.find(f, centre, way+q.extent().Radians())
	return h
}

// Regions returns the regions of a list, by its index, that were found.
func (h *Hits) Regions(list int) []int32 {
	found, _ := h.of(list)
	return found
}

// find looks for the regions within reach of a direction.
func (h *Hits) find(f *Foreseen, centre r3.Vector, reach float64) {
	h.centre = centre
	h.regions = slices.Grow(h.regions[:0], len(f.Lists))[:len(f.Lists)]
	d := declination(centre)
	for i := range f.Lists {
		l := f.Lists[i].List
		all := l.might(h.regions[i][:0], d, d, reach)
		near := all[:0]
		for _, index := range all {
			r := &l.text.Regions[index]
			// The chord is no longer than the arc, and quicker to tell.
			if most := r.Radius.Radians() + reach; r.Shape != ICRSCone || !(r.Direction.Sub(centre).Norm2() > most*most*(1+1e-8)+1e-15) {
				near = append(near, index)
			}
		}
		h.regions[i] = near
	}
}

// serves reports whether the hits hold for aim a, which may differ from the
// one they were made for.
func (h *Hits) serves(b *BeamRules, a *Aim, error0 float64) bool {
	return h != nil && a != nil && a.Frame == ICRS && a.ownRate() == 0 &&
		geometry.Separation(h.centre, a.Direction).Radians()+(a.Error+b.Aim.Error+b.Asterism).Radians()-error0 <= h.slack
}
