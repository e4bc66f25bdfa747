package crossing

import (
	"math"

	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

// shell is a height above the ellipsoid, seen from a launch below it: where a
// line from there reaches it.
//
// It is taken for the ellipsoid with the semi-axes a + h and b + h, which lies
// within the surface of the height h and nowhere more than offSurface from it
// (the triangle inequality of the support functions; the directions from the
// centre and of the vertical differ by 0.0034 rad at most).
type shell struct {
	k     float64 // (a+h)²/(b+h)² - 1: x, y and z√(1+k) lie on a sphere of a + h
	kz    float64 // k times the launch's distance from the equator's plane
	gain  float64 // (a+h)² less the launch's square in that sphere
	steep float64 // a bound on how fast the launch's term of the line changes as it turns
	large float64 // a bound on the length of the shell's gradient vectors
}

// offSurface is how far the ellipsoid of a shell may lie off its height, as a
// part of this: 1 - cos 0.0034 and a little.
const offSurface = 6e-6

// center is the launch as seen from the Earth's centre, in the beam site's axes.
type center struct {
	launch r3.Vector
	pole   r3.Vector // the direction of the Earth's axis
	z      float64   // the launch along it
}

func centerOf(f earth.Frame, launch r3.Vector) center {
	c := center{launch: f.Turn(f.ECEF(launch)), pole: f.Turn(r3.Vector{Z: 1})}
	c.z = c.launch.Dot(c.pole)
	return c
}

func shellAt(c center, height float64) shell {
	a := float64(earth.EquatorialRadius) + height
	b := float64(earth.EquatorialRadius)*(1-earth.Flattening) + height
	k := (a/b)*(a/b) - 1
	return shell{
		k:     k,
		kz:    k * c.z,
		gain:  a*a - c.launch.Norm2() - k*c.z*c.z,
		steep: c.launch.Add(c.pole.Mul(k * c.z)).Norm(),
		large: a * math.Sqrt(1+k),
	}
}

// line is a beam's direction, seen from the Earth's centre.
type line struct{ out, north float64 } // the launch·b, the pole·b

// slant returns the distance from the launch to the shell along a line that has
// turned upward by up; nowhere less for any line within |up| where up is
// negative, nowhere more where it is positive. Below the horizon it is the far
// end of the chord.
func (h *shell) slant(l line, up float64) float64 {
	s, _ := h.solve(l, up)
	return s
}

// solve returns slant, and half the slope there of the quadratic that it solves.
func (h *shell) solve(l line, up float64) (s, half float64) {
	x := l.out + h.kz*l.north + h.steep*up
	c := max(1, 1+h.k*(l.north*l.north+2*up))
	half = math.Sqrt(x*x + c*h.gain)
	if x >= 0 {
		return h.gain / (x + half), half
	}
	return (half - x) / c, half
}

// slide returns the slant of a line turned upward by up, and a bound on how far
// that can move for each radian that the line turns, from there up.
func (h *shell) slide(l line, up float64) (s, rate float64) {
	s, half := h.solve(l, up)
	if l.out+h.kz*l.north+h.steep*up < 0 {
		half = math.Sqrt(h.gain)
	}
	return s, s * h.large / half
}
