package crossing

import (
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

// Turn carries a direction from a neighbour's local frame over to the beam
// site's. For a neighbour known by an offset, its frame is
// earth.FrameAt(site.Offset(offset)): its vertical is not the site's, by 3
// arcsec for every 100 m.
func Turn(direction r3.Vector, theirs, ours earth.Frame) r3.Vector {
	return ours.Turn(theirs.TurnBack(direction))
}
