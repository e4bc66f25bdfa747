package earth

import (
	"math"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// The WGS 84 ellipsoid (NGA.STND.0036).
const (
	// EquatorialRadius is the semi-major axis.
	EquatorialRadius geometry.Length = 6378137
	// Flattening is f = (a-b)/a.
	Flattening = 1 / 298.257223563

	eccentricity2 = Flattening * (2 - Flattening)
)

// Position is a geodetic position: latitude north, longitude east, height
// above the ellipsoid.
type Position struct {
	Lat, Lon s1.Angle
	Height   geometry.Length
}

// Valid reports whether p is finite, with its latitude in [-90°, 90°], its
// longitude in [-360°, 360°] and its height between the Earth's deepest mine
// and the far side of any orbit that matters here (-10 km to 1000 km).
func (p Position) Valid() bool {
	return geometry.Finite(p.Lat.Radians(), p.Lon.Radians(), float64(p.Height)) &&
		math.Abs(p.Lat.Radians()) <= math.Pi/2 && math.Abs(p.Lon.Radians()) <= 2*math.Pi &&
		p.Height >= -10e3 && p.Height <= 1000e3
}

// ECEF returns the Earth-fixed vector of p in metres: X toward latitude 0,
// longitude 0, Z toward the north pole.
func (p Position) ECEF() r3.Vector {
	sphi, cphi := math.Sincos(p.Lat.Radians())
	slam, clam := math.Sincos(p.Lon.Radians())
	n := float64(EquatorialRadius) / math.Sqrt(1-eccentricity2*sphi*sphi)
	h := float64(p.Height)
	return r3.Vector{X: (n + h) * cphi * clam, Y: (n + h) * cphi * slam, Z: (n*(1-eccentricity2) + h) * sphi}
}

// Frame is the local frame at an origin: X east, Y north, Z up, in metres.
type Frame struct {
	origin          r3.Vector
	east, north, up r3.Vector
}

// FrameAt returns the local frame whose origin is p.
func FrameAt(p Position) Frame {
	sphi, cphi := math.Sincos(p.Lat.Radians())
	slam, clam := math.Sincos(p.Lon.Radians())
	return Frame{
		origin: p.ECEF(),
		east:   r3.Vector{X: -slam, Y: clam},
		north:  r3.Vector{X: -sphi * clam, Y: -sphi * slam, Z: cphi},
		up:     r3.Vector{X: cphi * clam, Y: cphi * slam, Z: sphi},
	}
}

// ENU returns the local vector of an Earth-fixed point.
func (f Frame) ENU(ecef r3.Vector) r3.Vector { return f.Turn(ecef.Sub(f.origin)) }

// Turn returns the local components of an Earth-fixed direction.
func (f Frame) Turn(v r3.Vector) r3.Vector {
	return r3.Vector{X: f.east.Dot(v), Y: f.north.Dot(v), Z: f.up.Dot(v)}
}

// ECEF returns the Earth-fixed vector of a local point.
func (f Frame) ECEF(enu r3.Vector) r3.Vector {
	return f.origin.Add(f.east.Mul(enu.X)).Add(f.north.Mul(enu.Y)).Add(f.up.Mul(enu.Z))
}
