package geometry

import (
	"math"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Cone is every direction within Radius of Axis, its rim included.
type Cone struct {
	Axis   r3.Vector
	Radius s1.Angle
}

// Valid reports whether c has an axis and a radius in [0, π].
func (c Cone) Valid() bool {
	return FiniteVector(c.Axis) && c.Axis.Norm2() > 0 && c.Radius >= 0 && c.Radius <= math.Pi
}

// Margin returns how far dir is from the cone, in radians: its separation
// from the axis less the radius. It is zero at the rim, negative inside by the
// distance to the rim, and changes by no more than dir turns. NaN, in the cone
// or in dir, gives NaN.
func (c Cone) Margin(dir r3.Vector) float64 {
	return float64(Separation(c.Axis, dir) - c.Radius)
}
