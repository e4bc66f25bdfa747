package listfile

import (
	"cmp"
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry"
)

// regionText is a region before it is checked.
type regionText struct {
	at         place
	id         cell
	shape      closures.Shape
	bad        bool // its reader refused something of it already
	throughout cell

	ra, dec, radius            cell
	azFrom, azTo, elFrom, elTo cell
	observed                   cell
	points                     []closures.AimPoint
}

// setShape notes the shape; a second one is a fault.
func (d *draft) setShape(r *regionText, s closures.Shape, at place) {
	if r.shape != closures.NoShape {
		d.add(at, "the region has two shapes", "define one region for each shape")
		r.bad = true
		return
	}
	r.shape = s
}

// region checks a region and keeps it. The id of a refused region stays known,
// so that its windows are not reported as well.
func (d *draft) region(t *regionText) {
	if d.full {
		return
	}
	if len(d.text.Regions) >= d.limits.Regions {
		d.stop(t.at, "the list has too many regions", d.smaller)
		return
	}
	before := d.total
	r := closures.Region{Shape: t.shape, Line: t.at.line}
	id, named := d.name(t.id, t.at, "id")
	switch t.shape {
	case closures.NoShape:
		if !t.bad {
			d.add(t.at, "the region has no shape", "give icrs, horizon, track or whole_sky")
		}
	case closures.ICRSCone:
		ra, ok1 := d.rightAscension(t.ra, t.at, "ra_deg")
		dec, ok2 := d.angle(t.dec, t.at, "dec_deg", -90, 90)
		radius, ok3 := d.radius(t.radius, t.at, "radius_deg")
		if ok1 && ok2 && ok3 {
			r.Direction, r.Radius = equator(ra, dec), radius.angle()
		}
	case closures.HorizonBox:
		r.Box, r.Observed = d.box(t)
	case closures.TrackCone:
		radius, ok := d.radius(t.radius, t.at, "radius_deg")
		if ok {
			r.Radius = radius.angle()
		}
		r.Points = t.points
	}
	if t.throughout.set() {
		if open, ok := d.state(t.throughout, t.at, "throughout"); ok {
			r.Throughout = closures.ThroughoutClosed
			if open {
				r.Throughout = closures.ThroughoutOpen
			}
		}
	}
	if !named {
		return
	}
	n := &d.byName[d.intern(id)]
	if n.region != noRegion {
		d.addf(t.at, "define each region once", "the region %s is defined twice", quoted(id))
		return
	}
	if t.bad || d.total > before {
		n.region = badRegion
		return
	}
	r.ID = string(id)
	n.region = int32(len(d.text.Regions))
	d.text.Regions = append(d.text.Regions, r)
}

// box reads a box of azimuth and elevation.
func (d *draft) box(t *regionText) (b geometry.Box, observed bool) {
	azFrom, ok1 := d.angle(t.azFrom, t.at, "az_from_deg", 0, 360)
	azTo, ok2 := d.angle(t.azTo, t.at, "az_to_deg", 0, 360)
	elFrom, ok3 := d.angle(t.elFrom, t.at, "el_from_deg", -90, 90)
	elTo, ok4 := d.angle(t.elTo, t.at, "el_to_deg", -90, 90)
	observed, ok5 := d.truth(t.observed, "observed")
	if ok1 && ok2 && azFrom%fullTurn == azTo%fullTurn && azTo-azFrom != fullTurn {
		d.add(t.azTo.at, "az_from_deg and az_to_deg are the same direction", "for every azimuth write 0 and 360")
		ok2 = false
	}
	if ok3 && ok4 && elFrom >= elTo {
		d.add(t.elTo.at, "el_from_deg is not below el_to_deg", "correct the elevations")
		ok4 = false
	}
	if !(ok1 && ok2 && ok3 && ok4 && ok5) {
		return geometry.Box{}, false
	}
	return geometry.Box{AzFrom: azFrom.angle(), AzTo: azTo.angle(), ElFrom: elFrom.angle(), ElTo: elTo.angle()}, observed
}

// pointText is one point of a track before it is checked.
type pointText struct {
	at      place
	when    cell
	ra, dec cell
}

// point checks the next point of a track and adds it to points; ok is false
// when it was refused.
func (d *draft) point(points []closures.AimPoint, p *pointText) (_ []closures.AimPoint, ok bool) {
	if d.full {
		return points, false
	}
	if d.points++; d.points > d.limits.Points {
		d.stop(p.at, "the list's tracks have too many points", d.smaller)
		return points, false
	}
	when, ok1 := d.time(p.when, p.at, "at")
	ra, ok2 := d.rightAscension(p.ra, p.at, "ra_deg")
	dec, ok3 := d.angle(p.dec, p.at, "dec_deg", -90, 90)
	if !(ok1 && ok2 && ok3) {
		return points, false
	}
	if !when.exact() {
		d.add(p.when.at, "the point stands inside a leap second, or between milliseconds", "give the point another time")
		return points, false
	}
	next := closures.AimPoint{At: time.Unix(0, when.early).UTC(), Direction: equator(ra, dec)}
	if n := len(points); n > 0 {
		last := points[n-1]
		if !next.At.After(last.At) {
			d.add(p.at, "the track's points are not in order of time", "order the points, each time once")
			return points, false
		}
		if !(next.Direction.Dot(last.Direction) > 0) {
			d.add(p.at, "the track's points are 90 degrees or more apart", "give points between them")
			return points, false
		}
	}
	return append(points, next), true
}

// reorder puts the regions in order of their lines, for a reader that finished
// some of them late.
func (d *draft) reorder() {
	r := d.text.Regions
	slices.SortStableFunc(r, func(a, b closures.Region) int { return cmp.Compare(a.Line, b.Line) })
	for i := range r {
		d.byName[d.names[r[i].ID]].region = int32(i)
	}
}
