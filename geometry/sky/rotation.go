package sky

import (
	"math"

	"github.com/golang/geo/r3"
)

// rotation is a matrix by rows. It also holds the change of one a second.
type rotation struct{ x, y, z r3.Vector }

func (r *rotation) turn(v r3.Vector) r3.Vector {
	return r3.Vector{X: r.x.Dot(v), Y: r.y.Dot(v), Z: r.z.Dot(v)}
}

// back applies the transpose.
func (r *rotation) back(v r3.Vector) r3.Vector {
	return r3.Vector{
		X: r.x.X*v.X + r.y.X*v.Y + r.z.X*v.Z,
		Y: r.x.Y*v.X + r.y.Y*v.Y + r.z.Y*v.Z,
		Z: r.x.Z*v.X + r.y.Z*v.Y + r.z.Z*v.Z,
	}
}

// after returns the rotation that applies b first, then r.
func (r rotation) after(b rotation) rotation {
	return rotation{b.back(r.x), b.back(r.y), b.back(r.z)}
}

// spun returns the rotation followed by the small turn w, which moves a vector
// p by w × p; exact to the square of w.
func (r *rotation) spun(w r3.Vector) rotation {
	return rotation{
		x: r.x.Add(r.z.Mul(w.Y)).Sub(r.y.Mul(w.Z)),
		y: r.y.Add(r.x.Mul(w.Z)).Sub(r.z.Mul(w.X)),
		z: r.z.Add(r.y.Mul(w.X)).Sub(r.x.Mul(w.Y)),
	}
}

// spinBetween returns the small turn from a to b, seen in the frame of mid:
// the skew part of (b-a) after the inverse of mid.
func spinBetween(a, mid, b rotation) r3.Vector {
	dx, dy, dz := b.x.Sub(a.x), b.y.Sub(a.y), b.z.Sub(a.z)
	return r3.Vector{
		X: dz.Dot(mid.y) - dy.Dot(mid.z),
		Y: dx.Dot(mid.z) - dz.Dot(mid.x),
		Z: dy.Dot(mid.x) - dx.Dot(mid.y),
	}.Mul(0.5)
}

// aboutX turns the frame by a about X: the components of a fixed vector in
// the turned frame.
func aboutX(a float64) rotation {
	s, c := math.Sincos(a)
	return rotation{r3.Vector{X: 1}, r3.Vector{Y: c, Z: s}, r3.Vector{Y: -s, Z: c}}
}

// aboutZ turns the frame by a about Z.
func aboutZ(a float64) rotation {
	s, c := math.Sincos(a)
	return rotation{r3.Vector{X: c, Y: s}, r3.Vector{X: -s, Y: c}, r3.Vector{Z: 1}}
}
