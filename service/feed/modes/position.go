package modes

import (
	"math"

	"beamward/closures"
	"beamward/geometry"
)

const (
	pairAir     = 10 * second // within which two formats make a pair
	pairSurface = 25 * second
	trackFor    = 180 * second // how long a place helps to tell the zone
	otherFor    = 30 * second  // for which another place makes an address doubtful
	soleFrames  = 8            // of one format, after which no other is waited for
	soleFor     = 10 * second  // if they came within
	soleSpread  = 3 * second   // over at least so long
	soleRange   = 150e3        // leave only the place near the site, this near
	allowance   = 500          // metres: what a gate allows besides motion and errors
	samePlace   = 200          // metres: by two ways to the same position
	stillWithin = 15           // metres that a position stays the same to the bit
)

// position takes in a position and returns the report that it completes.
func (d *Decoder) position(a *aircraft, m message, c CPR, at int64) (seen closures.AircraftSeen, ok bool) {
	now := sent{at: at, first: at, me: m, cpr: c}
	if d.repeated(a, &now) {
		d.counts.Repeated++
		return seen, false
	}
	radius, known := d.radius(a, m, at)
	e := float64(horizontal(radius, &a.status, known, d.options.PositionError)) + d.lag(a)*d.fastest
	where, found := d.place(a, &now, e)
	a.keep(now)
	if !found {
		d.counts.Pending++
		return seen, false
	}
	seen.Located = true
	seen.Error = geometry.Length(e)
	seen.Position.Lat, seen.Position.Lon = degrees(where.lat), degrees(where.lon)
	if !d.trusted(a, at) {
		seen.Error = max(seen.Error, d.options.PositionError)
	}
	return d.describe(a, m, seen, at), true
}

// repeated reports whether a position was sent before, to the bit, by an
// aircraft that has left it since: an old frame. Where it stands or hovers it
// counts, for as long as it stays within a step of the scale.
func (d *Decoder) repeated(a *aircraft, now *sent) bool {
	for i := range a.sent {
		o := &a.sent[i]
		if o.me != now.me {
			continue
		}
		still := false
		if now.cpr.Surface {
			v := now.me.movement()
			still = v.Stopped || (v.SpeedKt+v.StepKt)*knot*seconds(now.at-o.first) <= stillWithin
		} else if a.moved != 0 && seconds(now.at-a.moved) <= velocityFor {
			v := knot * hypot(a.velocity.EastKt, a.velocity.NorthKt)
			still = v*seconds(now.at-o.first) <= stillWithin
		}
		if !still {
			return true
		}
		now.first = min(now.first, o.first)
	}
	return false
}

// place finds where a position is. It must be told apart from its likes in
// other zones.
func (d *Decoder) place(a *aircraft, now *sent, e float64) (found place, ok bool) {
	near, nearOK := d.bySite(&now.cpr)
	best, alive := -1, false
	for i := range a.tracks {
		t := &a.tracks[i]
		if t.at == 0 || now.at-t.at > trackFor {
			continue
		}
		alive = alive || t.stands()
		lat, lon, fits := now.cpr.Near(t.place.lat, t.place.lon)
		if !fits {
			continue
		}
		p := placeAt(lat, lon)
		if p.from(&t.place) <= d.gate(a, now.at-t.at, e) && !(best >= 0 && p.from(&d.site) >= found.from(&d.site)) {
			found, best = p, i
		}
	}
	if best >= 0 {
		t := &a.tracks[best]
		isNear := nearOK && found.from(&near) <= samePlace
		if isNear || !d.certainlyNear(a, now, e) {
			d.doubt(a, best, now.at)
			t.agree(now, found, isNear)
			return found, t.stands() && d.within(&found)
		}
	}
	// What does not agree shows that frames may be mixed: what rests on their
	// agreement alone must be found anew.
	for i := range a.tracks {
		a.tracks[i].even, a.tracks[i].odd = 0, 0
	}
	if alive {
		d.counts.Jumps++
		a.suspect = max(a.suspect, now.at+suspicion)
	}
	found, sure, ok := d.pair(a, now, e)
	if !ok {
		found, ok = d.sole(a, now)
		sure = ok
	}
	if !ok {
		return place{}, false
	}
	if sure && alive {
		d.counts.Doubled++
	}
	a.begin(now.at, found, sure)
	return found, sure
}

// certainlyNear reports whether a pair of frames, of which none is needed
// elsewhere, puts the aircraft near the site.
func (d *Decoder) certainlyNear(a *aircraft, now *sent, e float64) bool {
	_, sure, ok := d.pair(a, now, e)
	return ok && sure
}

// doubt extends the suspicion while another place is alive beside the track.
func (d *Decoder) doubt(a *aircraft, track int, at int64) {
	for i := range a.tracks {
		if t := &a.tracks[i]; i != track && t.stands() && at-t.at <= otherFor {
			a.suspect = max(a.suspect, at+suspicion)
		}
	}
}

// gate is how far from where it was an aircraft can be said to be.
func (d *Decoder) gate(a *aircraft, dt int64, e float64) float64 {
	v := d.fastest
	if known := knot * hypot(a.velocity.EastKt, a.velocity.NorthKt); known > v {
		v = known + float64(d.options.VelocityError)
	}
	return v*(seconds(dt)+1) + 2*e + allowance
}

// within reports whether a place can be received at all.
func (d *Decoder) within(p *place) bool {
	if p.from(&d.site) <= d.reach {
		return true
	}
	d.counts.Impossible++
	return false
}

// pair looks for a position of the other format that agrees with this one. It
// is sure where the site itself answers the same: then no other frame could
// have been mixed in.
func (d *Decoder) pair(a *aircraft, now *sent, e float64) (found place, sure, ok bool) {
	limit := pairAir
	if now.cpr.Surface {
		limit = pairSurface
	}
	near, nearOK := d.bySite(&now.cpr)
	for i := range a.sent {
		o := &a.sent[i]
		apart := now.at - o.at
		if o.me == 0 || o.cpr.Odd == now.cpr.Odd || o.cpr.Surface != now.cpr.Surface || apart > limit || apart < -limit {
			continue
		}
		p := Pair{Even: now.cpr, Odd: o.cpr}
		if now.cpr.Odd {
			p = Pair{Even: o.cpr, Odd: now.cpr, OddNewest: true}
		}
		lat, lon, fits := p.Position(d.site.lat, d.site.lon)
		if !fits {
			d.counts.Impossible++
			continue
		}
		at := placeAt(lat, lon)
		p.OddNewest = !p.OddNewest
		lat, lon, fits = p.Position(d.site.lat, d.site.lon)
		was := placeAt(lat, lon)
		if !fits || !(at.from(&was) <= d.gate(a, apart, e)) || !(at.from(&d.site) <= d.reach) {
			d.counts.Impossible++
			continue
		}
		if nearOK && at.from(&near) <= samePlace {
			return near, true, true
		}
		found, ok = at, true
	}
	return found, false, ok
}

// bySite is the answer of one frame alone, right within half a zone of the
// site.
func (d *Decoder) bySite(c *CPR) (place, bool) {
	lat, lon, ok := c.Near(d.site.lat, d.site.lon)
	if !ok {
		return place{}, false
	}
	return placeAt(lat, lon), true
}

// sole answers where an aircraft is heard well and in one format alone, so
// that no pair will come: near the site, by the site.
func (d *Decoder) sole(a *aircraft, now *sent) (place, bool) {
	p, ok := d.bySite(&now.cpr)
	if !ok || p.from(&d.site) > soleRange {
		return place{}, false
	}
	oldest := now.at
	for i := range uint8(soleFrames) {
		o := &a.sent[(a.next+keptFrames-1-i)%keptFrames]
		if o.me == 0 || o.cpr.Odd != now.cpr.Odd || o.cpr.Surface != now.cpr.Surface || now.at-o.at > soleFor {
			return place{}, false
		}
		q, ok := d.bySite(&o.cpr)
		if !ok || q.from(&p) > d.fastest*(seconds(now.at-o.at)+1)+allowance {
			return place{}, false
		}
		oldest = min(oldest, o.at)
	}
	return p, now.at-oldest >= soleSpread
}

// begin starts a track, in the place of the one that was heard longest ago.
func (a *aircraft) begin(at int64, p place, near bool) {
	i := 0
	for j := range a.tracks {
		if a.tracks[j].at < a.tracks[i].at {
			i = j
		}
	}
	a.tracks[i] = track{at: at, place: p, near: near, even: 1, odd: 1}
}

func hypot(x, y float64) float64 { return math.Sqrt(x*x + y*y) }
