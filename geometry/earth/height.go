package earth

import (
	"math"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// MeanRadius is the radius of the sphere that ShellRange takes the Earth for.
const MeanRadius geometry.Length = 6371000

// ShellRange returns the distance from a site of height h to a shell of height
// H, no lower, along a beam at elevation el, over a sphere of MeanRadius:
// √((R+H)² - (R+h)² cos² el) - (R+h) sin el. It is NaN for a shell below the
// site. From 2.45 km to 92 km it is within 0.3 % of the ellipsoid's at any
// elevation and within 0.011 % from 30° up; RangeToHeight is exact.
func ShellRange(h, shell geometry.Length, el s1.Angle) geometry.Length {
	if !(shell >= h) {
		return geometry.Length(math.NaN())
	}
	sin, cos := math.Sincos(el.Radians())
	near, far := float64(MeanRadius+h), float64(MeanRadius+shell)
	return geometry.Length(max(0, math.Sqrt((far-near*cos)*(far+near*cos))-near*sin))
}

// HeightAlong returns the height above the ellipsoid of a straight beam's point
// at a distance from the origin of f along the local unit vector dir. The
// Earth's curvature is in it; refraction is not.
func (f Frame) HeightAlong(dir r3.Vector, at geometry.Length) geometry.Length {
	height, _ := f.climb(dir, float64(at))
	return geometry.Length(height)
}

// climb returns the height at s metres along dir, in metres, and its slope.
func (f Frame) climb(dir r3.Vector, s float64) (height, slope float64) {
	p := FromECEF(f.ECEF(dir.Mul(s)))
	sphi, cphi := math.Sincos(p.Lat.Radians())
	slam, clam := math.Sincos(p.Lon.Radians())
	up := r3.Vector{X: cphi * clam, Y: cphi * slam, Z: sphi}
	return float64(p.Height), up.Dot(f.TurnBack(dir))
}

// heightTolerance is how near, in metres, RangeToHeight comes to its height.
const heightTolerance = 1e-6

// RangeToHeight returns the first distance from the origin of f along the local
// unit vector dir at which a straight beam is at a height above the ellipsoid:
// on its way up to a greater height than the origin's, on its way down to a
// lesser one. The ground does not stop it. ok is false, and the distance NaN, where it never is, where dir
// is no unit vector, or where a height is not finite.
//
// The height is a convex function of the distance, so Newton's method closes in
// on a crossing from one side: from the origin on the way down, from beyond the
// crossing on the way up.
func (f Frame) RangeToHeight(dir r3.Vector, height geometry.Length) (at geometry.Length, ok bool) {
	none := geometry.Length(math.NaN())
	if !geometry.Finite(float64(height)) || !(math.Abs(dir.Norm2()-1) < 1e-9) {
		return none, false
	}
	h, slope := f.climb(dir, 0)
	s, down := 0.0, h >= float64(height)
	if !down {
		// Beyond every crossing: a sphere about the Earth's centre that holds all
		// points of the height.
		bound := float64(EquatorialRadius + height)
		along := f.origin.Dot(f.TurnBack(dir))
		s = math.Sqrt(along*along+bound*bound-f.origin.Norm2()) - along
		h, slope = f.climb(dir, s)
	}
	for range 50 {
		above := h - float64(height)
		if math.Abs(above) <= heightTolerance {
			return geometry.Length(s), true
		}
		if down != (slope < 0) {
			return none, false
		}
		s -= above / slope
		h, slope = f.climb(dir, s)
	}
	return none, false
}
