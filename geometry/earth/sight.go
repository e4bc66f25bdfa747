package earth

import (
	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Sight is where a point is seen from a frame's origin: azimuth from north
// through east in [0, 2π), elevation above the plane at right angles to the
// ellipsoid's vertical, and the straight distance. There is no refraction.
type Sight struct {
	Az, El s1.Angle
	Range  geometry.Length
}

// ENU returns the local vector of s, in metres.
func (s Sight) ENU() r3.Vector { return geometry.FromHorizon(s.Az, s.El).Mul(float64(s.Range)) }

// Sight returns where p is seen from the origin of f.
func (f Frame) Sight(p Position) Sight {
	enu := f.ENU(p.ECEF())
	az, el := geometry.ToHorizon(enu)
	return Sight{az, el, geometry.Length(enu.Norm())}
}

// Position returns what is seen at s.
func (f Frame) Position(s Sight) Position { return FromECEF(f.ECEF(s.ENU())) }

// Origin returns the Earth-fixed vector of the origin of f, in metres.
func (f Frame) Origin() r3.Vector { return f.origin }

// TurnBack returns the Earth-fixed components of a local direction.
func (f Frame) TurnBack(enu r3.Vector) r3.Vector {
	return f.east.Mul(enu.X).Add(f.north.Mul(enu.Y)).Add(f.up.Mul(enu.Z))
}
