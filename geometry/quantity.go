package geometry

import (
	"math"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Length is a distance in metres.
type Length float64

// Speed is a rate of movement in metres a second.
type Speed float64

// Acceleration is a rate of change of speed in metres a second squared.
type Acceleration float64

// Arcsecond is one second of arc in radians.
const Arcsecond = s1.Angle(math.Pi / (180 * 3600))

// Finite reports whether every value is a finite number. Callers treat false
// as unknown, which shutters.
func Finite(values ...float64) bool {
	for _, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

// FiniteVector reports whether every component of v is a finite number.
func FiniteVector(v r3.Vector) bool { return Finite(v.X, v.Y, v.Z) }
