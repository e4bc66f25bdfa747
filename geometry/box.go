package geometry

import (
	"math"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Box is every direction whose azimuth lies from AzFrom, through east, to AzTo
// and whose elevation lies from ElFrom to ElTo, its edges included. It passes
// through north where AzFrom > AzTo; 0 to 2π is the full circle. Where ElTo is
// π/2 the box runs up to the zenith.
//
// A box of zero width is none: equal azimuths are as likely meant as the full
// circle, so Valid refuses them.
type Box struct{ AzFrom, AzTo, ElFrom, ElTo s1.Angle }

// fullCircle is the width from which a box has no edges at its azimuths. The
// slit that it leaves out is far below any pointing error.
const fullCircle = 2*math.Pi - 1e-12

// width returns the angle from AzFrom to AzTo through east, in [0, 2π].
func (b Box) width() float64 {
	if b.AzTo < b.AzFrom {
		return float64(b.AzTo-b.AzFrom) + 2*math.Pi
	}
	return float64(b.AzTo - b.AzFrom)
}

// Valid reports whether the azimuths of b lie in [0, 2π] and its elevations in
// [-π/2, π/2], the second above the first, with some width between.
func (b Box) Valid() bool {
	return b.AzFrom >= 0 && b.AzFrom <= 2*math.Pi && b.AzTo >= 0 && b.AzTo <= 2*math.Pi &&
		b.ElFrom >= -math.Pi/2 && b.ElFrom < b.ElTo && b.ElTo <= math.Pi/2 && b.width() > 0
}

// Margin returns the angle on the sky between dir and the box, in radians:
// zero on an edge, positive outside, and negative inside by the distance to the
// nearest edge. It is a true distance, not a difference of azimuths, so it
// changes by no more than dir turns, at the zenith too. An edge of constant
// elevation is the small circle that it is. A box that is the whole sky has no
// edge and gives -π. A box that is not valid gives NaN, and so does NaN in dir.
func (b Box) Margin(dir r3.Vector) float64 {
	if !b.Valid() || !FiniteVector(dir) || dir.Norm2() == 0 {
		return math.NaN()
	}
	az, el := ToHorizon(dir)
	low, high := float64(b.ElFrom), float64(b.ElTo)
	width := b.width()
	full := width >= fullCircle
	past := float64(az - b.AzFrom) // how far the azimuth is past AzFrom, through east
	if past < 0 {
		past += 2 * math.Pi
	}
	beside := full || past <= width
	inside := beside && float64(el) >= low && float64(el) <= high

	// The distance to a circle of constant elevation is the difference of
	// elevations wherever the nearest azimuth is on the edge. A pole is a point,
	// and inside a full circle no edge at all.
	edge := math.Pi
	if beside && low > -math.Pi/2 {
		edge = min(edge, math.Abs(float64(el)-low))
	}
	if beside && high < math.Pi/2 {
		edge = min(edge, math.Abs(float64(el)-high))
	}
	if !full {
		edge = min(edge, meridian(dir, b.AzFrom, low, high), meridian(dir, b.AzTo, low, high))
	}
	if inside {
		return -edge
	}
	return edge
}

// meridian returns the angle between dir and the arc at azimuth az between two
// elevations, ends included.
func meridian(dir r3.Vector, az s1.Angle, low, high float64) float64 {
	sin, cos := math.Sincos(float64(az))
	along := dir.X*sin + dir.Y*cos
	across := dir.X*cos - dir.Y*sin
	foot := math.Atan2(dir.Z, along)
	if foot >= low && foot <= high {
		return math.Atan2(math.Abs(across), math.Hypot(along, dir.Z))
	}
	end := low // the nearer one, by which side of the arc's middle the foot is on
	if beyond := foot - (low+high)/2; beyond > 0 && beyond <= math.Pi || beyond < -math.Pi {
		end = high
	}
	sin, cos = math.Sincos(end)
	return math.Atan2(math.Hypot(across, dir.Z*cos-along*sin), along*cos+dir.Z*sin)
}
