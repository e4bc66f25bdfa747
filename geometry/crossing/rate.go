package crossing

import "math"

// extent is where a part lies along the beam, and how far its near end moves for
// each radian that the beam turns up.
type extent struct{ from, until, near float64 }

// extent returns the distances between which the part can lie for any true
// direction of the beam within its pointing error.
func (o *part) extent(v *view) extent {
	e := extent{until: o.far.slant(v.line, -v.grow)}
	if !o.fromLaunch {
		e.from, e.near = o.near.slide(v.line, v.grow)
	}
	return e
}

// leastTurn is the turn of the beam that is looked ahead at least; where the
// beam is high it is more, since the ends of its parts then move slowly.
const leastTurn = 0.1

// haste returns a bound on 1/T, where T is the time before which the margin m
// of a part, which is positive, cannot have reached zero; the margin is then at
// least m (1 - t/T) at t.
//
// When the beam has turned by δ, the ball at s lies within the ball about its
// old place whose radius is larger by s δ. So the margin at s has fallen by no
// more than asin((R + s δ)/|v|) - asin(R/|v|), which is convex in δ: below the
// δ at which it reaches m it is under its chord. Besides, the ends of the part
// slide along the beam, since they are heights.
func (v *view) haste(o *part, e extent, m float64) float64 {
	if v.omegaB == 0 {
		return v.omegaA / m
	}
	// Look ahead no farther than the turn that could use up the margin.
	ahead := min(v.ahead, m)
	// Over the turn, the part lies within wide.
	until, far := o.far.slide(v.line, -v.grow-ahead)
	wide := extent{until: until}
	if !o.fromLaunch {
		wide.from = o.near.slant(v.line, v.grow+ahead)
	}
	rim2 := v.rim2(wide)
	rim, h := math.Sqrt(rim2), math.Sqrt(1+rim2)
	// How much the margin changes because the ends move, for each radian.
	slide := far * v.along(extent{from: e.until, until: until}, h)
	if !o.fromLaunch {
		slide = max(slide, e.near*v.along(extent{from: wide.from, until: e.from}, h))
	}
	// With tan ρ = R/√(|v|²-R²) <= rim, the chord up to c <= m reaches to
	// δ = (√(|v|²-R²)/s) sin c (1 - tan ρ tan(c/2)), as long as c + ρ is no
	// more than a right angle, which it is for c <= cos ρ.
	c := min(m, 1/h)
	chord := v.reach(wide) / ((1 - c*c/6) * (1 - rim*c*(2/math.Pi))) // c/δ: sin c >= c - c³/6, tan(c/2) <= 2c/π
	turn := min(ahead, c/chord, v.free)
	if !(turn > 0) {
		return math.Inf(1) // so near that rounding decides: no time is sure
	}
	return max((v.omegaA+v.omegaB*(chord+slide))/m, v.omegaB/turn)
}

// along bounds how fast the margin changes along the beam as it is, per metre,
// between two distances where |v|/√(|v|²-R²) <= h.
func (v *view) along(e extent, h float64) float64 {
	x := min(max(0, e.from+v.wb), e.until+v.wb) // of those between, the nearest to 0
	r := v.radius + v.grow*(e.until+v.off+math.Abs(x))
	return (v.off + r*h) / (v.off*v.off + x*x)
}

// reach returns the largest s/√(|v|²-R²) over an extent: by how much the beam's
// turn is magnified as seen from the telescope. The square of its inverse is
// quadratic in 1/s.
func (v *view) reach(e extent) float64 {
	x := max(v.vertex, 1/e.until)
	if e.from > 0 {
		x = min(x, 1/e.from)
	}
	return 1 / math.Sqrt((v.a*x+2*v.b)*x+v.c)
}

// rim2 returns the largest R²/(|v|²-R²) over an extent.
func (v *view) rim2(e extent) float64 {
	most := max(v.rim2At(e.from), v.rim2At(e.until))
	if v.still > e.from && v.still < e.until {
		most = max(most, v.rim2At(v.still))
	}
	return most
}

func (v *view) rim2At(s float64) float64 {
	r := v.radius + v.grow*s
	return r * r / (v.a + (2*v.b+v.c*s)*s)
}

// prepare works out what the rates of all parts share. |v|² - R² is
// a + 2bs + cs².
func (v *view) prepare() {
	v.a = v.w2 - v.radius*v.radius
	v.b = v.wb - v.grow*v.radius
	v.c = 1 - v.grow*v.grow
	v.vertex = -v.b / v.a
	v.still = (v.grow*v.a - v.radius*v.b) / (v.radius*v.c - v.grow*v.b) // where R²/(|v|²-R²) is stationary
	v.free = v.turnUntilInTheWay()
}

// turnUntilInTheWay returns a turn of the beam before which it cannot be in the
// way. A turn of δ takes |v(s)| down by no more than s δ, so that it is still
// clear where |v(s)| > keep + (2 grow + δ) s for each s; the line of the
// largest slope that does so touches the hyperbola |v|.
func (v *view) turnUntilInTheWay() float64 {
	lift := math.Sqrt(v.w2 - v.keep*v.keep)
	if v.off*v.keep < v.wb*lift {
		return 1 - 2*v.grow // |v| >= s u for every u below 1: none touches
	}
	return (v.wb*v.keep+v.off*lift)/v.w2 - 2*v.grow
}

// rise returns a bound on how fast a margin of -depth, zero or less, that is
// least at s can rise until it can have reached zero, in rad/s. It follows the
// one point: as the beam turns, and along the beam where an end of the part
// passes it.
func (v *view) rise(o *part, s, depth float64) float64 {
	if v.omegaB == 0 {
		return v.omegaA
	}
	x, r := s+v.wb, v.radius+v.grow*s
	d := math.Sqrt(x*x + v.off*v.off)
	ahead := min(v.ahead, max(depth, leastDepth))
	slide := 0.0
	if s > o.far.slant(v.line, ahead-v.grow) {
		_, slide = o.far.slide(v.line, -v.grow-ahead)
	}
	if !o.fromLaunch && s < o.near.slant(v.line, v.grow-ahead) {
		_, near := o.near.slide(v.line, v.grow-ahead)
		slide = max(slide, near)
	}
	// Keep the point, turned and carried along, at three quarters of its
	// distance or more.
	ahead = min(ahead, (d-r)/(4*(s+2*slide)))
	near, big := (3*d+r)/4, r+v.grow*(d-r)/4
	rim := math.Sqrt(near*near - big*big)
	up := (s+slide*ahead)/rim + slide*(v.off/(near*near)+(v.grow+big/near)/rim)
	return max(v.omegaA+v.omegaB*up, v.omegaB*depth/ahead)
}

// leastDepth keeps quotients finite, in radians.
const leastDepth = 1e-9
