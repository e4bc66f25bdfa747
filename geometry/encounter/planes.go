package encounter

import (
	"math"

	"github.com/golang/geo/r3"
)

// Planes that hold the widened volume besides those about its axis: the
// ceiling, the horizon under the launch, the plane behind the launch, a ring
// between that and the sides, and upright walls about the volume's shadow on
// the ground. The walls decide about an aircraft of unknown altitude.
const (
	corners = 16
	walls   = len(wallOffsets) * 2

	firstCorner = 3
	firstRight  = firstCorner + corners // walls toward e1
	firstLeft   = firstRight + walls/2
	planes      = firstLeft + walls/2
)

// wallOffsets are the azimuths of the walls' normals on one side of the beam,
// in degrees from square to it, positive backward: dense where the sides of
// the shadow, which spread by the half-angle over the cosine of elevation, are.
var wallOffsets = [...]float64{-90, -60, -30, -12, -4, 0, 1, 2, 3, 4, 6, 8, 12, 20, 35, 60, 90}

// circle holds the cosine and sine of the sides' angles about the axis.
var circle = func() (c [sides][2]float64) {
	for i := range c {
		s, k := math.Sincos(2 * math.Pi * float64(i) / sides)
		c[i] = [2]float64{k, s}
	}
	return c
}()

// wallCircle holds the components of the walls' normals along the beam's
// azimuth and square to it.
var wallCircle = func() (c [walls][2]float64) {
	for i, deg := range wallOffsets {
		s, k := math.Sincos(deg * math.Pi / 180)
		c[i] = [2]float64{-s, k}
		c[i+walls/2] = [2]float64{-s, -k}
	}
	return c
}()

// setPlanes fills the further planes. Each sigma grows with every one of
// radius, extent, height, turn and wide, and is infinite where the volume has
// no bound in that direction.
//
// Two facts give the supports. The cylinder about an axis b' within turn of b
// is the points s'b' + d with s' >= 0, d square to b' and |d| <= radius: where
// n·b' <= 0 for every such b', its support toward n is at most
// radius x (the largest part of n square to b'). The cone about b' of the
// half-angle lies in the one about b of wide: its support is 0 where n is at
// least a quarter turn + wide from b.
func (v *Volume) setPlanes(radius, height, turn, wide float64) {
	elev := math.Atan2(v.b.Z, v.bh)
	v.floor = elev-wide >= 0
	v.high = height + v.extent
	v.far = shadow(radius, v.extent, height, elev, turn, wide)
	open := math.Inf(1)
	v.low = -open
	if v.floor {
		v.low = -radius - v.extent
	}

	p := v.plane[:0]
	add := func(n r3.Vector, beside, within float64) {
		nz := math.Abs(n.Z)
		p = append(p, plane{
			n: n, nh: math.Sqrt(max(0, 1-nz*nz)), nz: nz,
			sigma: [shapes]float64{cylinder: beside + v.extent, cone: within + v.extent},
		})
	}
	add(r3.Vector{Z: 1}, height, height)
	beside, within := open, open
	if elev-turn >= 0 {
		beside = radius
	}
	if v.floor {
		within = 0
	}
	add(r3.Vector{Z: -1}, beside, within)
	add(v.b.Mul(-1), radius*v.sinE, 0)

	beside, within = open, open
	if turn <= math.Pi/4 {
		beside = radius * math.Sin(math.Pi/4+turn)
	}
	if wide <= math.Pi/4 {
		within = 0
	}
	for i := range corners {
		c := circle[i*sides/corners]
		m := v.e1.Mul(c[0]).Add(v.e2.Mul(c[1]))
		add(m.Sub(v.b).Mul(math.Sqrt2/2), beside, within)
	}

	// Upright walls. The cone cut by the ceiling is the hull of its tip and of
	// an ellipse: in the beam's own vertical plane its edges rise at
	// elev ± wide, and it is height sin A / sqrt(sin(elev-wide) sin(elev+wide))
	// wide to each side.
	along := r3.Vector{X: -v.e1.Y, Y: v.e1.X}
	var mid, half, across, length float64
	if elev-wide > 0 && elev+wide < math.Pi {
		front, back := 1/math.Tan(elev-wide), 1/math.Tan(elev+wide)
		mid, half = height*(front+back)/2, height*(front-back)/2
		across = height * v.sinA / math.Sqrt(math.Sin(elev-wide)*math.Sin(elev+wide))
		length = (height + radius) / math.Sin(elev-turn)
	} else {
		mid = open
	}
	for _, c := range wallCircle {
		n := along.Mul(c[0]).Add(v.e1.Mul(c[1]))
		beside, within := open, open
		if mid < open {
			beside = length*max(0, v.b.Dot(n)+turn) + radius
			within = max(0, mid*c[0]+math.Hypot(half*c[0], across*c[1]))
		}
		add(n, beside, within)
	}
}
