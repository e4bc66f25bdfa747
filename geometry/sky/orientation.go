package sky

import (
	"math"
	"time"

	"github.com/golang/geo/r3"
)

// Orientation is the night's sky at one instant, for turning many directions.
// Its zero value answers NaN.
type Orientation struct {
	stars rotation  // ICRS to horizon
	shift r3.Vector // the observer's velocity in units of light's, horizon
	sun   r3.Vector // geocentric, horizon
	date  dateFrame
	place r3.Vector
}

// dateFrame turns true equator and equinox of date to the horizon.
type dateFrame struct{ sinTurn, cosTurn, sinLat, cosLat float64 }

func (d *dateFrame) turn(v r3.Vector) r3.Vector {
	meridian := d.cosTurn*v.X + d.sinTurn*v.Y // toward where the meridian meets the equator
	return r3.Vector{
		X: d.cosTurn*v.Y - d.sinTurn*v.X,
		Y: d.cosLat*v.Z - d.sinLat*meridian,
		Z: d.sinLat*v.Z + d.cosLat*meridian,
	}
}

func (d *dateFrame) back(v r3.Vector) r3.Vector {
	meridian := d.cosLat*v.Z - d.sinLat*v.Y
	return r3.Vector{
		X: d.cosTurn*meridian - d.sinTurn*v.X,
		Y: d.sinTurn*meridian + d.cosTurn*v.X,
		Z: d.cosLat*v.Y + d.sinLat*v.Z,
	}
}

func (d *dateFrame) turnRows(r *rotation) rotation {
	// The same turn on each column at once.
	meridian := r.x.Mul(d.cosTurn).Add(r.y.Mul(d.sinTurn))
	return rotation{
		x: r.y.Mul(d.cosTurn).Sub(r.x.Mul(d.sinTurn)),
		y: r.z.Mul(d.cosLat).Sub(meridian.Mul(d.sinLat)),
		z: r.z.Mul(d.sinLat).Add(meridian.Mul(d.cosLat)),
	}
}

// At returns the orientation at an instant. Outside Covers every answer of it
// is NaN.
func (n *Night) At(at time.Time) Orientation {
	t, ok := n.since(at)
	if !ok {
		return Orientation{}
	}
	o := Orientation{date: n.frame(t), place: n.place}
	stars := n.toDate.spun(n.spin.Mul(t))
	o.stars = o.date.turnRows(&stars)
	o.shift = o.date.turn(n.velocity.Add(n.velocityRate.Mul(t)))
	o.shift.X += n.diurnal
	o.sun = o.date.turn(n.sunAt(t))
	return o
}

// since returns the seconds from the bin's middle, and whether at is covered.
func (n *Night) since(at time.Time) (float64, bool) {
	if n == nil || n.turnedRate == 0 {
		return 0, false
	}
	d := at.Sub(n.mid)
	return d.Seconds(), d >= -reach && d < reach
}

func (n *Night) frame(t float64) dateFrame {
	s, c := math.Sincos(n.turned + n.turnedRate*t)
	return dateFrame{sinTurn: s, cosTurn: c, sinLat: n.sinLat, cosLat: n.cosLat}
}

// Horizon turns an ICRS unit vector into the airless topocentric direction in
// the horizon frame, a unit vector. What is not of unit length gives NaN.
func (o *Orientation) Horizon(icrs r3.Vector) r3.Vector {
	h := o.stars.turn(icrs)
	return unitLength(h.Add(o.shift).Sub(o.sun.Mul(deflection(o.sun.Dot(h)))))
}

// ICRS is the inverse of Horizon, to 1e-11 rad.
func (o *Orientation) ICRS(enu r3.Vector) r3.Vector {
	if !isUnit(enu) {
		return nowhere()
	}
	h := enu
	for range 3 { // the deflection at the star, from its own direction
		c := o.shift.Sub(o.sun.Mul(deflection(o.sun.Dot(h))))
		along := enu.Dot(c)
		h = enu.Mul(along + math.Sqrt(1-c.Norm2()+along*along)).Sub(c)
	}
	return unitLength(o.stars.back(h))
}

// OfDate turns an apparent topocentric direction of date (true equator and
// equinox) into the horizon frame.
func (o *Orientation) OfDate(dir r3.Vector) r3.Vector { return unitLength(o.date.turn(dir)) }

// ToDate is the inverse of OfDate.
func (o *Orientation) ToDate(enu r3.Vector) r3.Vector { return unitLength(o.date.back(enu)) }

// Sun returns the airless topocentric direction of the Sun's centre, to 0.02
// degree.
func (o *Orientation) Sun() r3.Vector {
	s := o.sun.Sub(o.place)
	return scaled(s, s.Norm2())
}

// Horizon is At(at).Horizon(icrs), quicker for one direction: what turns a
// frame there turns only the direction here.
func (n *Night) Horizon(icrs r3.Vector, at time.Time) r3.Vector {
	t, ok := n.since(at)
	if !ok {
		return nowhere()
	}
	p := n.toDate.turn(icrs)
	p = p.Add(n.spin.Cross(p).Mul(t))
	sun := n.sunAt(t)
	p = p.Add(n.velocity).Add(n.velocityRate.Mul(t)).Sub(sun.Mul(deflection(sun.Dot(p))))
	d := n.frame(t)
	h := d.turn(p)
	h.X += n.diurnal
	return unitLength(h)
}

// OfDate is At(at).OfDate(dir), without the work for the stars.
func (n *Night) OfDate(dir r3.Vector, at time.Time) r3.Vector {
	t, ok := n.since(at)
	if !ok {
		return nowhere()
	}
	d := n.frame(t)
	return unitLength(d.turn(dir))
}

// ToDate is At(at).ToDate(enu), without the work for the stars.
func (n *Night) ToDate(enu r3.Vector, at time.Time) r3.Vector {
	t, ok := n.since(at)
	if !ok {
		return nowhere()
	}
	d := n.frame(t)
	return unitLength(d.back(enu))
}

// ICRS is At(at).ICRS(enu).
func (n *Night) ICRS(enu r3.Vector, at time.Time) r3.Vector {
	o := n.At(at)
	return o.ICRS(enu)
}

// deflection returns how far light is bent away from the Sun, as the length of
// a vector from the Sun to add to a direction: the part along the direction
// only lengthens it, by 0.002 at most. Within the Sun's disc the length is held.
func deflection(cosFromSun float64) float64 {
	away := 1 - cosFromSun
	if !(away > leastDeflector) {
		away = leastDeflector
	}
	return solarDeflection / away
}

// unitLength returns v at unit length, or NaN where it is not nearly of unit
// length already: a direction that was none does not become one.
func unitLength(v r3.Vector) r3.Vector {
	if !isUnit(v) {
		return nowhere()
	}
	return scaled(v, v.Norm2())
}

func isUnit(v r3.Vector) bool {
	n2 := v.Norm2()
	return n2 > 0.98 && n2 < 1.02
}

// scaled divides v by the root of n2, its square; zero gives NaN.
func scaled(v r3.Vector, n2 float64) r3.Vector {
	if !(n2 > 0) {
		return nowhere()
	}
	return v.Mul(1 / math.Sqrt(n2))
}

// nowhere is the direction that is not known.
func nowhere() r3.Vector {
	return r3.Vector{X: math.NaN(), Y: math.NaN(), Z: math.NaN()}
}
