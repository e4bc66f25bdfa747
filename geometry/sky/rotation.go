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

func (r rotation) plus(f float64, b rotation) rotation {
	return rotation{r.x.Add(b.x.Mul(f)), r.y.Add(b.y.Mul(f)), r.z.Add(b.z.Mul(f))}
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

func (r rotation) times(f float64) rotation {
	return rotation{r.x.Mul(f), r.y.Mul(f), r.z.Mul(f)}
}
