package encounter

import (
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// KeepOut is the volume K about one launch of a beam that no aircraft may
// enter, with what is needed to contain it over the coming guard: assumption
// (B). A beam with several launches has one KeepOut for each.
//
// K at an instant is the cone of HalfAngle about the beam from its launch,
// united with the flat-ended cylinder of Radius about it that starts at the
// launch, as far as the plane at Ceiling; all widened by Extent. Its axis lies
// within AxisError + AxisRate x (u - at) of Axis.
type KeepOut struct {
	// Launch is in the site's frame (X east, Y north, Z up), metres.
	Launch r3.Vector
	// Axis is the computed direction of the beam at the instant asked about,
	// in the same frame. It need not be a unit vector.
	Axis      r3.Vector
	HalfAngle s1.Angle
	Radius    geometry.Length
	// Ceiling is the height over the site of a horizontal plane there. The
	// surface of one height H above the ellipsoid is convex, so that it lies
	// wholly under its tangent plane over the site: with Ceiling = H - (the
	// site's height) all that is below H lies below the plane, the Earth's
	// curve counted.
	Ceiling geometry.Length
	// Extent is how far an aircraft reaches from its reported point.
	Extent geometry.Length
	// AxisError holds all by which the true beam may lie beside Axis at the
	// instant: aim error, unannounced move, the bending of the beam or of the
	// aim by refraction.
	AxisError s1.Angle
	// AxisRate bounds how fast the true beam turns during the guard, per
	// second, about Axis.
	AxisRate s1.Angle
}

// sides is the number of directions about the axis in which the volume is
// compared. A plane is at most half a step from the best one; at a touch its
// margin falls short by at most (distance of the reach's centre from the axis)
// x (1 - cos(π/sides)): 0.5 %.
const sides = 32

// widest is the largest half-angle, errors included, that the volume is made
// for. Wider ones are answered as the whole sky: touched.
const widest = 80 * math.Pi / 180

// side is one direction m across the axis, square to it, with n = cos A m -
// sin A b, which leans with the cone.
type side struct {
	x, y   float64 // m in the basis across the axis
	mh, mz float64 // lengths of m's horizontal and vertical parts
	nh, nz float64 // those of n
}

// plane is a normal n, the same for both shapes. n·x <= sigma, relative to the
// launch, for every point x of the widened shape.
type plane struct {
	n      r3.Vector
	nh, nz float64 // lengths of n's horizontal and vertical parts
	sigma  [shapes]float64
}

// The volume is the union of two convex shapes, each parted from a reach by
// planes of its own.
const (
	cylinder = iota
	cone
	shapes
)

// Volume is the widened keep-out over one guard, which holds K̂(u) for every u
// in [at, at + guard], given by the planes that hold its two shapes. Set fills it;
// it is then read only and may be shared. The zero value is the whole sky:
// everything touches it.
type Volume struct {
	at     time.Time
	guard  float64 // s
	launch r3.Vector

	b, e1, e2    r3.Vector // axis; basis across it, e1 horizontal
	bh, bz       float64   // lengths of b's horizontal and vertical parts
	base         float64   // m, cylinder's radius and aircraft's extent
	extent       float64   // m
	sinE, cosE   float64   // of the axis' error over the guard
	sinA, cosA   float64   // of the half-angle and that error
	low, high    float64   // m, heights within which the volume lies, relative to the launch
	far          float64   // m, horizontal distance from the launch within which it lies
	side         [sides]side
	plane        [planes]plane
	ready, floor bool
}

// Set makes v the widened keep-out k over [at, at + guard]. It reports false,
// and leaves v touched by everything, if a number is not finite, a size or the
// guard is below zero, the axis has no length, the ceiling is not above the
// launch, or the half-angle with its errors exceeds 80°.
func (v *Volume) Set(k *KeepOut, at time.Time, guard time.Duration) bool {
	v.ready = false
	radius, extent, ceiling := float64(k.Radius), float64(k.Extent), float64(k.Ceiling)
	turn := k.AxisError.Radians() + k.AxisRate.Radians()*seconds(guard)
	wide := k.HalfAngle.Radians() + turn
	height := ceiling - k.Launch.Z
	norm := k.Axis.Norm()
	if !geometry.FiniteVector(k.Launch) || !geometry.FiniteVector(k.Axis) || !geometry.Finite(radius, extent, ceiling, turn, wide, norm) ||
		!(radius >= 0 && extent >= 0 && height > 0 && norm > 0 && guard >= 0) ||
		!(k.AxisError >= 0 && k.AxisRate >= 0 && k.HalfAngle >= 0 && wide <= widest) {
		return false
	}
	v.at, v.guard, v.launch = at, seconds(guard), k.Launch
	v.b = k.Axis.Mul(1 / norm)
	v.bh, v.bz = math.Hypot(v.b.X, v.b.Y), math.Abs(v.b.Z)
	if v.bh > 1e-12 {
		v.e1 = r3.Vector{X: v.b.Y / v.bh, Y: -v.b.X / v.bh}
	} else {
		v.e1 = r3.Vector{X: 1}
	}
	v.e2 = v.e1.Cross(v.b)
	v.base, v.extent = radius+extent, extent
	v.sinE, v.cosE = math.Sincos(turn)
	v.sinA, v.cosA = math.Sincos(wide)
	v.setSides()
	v.setPlanes(radius, height, turn, wide)
	v.ready = true
	return true
}

// setSides fills the directions across the axis.
func (v *Volume) setSides() {
	for i := range v.side {
		c := circle[i]
		mz := c[1] * v.e2.Z // e1 is horizontal
		nz := v.cosA*mz - v.sinA*v.b.Z
		v.side[i] = side{
			x: c[0], y: c[1],
			mh: math.Sqrt(max(0, 1-mz*mz)), mz: math.Abs(mz),
			nh: math.Sqrt(max(0, 1-nz*nz)), nz: math.Abs(nz),
		}
	}
}

// shadow returns a horizontal distance from the launch within which the
// widened volume lies, for an axis elev above the horizon (radians), turned by
// at most turn, with the half-angle wide: infinite unless all of the cone
// rises. A point of the cone at the height z is at most z cot(elev - wide)
// away; one of the cylinder is s' along its axis, where s' sin(elev - turn) is
// at most the height and the radius.
func shadow(radius, extent, height, elev, turn, wide float64) float64 {
	if !(elev-wide > 0) {
		return math.Inf(1)
	}
	return max(height/math.Tan(elev-wide), (height+radius)/math.Tan(elev-turn)+radius) + extent
}
