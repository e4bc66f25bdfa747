package recheck

import (
	"time"

	"beamward/closures"
)

// held checks people's holds. BW-012.
func (l *look) held() string {
	for i := range l.f.Holds {
		h := &l.f.Holds[i]
		if h.Beam != closures.EveryBeam && h.Beam != l.d.Beam {
			continue
		}
		from := h.From
		if from.IsZero() {
			from = h.Placed
		}
		holds := func(t time.Time) bool {
			return !t.Before(from) && (h.Until.IsZero() || t.Before(h.Until)) && (h.Region == nil || l.inside(h.Region, t, 1)) && !l.ends(t)
		}
		for _, t := range l.samples() {
			if holds(t) {
				return "second opinion: a person holds the beam"
			}
		}
		if from.After(l.at) && !from.After(l.at.Add(Ahead)) && holds(from) {
			return "second opinion: a hold begins before the end"
		}
	}
	return ""
}

// covered checks that every required authority has said something about the
// time, lead and tail counted. BW-017.
func (l *look) covered() string {
	for i := range l.rules.Authorities {
		a := &l.rules.Authorities[i]
		if !a.Required {
			continue
		}
		from, until := l.at, l.at
		for grew := true; grew; {
			grew = false
			for j := range l.f.Lists {
				o := &l.f.Lists[j]
				if o.List == nil || o.Waiting || o.Authority() != a.ID || !speaks(o.List, l.d.Beam) {
					continue
				}
				c := o.Covers()
				if !c.From.After(until) && c.Until.After(until) {
					until, grew = c.Until, true
				}
				if c.From.Before(from) && !c.Until.Before(from) {
					from, grew = c.From, true
				}
			}
		}
		// What begins or ends with nobody's word on the other side counts lead
		// and tail.
		if !until.After(l.at) || l.at.Before(from.Add(a.Tail)) {
			return "second opinion: no list in force covers the time"
		}
		if end := until.Add(-a.Lead); !end.After(l.at.Add(Ahead)) && !l.ends(end) {
			return "second opinion: the coverage ends before the permit"
		}
	}
	return ""
}

// sky checks the elevation limits and the Sun.
func (l *look) sky() string {
	limits := &l.beam.Limits
	for _, t := range l.samples() {
		if p, ok := l.aim.local(t); ok {
			low := p.lat+lifted(p.lat) < limits.ElevationMin.Radians()-Unsure
			high := p.lat > limits.ElevationMax.Radians()+Unsure
			if (low || high) && !l.ends(t) {
				return "second opinion: the aim is outside the elevation limits"
			}
		}
		if limits.SunBelow.Degrees() >= 90 {
			continue
		}
		const sunUnsure = 0.05 * degree
		if s := l.aim.site.ofDate(sun(t), t); s.lat > limits.SunBelow.Radians()+sunUnsure && !l.ends(t) {
			return "second opinion: the Sun is above the limit"
		}
	}
	return ""
}
