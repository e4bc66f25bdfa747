package encounter

import (
	"maps"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"pgregory.net/rapid"
)

// edge draws a trial near the edge, from a seed that rapid can shrink only as a
// whole: the scenes are made for the edge, which a shrunk one would leave.
func edge(t *rapid.T) (*rand.Rand, trial) {
	g := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
	c := grazing(g, rapid.SampledFrom([]float64{1, 4, 15}).Draw(t, "age"))
	if rapid.IntRange(0, 3).Draw(t, "low") == 0 { // about the launch, and behind it
		d := tilted(g, c.k.Axis, math.Pi)
		c.r.Position = c.k.Launch.Add(d.Mul(between(g, 0, 4000))).Sub(c.r.Velocity.Mul(c.at.Sub(c.r.At).Seconds()))
	}
	switch rapid.IntRange(0, 5).Draw(t, "knowledge") {
	case 0:
		c.r.CourseKnown = false
	case 1:
		c.r.ClimbKnown = false
	case 2:
		c.r.AltitudeKnown = false
	}
	return g, c
}

// allowances are all the numbers of a question that only widen something.
func allowances(c *trial) map[string]func(by float64) {
	length := func(p *geometry.Length) func(float64) { return func(by float64) { *p += geometry.Length(by * 60) } }
	angle := func(p *s1.Angle) func(float64) { return func(by float64) { *p += s1.Angle(by) * s1.Degree } }
	after := func(p *time.Duration) func(float64) { return func(by float64) { *p += time.Duration(by * 0.5e9) } }
	speed := func(p *geometry.Speed) func(float64) { return func(by float64) { *p += geometry.Speed(by * 10) } }
	push := func(p *geometry.Acceleration) func(float64) {
		return func(by float64) { *p += geometry.Acceleration(by * 4) }
	}
	return map[string]func(by float64){
		"half-angle": angle(&c.k.HalfAngle), "radius": length(&c.k.Radius), "ceiling": length(&c.k.Ceiling), "extent": length(&c.k.Extent),
		"axis error": angle(&c.k.AxisError), "axis rate": angle(&c.k.AxisRate), "guard": after(&c.guard),
		"early": after(&c.r.Early), "late": after(&c.r.Late),
		"position": length(&c.r.PositionError.Horizontal), "height": length(&c.r.PositionError.Vertical),
		"velocity": speed(&c.r.VelocityError.Horizontal), "climb error": speed(&c.r.VelocityError.Vertical),
		"horizontal acceleration": push(&c.m.HorizontalAcceleration), "vertical acceleration": push(&c.m.VerticalAcceleration),
		"speed": speed(&c.m.Speed), "climb": speed(&c.m.Climb),
	}
}

// A larger allowance never turns touched into clear, and never makes the
// earliest touch later.
func TestLargerAllowancesNeverClear(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		for range 10 {
			g, c := edge(t)
			before := c.touch()
			for _, name := range slices.Sorted(maps.Keys(allowances(&c))) {
				wider := c
				allowances(&wider)[name](g.Float64() * g.Float64())
				after := wider.touch()
				if after.Clear && !before.Clear {
					t.Fatalf("%s: %+v became %+v\n%+v\n%+v", name, before, after, c, wider)
				}
				if !after.Clear && !before.Clear && after.NotBefore > before.NotBefore+1 { // 1 ns of rounding
					t.Fatalf("%s: the earliest touch went from %+v to %+v\n%+v\n%+v", name, before, after, c, wider)
				}
			}
		}
	})
}

// A report that knows less is never clearer.
func TestLessKnowledgeNeverClears(t *testing.T) {
	less := map[string]func(*Report){
		"no course":   func(r *Report) { r.CourseKnown = false },
		"no climb":    func(r *Report) { r.ClimbKnown = false },
		"no altitude": func(r *Report) { r.AltitudeKnown = false },
		"nothing":     func(r *Report) { r.CourseKnown, r.ClimbKnown, r.AltitudeKnown = false, false, false },
	}
	rapid.Check(t, func(t *rapid.T) {
		for range 20 {
			_, c := edge(t)
			before := c.touch()
			for name, do := range less {
				bare := c
				do(&bare.r)
				if after := bare.touch(); after.Clear && !before.Clear {
					t.Fatalf("%s: %+v became %+v\n%+v", name, before, after, c)
				}
			}
		}
	})
}

// Turning the whole scene about the vertical changes nothing but rounding.
func TestTurningTheSceneChangesNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		for range 20 {
			g, c := edge(t)
			s, k := math.Sincos(between(g, 0, 2*math.Pi))
			turn := func(v *r3.Vector) { *v = r3.Vector{X: v.X*k - v.Y*s, Y: v.X*s + v.Y*k, Z: v.Z} }
			turned := c
			turn(&turned.k.Launch)
			turn(&turned.k.Axis)
			turn(&turned.r.Position)
			turn(&turned.r.Velocity)
			a, b := c.touch(), turned.touch()
			if d := math.Abs(float64(a.Margin - b.Margin)); !(d <= 1e-6) {
				t.Fatalf("%+v became %+v\n%+v", a, b, c)
			}
			if a.Clear != b.Clear && math.Abs(float64(a.Margin)) > 1e-4 {
				t.Fatalf("%+v became %+v\n%+v", a, b, c)
			}
		}
	})
}

// numbers calls do for every float64 field under v.
func numbers(v reflect.Value, path string, do func(path string, f reflect.Value)) {
	switch v.Kind() {
	case reflect.Float64:
		do(path, v)
	case reflect.Struct:
		if v.Type() == reflect.TypeFor[time.Time]() {
			return
		}
		for i := range v.NumField() {
			numbers(v.Field(i), path+"."+v.Type().Field(i).Name, do)
		}
	}
}

// Not a number anywhere, infinity anywhere, and sizes below zero: touched, with
// a margin that is not a number.
func TestWhatIsNotANumberTouches(t *testing.T) {
	c := trial{k: usual(40, 60), m: Civil(), r: airliner(r3.Vector{X: 15e3, Y: -8e3, Z: 9e3}), at: epoch, guard: usualGuard}
	if a := c.touch(); !a.Clear {
		t.Fatalf("the sound question answers %+v", a)
	}
	count := 0
	try := func(name string, part func(*trial) reflect.Value) {
		numbers(part(&c), name, func(path string, f reflect.Value) {
			for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
				old := f.Float()
				f.SetFloat(x)
				if a := c.touch(); a.Clear || !math.IsNaN(float64(a.Margin)) || a.NotBefore != 0 {
					t.Errorf("%s = %v answers %+v", path, x, a)
				}
				f.SetFloat(old)
				count++
			}
		})
	}
	try("KeepOut", func(c *trial) reflect.Value { return reflect.ValueOf(&c.k).Elem() })
	try("Report", func(c *trial) reflect.Value { return reflect.ValueOf(&c.r).Elem() })
	try("Motion", func(c *trial) reflect.Value { return reflect.ValueOf(&c.m).Elem() })
	if count < 3*24 {
		t.Errorf("only %d fields tried", count/3)
	}
	for name, do := range map[string]func(*trial){
		"radius below zero":         func(c *trial) { c.k.Radius = -1 },
		"extent below zero":         func(c *trial) { c.k.Extent = -1 },
		"half-angle below zero":     func(c *trial) { c.k.HalfAngle = -1e-3 },
		"axis error below zero":     func(c *trial) { c.k.AxisError = -1e-9 },
		"axis rate below zero":      func(c *trial) { c.k.AxisRate = -1e-9 },
		"half-angle too wide":       func(c *trial) { c.k.HalfAngle = 81 * s1.Degree },
		"no axis":                   func(c *trial) { c.k.Axis = r3.Vector{} },
		"ceiling under the launch":  func(c *trial) { c.k.Ceiling = 12 },
		"guard below zero":          func(c *trial) { c.guard = -1 },
		"early below zero":          func(c *trial) { c.r.Early = -1 },
		"late below zero":           func(c *trial) { c.r.Late = -1 },
		"position error below zero": func(c *trial) { c.r.PositionError.Horizontal = -1 },
		"height error below zero":   func(c *trial) { c.r.PositionError.Vertical = -1 },
		"velocity error below zero": func(c *trial) { c.r.VelocityError.Horizontal = -1 },
		"climb error below zero":    func(c *trial) { c.r.VelocityError.Vertical = -1 },
		"acceleration below zero":   func(c *trial) { c.m.HorizontalAcceleration = -1 },
		"speed below zero":          func(c *trial) { c.m.Speed = -1 },
	} {
		bad := c
		do(&bad)
		if a := bad.touch(); a.Clear || !math.IsNaN(float64(a.Margin)) {
			t.Errorf("%s answers %+v", name, a)
		}
	}
	// An age beyond all measure is no exception.
	for name, at := range map[string]time.Time{"no instant": {}, "far ahead": epoch.Add(time.Hour)} {
		bad := c
		bad.r.At = at
		if a := bad.touch(); a.Clear {
			t.Errorf("%s answers %+v", name, a)
		}
	}
	var zero Volume
	w := Of(&c.r, &c.m)
	if a := zero.Touch(&w); a.Clear {
		t.Errorf("a volume never set answers %+v", a)
	}
	if a := Against(nil, &w); a.Clear || !math.IsNaN(float64(a.Margin)) {
		t.Errorf("no volume at all answers %+v", a)
	}
	var v Volume
	v.Set(&c.k, c.at, c.guard)
	var none Reach
	if a := v.Touch(&none); a.Clear {
		t.Errorf("a reach of no report answers %+v", a)
	}
	if !none.Holds(r3.Vector{}, epoch, 0) {
		t.Error("a reach of no report does not hold everything")
	}
	bad := c.k
	bad.Radius = -1
	if v.Set(&bad, c.at, c.guard) {
		t.Error("a radius below zero is taken")
	}
	if a := v.Touch(&w); a.Clear {
		t.Errorf("a volume whose setting was refused answers %+v", a)
	}
}

// Several launches: the worst of them.
func TestSeveralLaunches(t *testing.T) {
	near, far := usual(40, 60), usual(40, 60)
	far.Launch = r3.Vector{X: -60e3}
	var v [2]Volume
	for i, k := range []KeepOut{far, near} {
		if !v[i].Set(&k, epoch, usualGuard) {
			t.Fatal("keep-out refused")
		}
	}
	m := Civil()
	r := airliner(near.Axis.Mul(9000))
	w := Of(&r, &m)
	if a := Against(v[:1], &w); !a.Clear {
		t.Errorf("the far launch answers %+v", a)
	}
	one, both := v[1].Touch(&w), Against(v[:], &w)
	if both.Clear || both != one {
		t.Errorf("both launches answer %+v, the touched one %+v", both, one)
	}
	turned := [...]Volume{v[1], v[0]}
	if a := Against(turned[:], &w); a != both {
		t.Errorf("in the other order %+v, not %+v", a, both)
	}
	var unset [2]Volume
	unset[0] = v[0]
	if a := Against(unset[:], &w); a.Clear || !math.IsNaN(float64(a.Margin)) {
		t.Errorf("with one launch unknown the answer is %+v", a)
	}
}

// Questions cost no memory.
func TestNothingIsAllocated(t *testing.T) {
	k, m := usual(40, 60), Civil()
	var v [1]Volume
	d := k.Dome(30*s1.Degree, usualGuard)
	for _, p := range []r3.Vector{{X: 90e3}, k.Axis.Mul(9000), k.Axis.Mul(9000).Add(r3.Vector{X: -1800})} {
		r := airliner(p)
		if n := testing.AllocsPerRun(100, func() {
			v[0].Set(&k, epoch, usualGuard)
			w := Of(&r, &m)
			Against(v[:], &w)
			Replaces(&w, &r)
			d.Quiet(&w)
		}); n != 0 {
			t.Errorf("at %v: %v allocations", p, n)
		}
	}
}
