package recheck

import (
	"math"
	"slices"
	"time"

	"beamward/closures"
)

// slack is how far an aim may move before what lies near it is gathered anew.
const slack = 1 * degree

// memory is what lies near one beam's aim, a list each, in the lists' order.
type memory struct {
	aim   point // against the stars
	pad   float64
	lists []near
}

// near is what of one list lies within slack of an aim.
type near struct {
	list    *closures.List
	regions []region
}

// region is one region with its windows in order of time, those that touch
// joined.
type region struct {
	*closures.Region
	closed, open []edges
}

// edges are the ends of one window in Unix nanoseconds.
type edges struct{ from, until int64 }

// memory returns what lies near the look's aim, gathered anew where the aim or
// the lists changed.
func (c *Checker) memory(l *look) *memory {
	if c.beams == nil {
		c.beams = map[closures.BeamID]*memory{}
	}
	m := c.beams[l.d.Beam]
	if m == nil {
		m = &memory{}
		c.beams[l.d.Beam] = m
	}
	p, _, ok := l.aim.stars(l.at)
	later, _, there := l.aim.stars(l.at.Add(Ahead))
	if !there { // a table that ends
		later = p
	}
	pad := l.aim.pad + apart(p, later)
	if !ok {
		pad = math.Pi // everything is near
	}
	same := len(m.lists) == len(l.f.Lists) && pad <= m.pad+slack/2 && (pad >= math.Pi || apart(m.aim, p) <= slack/2)
	for i := 0; same && i < len(m.lists); i++ {
		same = m.lists[i].list == l.f.Lists[i].List
	}
	if same {
		return m
	}
	*m = memory{aim: p, pad: pad}
	for i := range l.f.Lists {
		m.lists = append(m.lists, gather(l.f.Lists[i].List, p, pad+slack))
	}
	return m
}

// gather finds the regions of a list within reach of a point, with their
// windows. Regions that are fixed to the ground are always near.
func gather(list *closures.List, p point, reach float64) near {
	n := near{list: list}
	if list == nil {
		return n
	}
	text := list.Text()
	place := make([]int32, len(text.Regions))
	for i := range text.Regions {
		r := &text.Regions[i]
		place[i] = -1
		switch r.Shape {
		case closures.ICRSCone:
			if apart(p, equatorial(r.Direction)) > r.Radius.Radians()+reach {
				continue
			}
		case closures.TrackCone:
			if passes(r.Points, p) > r.Radius.Radians()+reach {
				continue
			}
		}
		place[i] = int32(len(n.regions))
		n.regions = append(n.regions, region{Region: r})
	}
	for i := range text.Windows {
		w := &text.Windows[i]
		if w.Region < 0 || int(w.Region) >= len(place) || place[w.Region] < 0 {
			continue
		}
		r := &n.regions[place[w.Region]]
		if w.Open {
			r.open = append(r.open, edges{w.From, w.Until})
		} else {
			r.closed = append(r.closed, edges{w.From, w.Until})
		}
	}
	for i := range n.regions {
		n.regions[i].closed = joined(n.regions[i].closed)
		n.regions[i].open = joined(n.regions[i].open)
	}
	return n
}

// passes bounds from below how near a track comes to a point: to its points,
// less half of its longest step.
func passes(points []closures.AimPoint, p point) float64 {
	least, step := math.Inf(1), 0.0
	for i := range points {
		q := equatorial(points[i].Direction)
		least = min(least, apart(p, q))
		if i > 0 {
			step = max(step, apart(equatorial(points[i-1].Direction), q))
		}
	}
	return least - step
}

func joined(w []edges) []edges {
	slices.SortFunc(w, func(a, b edges) int {
		switch {
		case a.from < b.from:
			return -1
		case a.from > b.from:
			return 1
		}
		return 0
	})
	out := w[:0]
	for _, o := range w {
		if n := len(out); n > 0 && o.from <= out[n-1].until {
			out[n-1].until = max(out[n-1].until, o.until)
			continue
		}
		out = append(out, o)
	}
	return out
}

// holding returns the first window that ends after t, or nil.
func holding(w []edges, t int64) *edges {
	i, j := 0, len(w)
	for i < j {
		if h := (i + j) / 2; w[h].until > t {
			j = h
		} else {
			i = h + 1
		}
	}
	if i == len(w) {
		return nil
	}
	return &w[i]
}

func nanos(t time.Time) int64 { return t.UnixNano() }
