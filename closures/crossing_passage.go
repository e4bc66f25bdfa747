package closures

import (
	"math"

	"beamward/geometry/crossing"
	"beamward/geometry/sky"

	"github.com/golang/geo/r3"
)

// passage is one launch of the beam against one pointing of a neighbour
// telescope, made ready. Beside the pair's margin it knows for how long at
// least that stays on its side of zero where beam and axis both turn with the
// sky. Their common turn then counts for nothing but the shift of the launch as
// the sky sees it, which for a near neighbour is many times slower than the sum
// of both rates, so that a plan's search near an edge takes a few steps rather
// than a hundred.
//
// Fix a frame to the sky at an instant. In it the beam b and the axis a stand
// still, but for what together bounds, and the vector w from the telescope to
// the launch turns about the pole the other way. The ball of radius R(s) about
// v(s) = w + s b (see package crossing) is what the cone about a must not touch.
//
// Clear. Take a plane through the telescope with the unit normal n, the cone on
// its far side: n is 90° and the cone's half angle or more from a. The ball at s
// lies on the near side while n·v(s) > R(s), and both are linear in s: it is
// enough to ask at the launch and at a distance beyond all that shines. As w
// turns, n·w goes with its rate now, and bends by no more than Ω²|w| from that.
//
// Not clear. One ball that touches the cone is followed to where it still does.
// The balls that touch it are a convex set, so it does in between, but for the
// bend of its way. It must stay within what shines.
type passage struct {
	pair      crossing.Pair
	followSky bool

	pole      r3.Vector // about which the sky turns
	w         r3.Vector // from the telescope to the launch
	swing     float64   // the part of w square to the pole, times Ω, m/s
	radius    float64   // half the aperture and the beam's radius, m
	grow      float64   // the radius's growth with the distance, rad
	keep      float64   // at the launch, nearer than this is in the way, m
	allowance float64   // the cone's half angle, rad
	launch    float64   // height of the launch, m
	top       float64   // height above which nothing shines, m
	parts     [2]crossing.Part
	turns     float64 // bounds how fast the beam turns against the sky, rad/s
	axisTurns float64 // and the axis
}

const (
	// skyTurn is Ω, how fast the sky turns about the pole, rad/s (Meeus ch. 12).
	skyTurn = 1.00273790935 * 2 * math.Pi / 86400
	// together bounds how fast a fixed star's airless direction leaves that
	// turn: diurnal aberration by 2.3e-5 arcsec/s, annual aberration, precession
	// and nutation by 1e-5 together, deflection beside the Sun by 7e-5.
	together = 2e-4 * math.Pi / 180 / 3600
	// longestLeap bounds the turn that one answer is for, rad.
	longestLeap = 0.5
	// longestShut is that of an answer about a crossing that lasts.
	longestShut = 0.05
	// leastRadius is less than any radius of curvature of the ellipsoid, m.
	leastRadius = 6.33e6
	// tilt bounds how far the vertical at a launch leans from that of the site,
	// and the top of what shines lies beyond its height, by what crossing.Prepare
	// adds there.
	tilt, topEdge = 1e-4, 20.0
)

// clear returns a time in seconds for which the margin surely stays above
// spare, an angle; 0 where that cannot be told. The pair has said r for the
// directions beam and axis, and lift has been added to the cone's half angle for
// an axis near the horizon. What is looked for is at most some times soon.
func (p *passage) clear(beam, axis r3.Vector, r *crossing.Result, spare, lift, soon float64) float64 {
	if !p.followSky || r.InTheWay {
		return 0
	}
	// Within the leap the beam does not sink to half its height.
	leap := min(longestLeap, beam.Z/2)
	low := beam.Z - leap - p.grow - tilt
	if !(leap > 0 && low > 0.02) {
		return 0
	}
	most := min(leap/(skyTurn+p.turns), 10*soon)
	widens := p.axisTurns
	if axis.Z-(skyTurn+p.axisTurns)*most < lowTop {
		widens += (skyTurn + p.axisTurns) * lowLift / lowFades
	}
	half := p.allowance + lift + spare + widens*most
	if !(half < 1.5) {
		return 0
	}
	far := (p.top - p.launch + topEdge) / low // the height along a line is convex
	t := 0.0
	for _, n := range [...]r3.Vector{p.beside(beam, axis, half), p.across(beam, axis, float64(r.Slant), half)} {
		// At the launch and beyond all that shines: how far the ball is from the
		// plane, and how fast that changes.
		at, rate := n.Dot(p.w)-p.radius, skyTurn*n.Dot(p.pole.Cross(p.w))
		if by := min(p.until(at, rate), p.until(at+far*(n.Dot(beam)-p.grow), rate-far*p.turns)); by > t {
			t = by
		}
	}
	return min(t, most, p.free(beam, most))
}

// beside returns the normal of the plane along the beam that touches the cone
// of a half angle about the axis: the best where the nearest ball lies between
// the ends of what shines. It is NaN where there is none.
func (p *passage) beside(beam, axis r3.Vector, half float64) r3.Vector {
	side := beam.Cross(axis)
	cos, sin := beam.Dot(axis), side.Norm()
	x := p.grow + 1e-9
	y := -(math.Sin(half) + x*cos) / sin
	z := math.Sqrt(1 - x*x - y*y)
	if side.Dot(p.w) < 0 {
		z = -z
	}
	toward := axis.Sub(beam.Mul(cos))
	return beam.Mul(x).Add(toward.Mul(y / sin)).Add(side.Mul(z / sin))
}

// across returns the normal of the plane that touches the cone on the side of
// the ball at s: the best where the nearest ball is at an end.
func (p *passage) across(beam, axis r3.Vector, s, half float64) r3.Vector {
	v := p.w.Add(beam.Mul(s))
	e := v.Sub(axis.Mul(v.Dot(axis)))
	sin, cos := math.Sincos(half)
	return e.Mul(cos / e.Norm()).Sub(axis.Mul(sin))
}

// until returns when a length that is at now, grows at a rate, and bends by no
// more than Ω times swing can have shrunk to nothing.
func (p *passage) until(at, rate float64) float64 {
	if !(at > 0) || math.IsNaN(rate) {
		return 0
	}
	bend := max(skyTurn*p.swing, 1e-30)
	return (rate + math.Sqrt(rate*rate+2*bend*at)) / bend
}

// free returns a time before which the beam cannot be in the way of the
// telescope, which it is where |v(s)| <= keep + 2 grow s for any s.
func (p *passage) free(beam r3.Vector, most float64) float64 {
	u := 2*p.grow + p.turns*most
	along, size := p.w.Dot(beam), p.w.Norm()
	if !(u < 0.5) {
		return 0
	}
	off := math.Sqrt(max(0, size*size-along*along))
	cos := math.Sqrt(1 - u*u)
	spare := size - p.keep
	if off*u/cos > along {
		spare = off*cos + u*along - p.keep
	}
	if !(spare > 0) {
		return 0
	}
	return spare / max(p.swing, 1e-30)
}

// lowTop is the sine of the elevation above which no lift is allowed for an
// axis, and a little.
var lowTop = math.Sin(lowFull+lowFades) + 1e-6

// passages makes every launch of the beam ready against one pointing.
func (f *Foreseen) passages(dst []passage, q *Question, n *NeighbourRules, p *Pointing) ([]passage, error) {
	for i := range q.Beam.Launches {
		o, err := f.passage(q, n, p, &q.Beam.Launches[i])
		if err != nil {
			return dst, err
		}
		dst = append(dst, o)
	}
	return dst, nil
}

// passage makes one launch and one pointing ready.
func (f *Foreseen) passage(q *Question, n *NeighbourRules, p *Pointing, l *Launch) (passage, error) {
	beam, telescope, parts := f.pairing(q, n, p, l)
	pair, err := crossing.Prepare(beam, telescope, parts[:]...)
	if err != nil {
		return passage{}, err
	}
	if !q.Now.IsZero() || !q.Aim.followsSky() || !p.Aim.followsSky() {
		return passage{pair: pair}, nil
	}
	sin, cos := math.Sincos(f.Rules.Site.Position.Lat.Radians())
	o := passage{
		pair: pair, parts: parts, followSky: true,
		pole: r3.Vector{Y: cos, Z: sin}, w: l.Offset.Sub(n.Offset),
		radius: float64(beam.Radius + telescope.Aperture/2), grow: float64(beam.Spread + beam.AimError),
		keep:      float64(2*beam.Radius + telescope.Aperture/2),
		allowance: float64(telescope.Field + parts[0].Halo + telescope.AimError),
		launch:    float64(pair.HeightAt(r3.Vector{Z: 1}, 0)), top: float64(max(parts[0].Until, parts[1].Until)),
		turns: beam.Rate - sky.SkyRate + together, axisTurns: telescope.Rate - sky.SkyRate + together,
	}
	o.swing = skyTurn * o.pole.Cross(o.w).Norm()
	return o, nil
}

// followsSky reports whether the aim turns with the sky but for its own rate.
func (a *Aim) followsSky() bool { return a.Frame == ICRS || a.Frame == OfDate || a.Frame == Table }
