package recheck

import (
	"math"
	"time"

	"beamward/closures"
)

// listed checks the authorities' lists: no region that surely holds light of
// the beam may be closed, and where the sky between the regions is closed some
// region that may hold all of it must be open. BW-008, BW-015, BW-016.
func (l *look) listed(m *memory) string {
	for i := range m.lists {
		n := &m.lists[i]
		if n.list == nil {
			return "second opinion: a list is missing"
		}
		if !speaks(n.list, l.d.Beam) {
			continue
		}
		a := l.authority(n.list.Authority())
		if a == nil {
			continue // not-covered tells of it
		}
		covers := n.list.Covers()
		covered := !l.at.Before(covers.From) && l.at.Before(covers.Until)
		opens := n.list.Text().UnlistedOpen || !covered
		for j := range n.regions {
			r := &n.regions[j]
			if !opens && r.opensAt(l.at) && l.inside(r.Region, l.at, -1) {
				opens = true
			}
			for _, t := range l.samples() {
				if r.closedAt(n.list, a, t) && l.inside(r.Region, t, 1) && !l.ends(t) {
					return "second opinion: a listed window closes the aim"
				}
			}
			if t, ok := r.next(n.list, a, l.at); ok && l.inside(r.Region, t, 1) && !l.ends(t) {
				return "second opinion: a listed window begins before the end"
			}
		}
		if !opens {
			return "second opinion: nothing that is open holds the aim"
		}
	}
	return ""
}

func speaks(list *closures.List, b closures.BeamID) bool {
	beams := list.Text().Beams
	for _, o := range beams {
		if o == b {
			return true
		}
	}
	return len(beams) == 0
}

func (l *look) authority(id closures.AuthorityID) *closures.AuthorityRules {
	for i := range l.rules.Authorities {
		if l.rules.Authorities[i].ID == id {
			return &l.rules.Authorities[i]
		}
	}
	return nil
}

// closedAt reports whether the region is closed at an instant: by a closed
// window with lead and tail, throughout, or since no open window, narrowed,
// holds the instant.
func (r *region) closedAt(list *closures.List, a *closures.AuthorityRules, t time.Time) bool {
	at, lead, tail := nanos(t), int64(a.Lead), int64(a.Tail)
	if w := holding(r.closed, at-tail); w != nil && w.from-lead <= at {
		return true
	}
	covers := list.Covers()
	if t.Before(covers.From) || !t.Before(covers.Until) {
		return false
	}
	if r.Throughout == closures.ThroughoutClosed {
		return true
	}
	if len(r.open) == 0 {
		return false
	}
	w := holding(r.open, at)
	if w == nil || w.from > at {
		return true
	}
	// At the coverage's own edges nothing is narrowed: beyond them this list
	// says nothing.
	return w.until < nanos(covers.Until) && at >= w.until-lead || w.from > nanos(covers.From) && at < w.from+tail
}

// next returns the first instant after now, and not later than Ahead, at which
// a window closes the region.
func (r *region) next(list *closures.List, a *closures.AuthorityRules, now time.Time) (time.Time, bool) {
	at, lead := nanos(now), int64(a.Lead)
	t := int64(math.MaxInt64)
	if w := holding(r.closed, at+lead); w != nil && w.from-lead > at {
		t = w.from - lead
	}
	if w := holding(r.open, at); w != nil && w.from <= at && w.until < nanos(list.Covers().Until) && w.until-lead > at {
		t = min(t, w.until-lead)
	}
	if t > at+int64(Ahead) {
		return time.Time{}, false
	}
	return time.Unix(0, t), true
}

// opensAt reports whether the region is open at an instant by its own windows.
func (r *region) opensAt(t time.Time) bool {
	at := nanos(t)
	if w := holding(r.closed, at); w != nil && w.from <= at || r.Throughout == closures.ThroughoutClosed {
		return false
	}
	if len(r.open) > 0 {
		w := holding(r.open, at)
		return w != nil && w.from <= at
	}
	return true
}

// inside reports, with sign 1, whether the region surely holds light of the
// beam: separation less asterism and errors within the radius, by more than
// this package is unsure. With sign -1 it reports whether the region may hold
// all of it: separation and asterism and errors within the radius, or not
// surely beyond.
func (l *look) inside(r *closures.Region, t time.Time, sign float64) bool {
	switch r.Shape {
	case closures.WholeSky:
		return true
	case closures.ICRSCone:
		p, unsure, ok := l.aim.stars(t)
		return within(apart(p, equatorial(r.Direction)), r.Radius.Radians(), l.aim.pad, unsure, ok, sign)
	case closures.TrackCone:
		p, unsure, ok := l.aim.stars(t)
		q, there := walk(r.Points, t)
		if !there {
			return sign < 0 && nearEnd(r.Points, t)
		}
		return within(apart(p, q), r.Radius.Radians(), l.aim.pad, unsure, ok, sign)
	case closures.HorizonBox:
		return l.boxed(r, t, sign)
	}
	return sign < 0
}

func within(separation, radius, pad, unsure float64, ok bool, sign float64) bool {
	if !ok {
		return sign < 0 // nothing is sure
	}
	return separation-sign*pad <= radius-sign*unsure
}

// nearEnd reports whether an instant lies at a track's end, where this
// package's instants and the decision's may differ.
func nearEnd(points []closures.AimPoint, t time.Time) bool {
	if len(points) == 0 {
		return false
	}
	a, b := t.Sub(points[0].At), t.Sub(points[len(points)-1].At)
	return max(a, -a) <= instants || max(b, -b) <= instants
}

// boxed is inside for azimuths and elevations, as differences of coordinates,
// that of azimuth widened or shrunk by the cosine of the elevation. The
// asterism and the errors are left to the decision.
func (l *look) boxed(r *closures.Region, t time.Time, sign float64) bool {
	p, ok := l.aim.local(t)
	if !ok {
		return sign < 0
	}
	// The air may lift what is seen by nothing or by lift: the one that speaks
	// less counts.
	low, high := p.lat, p.lat
	if r.Observed && sign > 0 {
		high += lifted(p.lat)
	} else if r.Observed {
		low += lifted(p.lat)
	}
	b, unsure := &r.Box, sign*Unsure
	if low < b.ElFrom.Radians()+unsure || high > b.ElTo.Radians()-unsure && b.ElTo.Radians() < math.Pi/2 {
		return false
	}
	width := b.AzTo.Radians() - b.AzFrom.Radians()
	if width < 0 {
		width += 2 * math.Pi
	}
	if width >= 2*math.Pi-1e-9 {
		return true
	}
	side := unsure / max(math.Cos(p.lat), 1e-9)
	past := math.Mod(math.Mod(p.lon-b.AzFrom.Radians(), 2*math.Pi)+2*math.Pi, 2*math.Pi)
	return past >= side && past <= width-side || past-2*math.Pi >= side
}
