// Package crossing says how far a laser beam is from another telescope's
// field: a signed angle at the telescope, positive when clear, and how fast
// that angle can change.
//
// A beam is not a direction but a line in space with a width, seen from aside.
// What of it shines is parts of it between two heights: the column in which
// the air scatters, and the guide star. Prepare makes a Pair of one launch and
// one telescope; a Pair is an immutable value, and its Margin allocates
// nothing. Each launch of a beam is a pair of its own; Result.And joins their
// answers.
//
// # What is subtracted
//
// With v(s) = w + s b the point of the beam a distance s from its launch, seen
// from the telescope, a the telescope's axis and θ the angle between both, the
// margin is the least over the part of
//
//	θ - asin(R(s)/|v(s)|) - field - halo - the telescope's pointing error
//
// where R(s) = half the aperture + the beam's radius + s times the beam's
// pointing error and spread. One ball of radius R stands for what would be
// two terms, one of the beam and one of the aperture: each light path from a
// point of the beam to a point of the aperture, put with its end on the
// telescope's position, starts inside the ball. This is no less than the sum
// of the two arcsines, which does not bound the paths when both are large.
//
// Where the beam comes within twice its radius of the sphere about the
// telescope's aperture, it is in the way of the telescope whatever this is
// looking at, and the margin is negative.
//
// # Why three points are enough
//
// The set of points from which a ball of radius R reaches within the angle c of
// the axis is {v : distance from v to the cone of half angle c <= R}. The
// distance to a convex cone is a convex function of v, v is linear in s, and R
// is linear in s; so the s at which the angle is at most c are one interval, for
// each c below a right angle. The angle has one valley along the beam. For
// negative c the distance is to the farthest ray of a cone about the axis, the
// largest of convex functions; above a right angle the same holds of the
// complement about -a, with hills for valleys. So the least is at an end of the
// part or at the one stationary point between, and that has a closed form: the
// balls along the beam touch two planes through the telescope, and the place at
// which the nearer plane is nearest to the axis belongs to one ball.
// No division into segments is needed, and the answer is exact but for rounding,
// which stays below 1e-9 rad where the inputs do not lose digits of their own.
//
// # Directions
//
// All positions and directions are in one frame, X east, Y north, Z up at the
// beam's site, fixed to the Earth. Turn carries a direction over from another
// site's frame, which 200 km away is tilted by almost 2°. The beam and the axis
// are straight lines and must be stated in one sense, both as seen through the
// air or both without it. The air bends the two alike as far as they run
// through the same air at the same elevation; what is left over is at most the
// difference of their refractions, and the pointing errors must have room for
// it.
//
// NaN in gives NaN out, which callers treat as unknown: shuttered. So does the
// zero Pair.
package crossing
