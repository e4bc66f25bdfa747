package encounter

import (
	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

// Place returns the position and the velocity, in the frame of the site, of an
// aircraft at p that moves with the speeds east, north and up about its own
// vertical. Both are exact: the frames' difference in direction, about 1° in
// 100 km, is turned, not neglected.
func Place(site earth.Frame, p earth.Position, east, north, up geometry.Speed) (position, velocity r3.Vector) {
	own := earth.FrameAt(p)
	x := own.ECEF(r3.Vector{})
	v := own.ECEF(r3.Vector{X: float64(east), Y: float64(north), Z: float64(up)}).Sub(x)
	return site.ENU(x), site.Turn(v)
}
