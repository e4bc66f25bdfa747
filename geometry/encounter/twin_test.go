package encounter

import (
	"math"
	"math/rand/v2"
	"sort"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
)

// The slow twin: the sets of the theorem as they are written, sampled in time
// and space. It shares only R(u)'s membership (Reach.Holds) with Touch, and
// none of its planes.

// distanceAt is the distance of x from the keep-out's cone and cylinder at the
// time after the guard's beginning, over every axis within the error that is
// then possible; infinity where the nearest point found is over the ceiling.
func distanceAt(k *KeepOut, x r3.Vector, after float64) float64 {
	turn := k.AxisError.Radians() + k.AxisRate.Radians()*after
	p := x.Sub(k.Launch)
	b := k.Axis
	s := p.Dot(b)
	side := p.Sub(b.Mul(s))
	off := side.Norm()
	if off > 0 {
		side = side.Mul(1 / off)
	}
	best := math.Inf(1)
	keep := func(along, across float64, axis, square r3.Vector) {
		y := axis.Mul(along).Add(square.Mul(across))
		if y.Z+k.Launch.Z <= float64(k.Ceiling) {
			best = math.Min(best, p.Sub(y).Norm())
		}
	}
	// The cone, widened by the axis' error: its edge in the plane of p and b.
	sa, ca := math.Sincos(k.HalfAngle.Radians() + turn)
	if along := s*ca + off*sa; off*ca-s*sa <= 0 && s >= 0 {
		keep(s, off, b, side)
	} else {
		along = math.Max(0, along)
		keep(along*ca, along*sa, b, side)
	}
	// The cylinder, its axis turned toward p and away from it.
	for _, part := range [...]float64{0, 0.5, 1, -1} {
		st, ct := math.Sincos(part * turn)
		axis := b.Mul(ct).Add(side.Mul(st))
		square := side.Mul(ct).Sub(b.Mul(st))
		along, across := p.Dot(axis), p.Dot(square)
		keep(math.Max(0, along), math.Max(-float64(k.Radius), math.Min(float64(k.Radius), across)), axis, square)
	}
	return best
}

// sampled searches R(u) over the guard for the place nearest to the keep-out.
// It returns its distance less the aircraft's extent (never less than the true
// one), and the earliest sampled time of a touch.
func (c *trial) sampled() (margin float64, first time.Duration) {
	w := Of(&c.r, &c.m)
	guard := c.guard.Seconds()
	first = c.guard + 1
	margin = math.Inf(1)
	const times, heights, angles = 9, 7, 24
	var bestU, bestZ float64
	var bestX r3.Vector
	try := func(after float64, x r3.Vector) bool {
		u := c.at.Add(time.Duration(after * 1e9))
		if !w.Holds(x, u, 0) {
			return false
		}
		d := distanceAt(&c.k, x, after) - float64(c.k.Extent)
		if d <= 0 {
			first = min(first, time.Duration(after*1e9))
		}
		if d < margin {
			margin, bestU, bestX, bestZ = d, after, x, x.Z
			return true
		}
		return false
	}
	size := 0.0
	for i := range times {
		after := guard * float64(i) / (times - 1)
		u := c.at.Add(time.Duration(after * 1e9))
		t := seconds(u.Sub(w.at))
		tau := t + w.lag(t)
		l := w.limits(tau, 0)
		type circle struct{ x, y, r float64 }
		var circles []circle
		if w.course {
			circles = append(circles, circle{w.p.X + w.v.X*t, w.p.Y + w.v.Y*t, l.eh + w.speed*w.lambda + l.evh*tau + l.ah*tau*tau/2})
		}
		circles = append(circles, circle{w.p.X, w.p.Y, l.eh + l.v*tau})
		low, high := w.p.Z-l.ez-l.c*tau, w.p.Z+l.ez+l.c*tau
		if w.climb {
			h := l.ez + math.Abs(w.v.Z)*w.lambda + l.evz*tau + l.az*tau*tau/2
			low, high = math.Max(low, w.p.Z+w.v.Z*t-h), math.Min(high, w.p.Z+w.v.Z*t+h)
		}
		if !w.altitude {
			low, high = c.k.Launch.Z, float64(c.k.Ceiling)
		}
		for j := range heights {
			z := low + (high-low)*float64(j)/(heights-1)
			for _, o := range circles {
				size = math.Max(size, math.Min(o.r, 3000))
				for _, part := range [...]float64{0, 0.5, 0.8, 1 - 1e-9} {
					for n := range angles {
						s, k := math.Sincos(2 * math.Pi * float64(n) / angles)
						try(after, r3.Vector{X: o.x + o.r*part*k, Y: o.y + o.r*part*s, Z: z})
					}
				}
			}
		}
	}
	// Then nearer and nearer about the best.
	for stepX, stepU, stepZ := size/4, guard/16, 200.0; stepX > 0.05; stepX, stepU, stepZ = stepX*0.7, stepU*0.7, stepZ*0.7 {
		for better := true; better; {
			better = false
			x, after, z := bestX, bestU, bestZ
			for n := range 16 {
				s, k := math.Sincos(2 * math.Pi * float64(n) / 16)
				better = try(after, r3.Vector{X: x.X + stepX*k, Y: x.Y + stepX*s, Z: z}) || better
			}
			for _, d := range [...]float64{-1, 1} {
				better = try(math.Max(0, math.Min(guard, after+d*stepU)), r3.Vector{X: x.X + d*w.v.X*stepU, Y: x.Y + d*w.v.Y*stepU, Z: z}) || better
				better = try(math.Max(0, math.Min(guard, after+d*stepU)), bestX) || better
				better = try(after, r3.Vector{X: x.X, Y: x.Y, Z: z + d*stepZ}) || better
				better = try(after, r3.Vector{X: x.X + c.k.Axis.X*d*stepZ, Y: x.Y + c.k.Axis.Y*d*stepZ, Z: z + c.k.Axis.Z*d*stepZ}) || better
			}
		}
	}
	return margin, first
}

// grazing draws a trial near the edge between touched and clear: old is the
// age of its report in seconds.
func grazing(g *rand.Rand, old float64) trial {
	c := trial{k: someKeepOut(g), at: epoch, guard: span(g, 1, 4), m: Civil()}
	for c.k.Axis.Z > 0.999 {
		c.k = someKeepOut(g)
	}
	c.r = Report{
		At: epoch.Add(-span(g, 0.2*old, old)), Early: span(g, 0, 1.5), Late: span(g, 0, 0.5), AltitudeKnown: true, CourseKnown: true, ClimbKnown: true,
		PositionError: Error{Horizontal: geometry.Length(between(g, 10, 250)), Vertical: geometry.Length(between(g, 20, 800))},
		VelocityError: SpeedError{Horizontal: geometry.Speed(between(g, 1, 25)), Vertical: geometry.Speed(between(g, 0.5, 5))},
		Velocity:      limit(within(g, 1e4), between(g, 30, 280)),
	}
	c.r.Velocity.Z = 12 * extreme(g)
	// The size of reach and keep-out together, about.
	height := between(g, 1500, float64(c.k.Ceiling)-1500)
	tau := epoch.Sub(c.r.At).Seconds() + c.guard.Seconds() + c.r.Early.Seconds()
	size := 11*tau*tau + float64(c.r.PositionError.Horizontal) + 250 + float64(c.k.Radius+c.k.Extent) + height*math.Tan(c.k.HalfAngle.Radians())
	s, k := math.Sincos(between(g, 0, 2*math.Pi))
	off := size * between(g, 0.3, 1.8)
	c.r.Position = c.k.Launch.Add(c.k.Axis.Mul(height / c.k.Axis.Z)).Add(r3.Vector{X: off * s, Y: off * k}).Sub(c.r.Velocity.Mul(epoch.Sub(c.r.At).Seconds()))
	return c
}

// The quick answer is never clear where the twin finds a touch, never claims
// more margin than the twin finds, and is touched without need only within the
// conservatism that the package comment states.
func TestTouchAgreesWithTheSampledSets(t *testing.T) {
	for _, kind := range []struct {
		name   string
		old    float64
		change func(*trial)
		excess float64 // m, the most that a needless touch may be apart in truth
	}{
		{"fresh", 2, func(*trial) {}, 45},
		{"old", 15, func(*trial) {}, 900},
		{"no velocity", 2, func(c *trial) { c.r.CourseKnown, c.r.ClimbKnown = false, false }, 45},
		{"no altitude", 2, func(c *trial) { c.r.AltitudeKnown = false }, 700},
	} {
		t.Run(kind.name, func(t *testing.T) {
			g := rand.New(rand.NewPCG(5, 11))
			n := trials(t, 160, 10000)
			var needless, lost []float64
			touched := 0
			for range n {
				c := grazing(g, kind.old)
				kind.change(&c)
				a := c.touch()
				margin, first := c.sampled()
				if a.Clear {
					if !(float64(a.Margin) <= margin) {
						t.Fatalf("answered %+v, but the sets are %.3f m apart\n%+v", a, margin, c)
					}
					lost = append(lost, margin-float64(a.Margin))
					continue
				}
				touched++
				if first <= c.guard && a.NotBefore > first {
					t.Fatalf("answered %+v, but the sets touch after %v\n%+v", a, first, c)
				}
				if margin > 0 {
					needless = append(needless, margin)
					if margin > kind.excess {
						t.Errorf("answered %+v, but the sets are %.1f m apart\n%+v", a, margin, c)
					}
				}
			}
			sort.Float64s(needless)
			sort.Float64s(lost)
			t.Logf("%d trials, %d touched, %d of them without need: by %v m; margin understated by a median of %.1f m", n, touched, len(needless), needless, lost[len(lost)/2])
		})
	}
}
