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
	stars := n.toDate.plus(t, n.toDateRate)
	o.stars = o.date.turnRows(&stars)
	o.shift = o.stars.turn(n.velocity.Add(n.velocityRate.Mul(t)))
	o.shift.X += n.diurnal
	o.sun = o.date.turn(n.sun.Add(n.sunRate.Mul(t)))
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
	// Light deflection (the part along h does not turn it), then aberration.
	w := solarDeflection / math.Max(1-o.sun.Dot(h), leastDeflector)
	h.X += o.shift.X - w*o.sun.X
	h.Y += o.shift.Y - w*o.sun.Y
	h.Z += o.shift.Z - w*o.sun.Z
	return unitLength(h)
}

// ICRS is the inverse of Horizon, to 1e-11 rad.
func (o *Orientation) ICRS(enu r3.Vector) r3.Vector {
	if !isUnit(enu) {
		return nowhere()
	}
	h := enu
	for range 3 { // the deflection at the star, from its own direction
		w := solarDeflection / math.Max(1-o.sun.Dot(h), leastDeflector)
		c := o.shift.Sub(o.sun.Mul(w))
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

// Horizon is At(at).Horizon(icrs).
func (n *Night) Horizon(icrs r3.Vector, at time.Time) r3.Vector {
	o := n.At(at)
	return o.Horizon(icrs)
}

// ICRS is At(at).ICRS(enu).
func (n *Night) ICRS(enu r3.Vector, at time.Time) r3.Vector {
	o := n.At(at)
	return o.ICRS(enu)
}

// unitLength returns v at unit length, or NaN where it is not nearly of unit length
// already: a direction that was none does not become one.
func unitLength(v r3.Vector) r3.Vector {
	n2 := v.Norm2()
	if !(n2 > 0.98 && n2 < 1.02) {
		return nowhere()
	}
	return scaled(v, n2)
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
