package encounter

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

func trials(t *testing.T, usual, long int) int {
	t.Helper()
	if os.Getenv("BEAMWARD_LONG") == "1" {
		return long
	}
	return usual
}

// Every aircraft that truly enters the keep-out during the guard, with all the
// theorem's assumptions at their edges, is answered as touched, and no later
// than it enters.
func TestNoIntruderIsCalledClear(t *testing.T) {
	n := trials(t, 60000, 3000000)
	g := rand.New(rand.NewPCG(1, 7))
	early := 0.0
	for i := range n {
		c := intruder(g, i%manners)
		a := c.touch()
		if a.Clear || !(a.Margin <= 0) {
			t.Fatalf("trial %d is in the keep-out after %v, but answered %+v\n%+v", i, c.enters, a, c)
		}
		if a.NotBefore > c.enters {
			t.Fatalf("trial %d enters after %v, but answered %+v\n%+v", i, c.enters, a, c)
		}
		w := Of(&c.r, &c.m)
		if !w.Holds(c.where, c.at.Add(c.enters), 0) {
			t.Fatalf("trial %d: the true place is outside the reach\n%+v", i, c)
		}
		early += (c.enters - a.NotBefore).Seconds()
	}
	t.Logf("%d intruders, all touched; the earliest touch is %.2f s before the entry on average", n, early/float64(n))
}

// The intruders have teeth: with any one duty of the theorem left out, some are
// called clear.
func TestIntrudersFindEachOmission(t *testing.T) {
	omissions := []struct {
		name string
		do   func(*trial)
	}{
		{"latency dropped", func(c *trial) { c.r.Early, c.r.Late = 0, 0 }},
		{"lateness dropped", func(c *trial) { c.r.Late = 0 }},
		{"earliness dropped", func(c *trial) { c.r.Early = 0 }},
		{"age of the report dropped", func(c *trial) { c.r.At = c.at }},
		{"vertical motion ignored", func(c *trial) { c.m.VerticalAcceleration, c.r.VelocityError.Vertical, c.r.Velocity.Z = 0, 0, 0 }},
		{"vertical error ignored", func(c *trial) { c.r.PositionError.Vertical = 0 }},
		{"vertical acceleration ignored", func(c *trial) { c.m.VerticalAcceleration = 0 }},
		{"position error ignored", func(c *trial) { c.r.PositionError.Horizontal = 0 }},
		{"velocity error ignored", func(c *trial) { c.r.VelocityError.Horizontal = 0 }},
		{"acceleration halved", func(c *trial) { c.m.HorizontalAcceleration /= 2 }},
		{"straight course believed", func(c *trial) { c.m.HorizontalAcceleration, c.m.VerticalAcceleration = 0, 0 }},
		{"speed bound too low", func(c *trial) { c.m.Speed *= 0.9; c.r.CourseKnown = false }},
		{"keep-out not widened", func(c *trial) { c.k.AxisError, c.k.AxisRate, c.k.Extent = 0, 0, 0 }},
		{"extent dropped", func(c *trial) { c.k.Extent = 0 }},
		{"aim error dropped", func(c *trial) { c.k.AxisError = 0 }},
		{"beam's motion dropped", func(c *trial) { c.k.AxisRate = 0 }},
		{"cylinder dropped", func(c *trial) { c.k.Radius = 0 }},
		{"cone dropped", func(c *trial) { c.k.HalfAngle = 0 }},
		{"guard halved", func(c *trial) { c.guard /= 2 }},
		{"guard dropped", func(c *trial) { c.guard = 0 }},
	}
	const n = 15000
	missed := make([]int, len(omissions))
	g := rand.New(rand.NewPCG(1, 7))
	for i := range n {
		c := intruder(g, i%manners)
		for k, o := range omissions {
			less := c
			o.do(&less)
			if less.touch().Clear {
				missed[k]++
			}
		}
	}
	for k, o := range omissions {
		t.Logf("%-30s %6d of %d intruders missed", o.name, missed[k], n)
		if missed[k] == 0 {
			t.Errorf("%s: not one of %d intruders shows it", o.name, n)
		}
	}
}

// An aircraft that flies out along the beam, below it and beside it, meets the
// cylinder only where the axis' error has carried it far enough aside: at the
// end of the guard.
func TestCylinderSpreadsAlongTheWayOut(t *testing.T) {
	const elevation, out, speed = 25 * math.Pi / 180, 20e3, 300.0
	c := trial{at: epoch, guard: 6 * time.Second, m: Motion{Speed: speed}}
	c.k = KeepOut{Axis: r3.Vector{Y: math.Cos(elevation), Z: math.Sin(elevation)}, Radius: 300, Ceiling: 17000, AxisError: 2 * s1.Degree}
	side := 300 + out*math.Tan(2*math.Pi/180)
	for _, d := range []struct {
		off   float64
		clear bool
	}{{-1, false}, {25, true}} {
		end := c.k.Axis.Mul(out).Add(r3.Vector{X: side + d.off})
		c.r = Report{At: epoch, AltitudeKnown: true, CourseKnown: true, ClimbKnown: true, Velocity: r3.Vector{Y: speed}}
		c.r.Position = end.Sub(c.r.Velocity.Mul(c.guard.Seconds()))
		if a := c.touch(); a.Clear != d.clear {
			t.Errorf("%v m beside its edge: %+v", d.off, a)
		}
	}
}

// A report stamped with the true place of a keep-out's point touches it,
// whatever the keep-out: the planes hold all of it.
func TestEveryPointOfTheKeepOutTouches(t *testing.T) {
	g := rand.New(rand.NewPCG(3, 9))
	for i := range 100000 {
		c := trial{k: someKeepOut(g), at: epoch, guard: span(g, 0, 5)}
		if g.IntN(4) == 0 {
			c.k.HalfAngle *= 8
		}
		b := tilted(g, c.k.Axis, c.k.AxisError.Radians()+c.k.AxisRate.Radians()*c.guard.Seconds())
		c.r = Report{At: epoch, Position: pointOf(g, &c.k, b, nil), AltitudeKnown: true}
		if a := c.touch(); a.Clear {
			t.Fatalf("point %d is in the keep-out, but answered %+v\n%+v", i, a, c)
		}
	}
}
