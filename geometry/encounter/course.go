package encounter

import (
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Course is straight motion past a beam, for display: no decision rests on it.
// The beam is the fixed ray from Launch along Axis (any length but 0); the
// aircraft is at Position now and moves with Velocity. Same frame, metres,
// metres a second.
type Course struct {
	Launch, Axis       r3.Vector
	Position, Velocity r3.Vector
}

// Approach is where straight motion comes closest. The angle seen from the
// launch and the distance from the beam are least at slightly different times.
// Not a number, if the course has one.
type Approach struct {
	SeparationAt time.Duration
	Separation   s1.Angle
	DistanceAt   time.Duration
	Distance     geometry.Length
}

// Passage is when straight motion is inside a shape, its ends included, within
// the time asked about. Ok is false where it never is.
type Passage struct {
	In, Out time.Duration
	Ok      bool
}

// line is the course in the terms of the formulas below, with p relative to
// the launch and b a unit vector:
// a = p·b, s = v·b, A = |p|², B = p·v, C = |v|².
type line struct {
	p, v, b       r3.Vector
	a, s          float64
	bigA, bigB, c float64
}

func (c *Course) line() (line, bool) {
	norm := c.Axis.Norm()
	p, v, b := c.Position.Sub(c.Launch), c.Velocity, c.Axis.Mul(1/norm)
	if !geometry.FiniteVector(p) || !geometry.FiniteVector(v) || !geometry.FiniteVector(b) {
		return line{}, false
	}
	return line{p: p, v: v, b: b, a: p.Dot(b), s: v.Dot(b), bigA: p.Norm2(), bigB: p.Dot(v), c: v.Norm2()}, true
}

func (l *line) where(t float64) r3.Vector { return l.p.Add(l.v.Mul(t)) }

// Closest returns the least angle and the least distance between the aircraft
// and the beam within the time over from now.
//
// The cosine of the angle is stationary at t = (a B - s A) / (s B - a C) alone.
// The distance from the axis is least at t = -(q·w)/|w|² with q and w the parts
// of p and v square to the axis; where the foot lies behind the launch the
// distance is that from the launch, least at t = -B/C.
func (c *Course) Closest(over time.Duration) Approach {
	l, ok := c.line()
	if !ok || over < 0 {
		return Approach{Separation: s1.Angle(math.NaN()), Distance: geometry.Length(math.NaN())}
	}
	end := seconds(over)
	var out Approach
	t := least(end, []float64{(l.a*l.bigB - l.s*l.bigA) / (l.s*l.bigB - l.a*l.c)},
		func(t float64) float64 { return geometry.Separation(l.where(t), l.b).Radians() })
	out.SeparationAt, out.Separation = nearest(t), geometry.Separation(l.where(t), l.b)
	q, w := l.p.Sub(l.b.Mul(l.a)), l.v.Sub(l.b.Mul(l.s))
	t = least(end, []float64{-q.Dot(w) / w.Norm2(), -l.bigB / l.c, -l.a / l.s}, l.distance)
	out.DistanceAt, out.Distance = nearest(t), geometry.Length(l.distance(t))
	return out
}

// distance returns the distance from the ray at the time t.
func (l *line) distance(t float64) float64 {
	x := l.where(t)
	s := x.Dot(l.b)
	if s < 0 {
		return x.Norm()
	}
	return x.Sub(l.b.Mul(s)).Norm()
}

// least returns the one of 0, end and the candidates within them at which f is
// least, the earliest of equals. A candidate that is not a number (no such
// time) is passed over.
func least(end float64, candidates []float64, f func(float64) float64) float64 {
	best, value := 0.0, f(0)
	for _, t := range candidates {
		if t > 0 && t < end {
			if y := f(t); y < value {
				best, value = t, y
			}
		}
	}
	if f(end) < value {
		best = end
	}
	return best
}

// InCone returns when the aircraft is inside the cone of the half-angle alpha,
// below 90°, about the beam: (s²-kC) t² + 2(as-kB) t + (a²-kA) >= 0 with
// k = cos² alpha, on the side where a + s t >= 0.
func (c *Course) InCone(alpha s1.Angle, over time.Duration) Passage {
	l, ok := c.line()
	if !ok || !(alpha >= 0 && alpha.Radians() < math.Pi/2) || over < 0 {
		return Passage{}
	}
	k := math.Cos(alpha.Radians())
	k *= k
	t1, t2 := roots(l.s*l.s-k*l.c, 2*(l.a*l.s-k*l.bigB), l.a*l.a-k*l.bigA)
	return inside(seconds(over), [...]float64{t1, t2, -l.a / l.s}, func(t float64) bool {
		x := l.where(t)
		return geometry.Separation(x, l.b) <= alpha || x.Norm2() == 0
	})
}

// InCylinder returns when the aircraft is within radius of the beam's axis, not
// behind the launch: |q + w t|² <= radius² and a + s t >= 0.
func (c *Course) InCylinder(radius geometry.Length, over time.Duration) Passage {
	l, ok := c.line()
	r := float64(radius)
	if !ok || !(r >= 0) || over < 0 {
		return Passage{}
	}
	q, w := l.p.Sub(l.b.Mul(l.a)), l.v.Sub(l.b.Mul(l.s))
	t1, t2 := roots(w.Norm2(), 2*q.Dot(w), q.Norm2()-r*r)
	return inside(seconds(over), [...]float64{t1, t2, -l.a / l.s}, func(t float64) bool {
		return l.a+l.s*t >= 0 && q.Add(w.Mul(t)).Norm() <= r
	})
}

// roots returns the real roots of a t² + b t + c, NaN where there are none.
func roots(a, b, c float64) (t1, t2 float64) {
	q := -(b + math.Copysign(math.Sqrt(b*b-4*a*c), b)) / 2
	return q / a, c / q
}

// inside returns the first to the last of the parts between 0, end and the
// edges whose middle is inside. For a convex shape and a straight course that
// is one passage.
func inside(end float64, edges [3]float64, holds func(float64) bool) Passage {
	at := [5]float64{0: 0, 4: end}
	for i, t := range edges {
		if !(t > 0) {
			t = 0
		}
		at[1+i] = min(t, end)
	}
	sort5(&at)
	var out Passage
	for i := range at[1:] {
		if from, to := at[i], at[i+1]; from < to && holds((from+to)/2) {
			if !out.Ok {
				out = Passage{In: nearest(from), Ok: true}
			}
			out.Out = nearest(to)
		}
	}
	return out
}

func sort5(a *[5]float64) {
	for i := range a {
		for k := i; k > 0 && a[k] < a[k-1]; k-- {
			a[k], a[k-1] = a[k-1], a[k]
		}
	}
}

func nearest(s float64) time.Duration { return time.Duration(math.Round(s * 1e9)) }
