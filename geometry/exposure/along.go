package exposure

import (
	"math"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/s1"
)

// Along is a beam of a power along its way.
type Along struct {
	Power   Power
	Profile geometry.Profile
}

// Irradiance returns the irradiance on the axis at a distance along the beam:
// 2P/(πw²).
func (a Along) Irradiance(at geometry.Length) Irradiance {
	return Irradiance(geometry.PeakIrradiance(float64(a.Power), a.Profile.Radius(at)))
}

// Stretch is where along a beam the irradiance is at or above a limit.
type Stretch struct {
	// Passings is how often the limit is passed: 0 where the beam is below it
	// everywhere, 1 where it leaves the aperture above it and falls below, 2
	// where it rises above it on the way to its focus.
	Passings int
	// From and Until are the distances between which it is at or above; From is
	// 0 at the aperture. Both are 0 where it never is.
	From, Until geometry.Length
}

// Above returns where the beam is at or above a limit. Of a beam or a limit that
// is not valid both distances are NaN.
func (a Along) Above(limit Irradiance) Stretch {
	radius := geometry.Length(math.Sqrt(2 * float64(a.Power) / (math.Pi * float64(limit))))
	if !a.Profile.Valid() || !(a.Power >= 0) || !(limit > 0) || !geometry.Finite(float64(radius)) {
		n := geometry.Length(math.NaN())
		return Stretch{From: n, Until: n}
	}
	near, far, ok := a.Profile.Narrower(radius)
	switch {
	case !ok:
		return Stretch{}
	case near > 0:
		return Stretch{2, near, far}
	}
	return Stretch{1, 0, far}
}

// Point is a point of a beam's axis.
type Point struct {
	Slant, Height geometry.Length // along the beam; above the ellipsoid
	Irradiance    Irradiance
}

// Curve returns n points, 2 or more, of a beam that leaves at a height and an
// elevation, at even steps of distance from the aperture on.
func (a Along) Curve(site geometry.Length, elevation s1.Angle, until geometry.Length, n int) []Point {
	points := make([]Point, 0, max(n, 0))
	for i := range n {
		s := until * geometry.Length(i) / geometry.Length(max(n-1, 1))
		points = append(points, Point{s, heightAt(site, elevation, s), a.Irradiance(s)})
	}
	return points
}

// heightAt returns the height of a point of a beam over a sphere of
// earth.MeanRadius, the inverse of earth.ShellRange: within 0.4 % of the
// ellipsoid's curvature at any azimuth. Near the ground it is s sin(el), the
// vertical distance of FAA AC 70-1B, equation 70-1.7, and above that beyond.
func heightAt(site geometry.Length, elevation s1.Angle, s geometry.Length) geometry.Length {
	base := float64(earth.MeanRadius + site)
	up := float64(s) * (2*base*math.Sin(elevation.Radians()) + float64(s))
	return site + geometry.Length(up/(base+math.Sqrt(base*base+up)))
}
