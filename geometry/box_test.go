package geometry

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// slowBox is Box.Margin by its definition: the least separation from points
// strewn over the edges, which can be too large by half their spacing.
func slowBox(b Box, dir r3.Vector, spacing float64) float64 {
	width := b.width()
	var edge []r3.Vector
	strew := func(from, to float64, at func(float64) r3.Vector) {
		n := math.Ceil((to - from) / spacing)
		for i := 0.0; i <= n; i++ {
			edge = append(edge, at(from+(to-from)*i/n))
		}
	}
	for _, el := range []s1.Angle{b.ElFrom, b.ElTo} {
		if math.Abs(float64(el)) < math.Pi/2 {
			strew(0, width, func(az float64) r3.Vector { return FromHorizon(b.AzFrom+s1.Angle(az), el) })
		}
	}
	if width < fullCircle {
		for _, az := range []s1.Angle{b.AzFrom, b.AzTo} {
			strew(float64(b.ElFrom), float64(b.ElTo), func(el float64) r3.Vector { return FromHorizon(az, s1.Angle(el)) })
		}
	}
	least := math.Pi
	for _, e := range edge {
		least = min(least, float64(Separation(e, dir)))
	}
	az, el := ToHorizon(dir)
	past := math.Mod(float64(az-b.AzFrom)+2*math.Pi, 2*math.Pi)
	if past <= width && el >= b.ElFrom && el <= b.ElTo {
		return -least
	}
	return least
}

// randomBox favours what is awkward: the poles, the full circle, north.
func randomBox(r *rand.Rand) Box {
	for {
		b := Box{
			s1.Angle(r.Float64() * 2 * math.Pi), s1.Angle(r.Float64() * 2 * math.Pi),
			s1.Angle((r.Float64() - 0.5) * math.Pi), s1.Angle((r.Float64() - 0.5) * math.Pi),
		}
		switch r.IntN(8) {
		case 0:
			b.ElTo = math.Pi / 2
		case 1:
			b.ElFrom = -math.Pi / 2
		case 2:
			b.AzFrom, b.AzTo = 0, 2*math.Pi
		case 3:
			b.AzFrom, b.AzTo, b.ElTo = 0, 2*math.Pi, math.Pi/2
		case 4:
			b.AzFrom, b.AzTo = 6.1, 0.2
		case 5:
			b.AzTo = b.AzFrom + s1.Angle(r.Float64()*1e-2)
		}
		if b.Valid() {
			return b
		}
	}
}

// near returns a direction that is, half the time, close to a zenith or to a
// corner of b, where the distance changes its law.
func near(r *rand.Rand, b Box) r3.Vector {
	away := math.Exp(-12 * r.Float64())
	switch r.IntN(4) {
	case 0:
		return FromHorizon(s1.Angle(r.Float64()*2*math.Pi), s1.Angle(math.Pi/2-away))
	case 1:
		return FromHorizon(b.AzTo, b.ElTo).Add(randomDirection(r).Mul(away)).Normalize()
	}
	return randomDirection(r)
}

func TestBoxMarginAgainstItsDefinition(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	const spacing = 4e-3
	for range 3000 {
		b := randomBox(r)
		dir := near(r, b)
		got, want := b.Margin(dir), slowBox(b, dir, spacing)
		if math.Signbit(got) != math.Signbit(want) && math.Abs(want) > spacing {
			t.Fatalf("%v of %v: margin %v, by definition %v", dir, b, got, want)
		}
		if d := math.Abs(want) - math.Abs(got); d < -1e-12 || d > spacing/2+1e-12 {
			t.Fatalf("%v of %v: margin %v, by definition %v", dir, b, got, want)
		}
	}
}

// The margin changes by no more than the direction turns.
func TestBoxMarginRate(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 300_000 {
		b := randomBox(r)
		from := near(r, b)
		to := from.Add(randomDirection(r).Mul(math.Exp(-16 * r.Float64()))).Normalize()
		change, turn := math.Abs(b.Margin(from)-b.Margin(to)), float64(Separation(from, to))
		if !(change <= turn+2e-15) {
			t.Fatalf("%v: from %v to %v the margin changes by %v, the direction by %v", b, from, to, change, turn)
		}
	}
}

func TestBoxMarginKnownCases(t *testing.T) {
	deg := func(az0, az1, el0, el1 s1.Angle) Box {
		return Box{az0 * s1.Degree, az1 * s1.Degree, el0 * s1.Degree, el1 * s1.Degree}
	}
	for _, c := range []struct {
		box    Box
		az, el s1.Angle
		want   float64 // degrees
	}{
		{deg(60, 120, 30, 45), 90, 50, 5},
		{deg(60, 120, 30, 45), 90, 44, -1},
		{deg(60, 120, 30, 45), 90, 10, 20},
		{deg(350, 10, 30, 45), 0, 40, -5},
		{deg(350, 10, 30, 45), 359, 31, -1},
		{deg(350, 10, -10, 10), 20, 0, 10},
		{deg(350, 10, -10, 10), 340, 0, 10},
		{deg(350, 10, -10, 10), 180, 0, math.Acos(-math.Pow(math.Cos(math.Pi/18), 2)) / math.Pi * 180},
		{deg(0, 360, 30, 90), 123, 20, 10},
		{deg(0, 360, 30, 90), 123, 85, -55}, // the zenith is no edge
		{deg(0, 360, 30, 90), 123, 90, -60}, // nor is it one seen from itself
		{deg(0, 360, 30, 89), 123, 90, 1},   // a hole at the zenith
		{deg(0, 360, -90, -10), 12, -90, -80},
		{deg(0, 360, -90, 90), 12, 34, -180}, // the whole sky
		{deg(0, 90, 30, 90), 225, 80, 10},    // nearest at the zenith corner
		{deg(0, 90, 30, 90), 180, 85, 5},
		{deg(0, 180, 0, 90), 270, 60, 30}, // across the zenith
		{deg(0, 180, 0, 90), 90, 60, -30},
		{deg(0, 90, 0, 90), 45, 60, -math.Asin(math.Cos(math.Pi/3)*math.Sin(math.Pi/4)) / math.Pi * 180},
	} {
		got := c.box.Margin(FromHorizon(c.az*s1.Degree, c.el*s1.Degree)) / math.Pi * 180
		if math.Abs(got-c.want) > 1e-12 {
			t.Errorf("az %v el %v of %v: %v°, want %v°", float64(c.az), float64(c.el), c.box, got, c.want)
		}
	}
}

// Turning the box and the direction together about the vertical changes nothing.
func TestBoxMarginTurned(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for range 20_000 {
		b := randomBox(r)
		dir := near(r, b)
		by := s1.Angle(r.Float64() * 2 * math.Pi)
		turned := b
		if b.width() < fullCircle {
			turned.AzFrom = s1.Angle(math.Mod(float64(b.AzFrom+by), 2*math.Pi))
			turned.AzTo = s1.Angle(math.Mod(float64(b.AzTo+by), 2*math.Pi))
		}
		sin, cos := math.Sincos(float64(by))
		to := r3.Vector{X: dir.X*cos + dir.Y*sin, Y: dir.Y*cos - dir.X*sin, Z: dir.Z}
		if was, is := b.Margin(dir), turned.Margin(to); math.Abs(was-is) > 1e-14 {
			t.Fatalf("%v of %v: %v, turned by %v: %v", dir, b, was, by, is)
		}
	}
}

func TestBoxOfNoUse(t *testing.T) {
	nan := s1.Angle(math.NaN())
	for _, b := range []Box{
		{}, {1, 1, 0, 1}, {0, 1, 1, 1}, {0, 1, 1, 0.5}, {-0.1, 1, 0, 1}, {0, 6.3, 0, 1}, {0, 1, -1.6, 1}, {0, 1, 0, 1.6},
		{nan, 1, 0, 1}, {0, nan, 0, 1}, {0, 1, nan, 1}, {0, 1, 0, nan}, {2 * math.Pi, 0, 0, 1},
	} {
		if b.Valid() {
			t.Errorf("%v is valid", b)
		}
		if m := b.Margin(r3.Vector{Z: 1}); !math.IsNaN(m) {
			t.Errorf("%v: margin %v", b, m)
		}
	}
	good := Box{0, 1, 0, 1}
	for _, dir := range []r3.Vector{{}, {X: math.NaN()}, {Z: math.Inf(1)}} {
		if m := good.Margin(dir); !math.IsNaN(m) {
			t.Errorf("direction %v: margin %v", dir, m)
		}
	}
}

func BenchmarkMargin(b *testing.B) {
	dir := FromHorizon(1, 1)
	b.Run("cone", func(b *testing.B) {
		c := Cone{FromHorizon(2, 0.5), 0.1}
		for b.Loop() {
			c.Margin(dir)
		}
	})
	b.Run("box", func(b *testing.B) {
		c := Box{1, 2, 0.5, 0.7}
		for b.Loop() {
			c.Margin(dir)
		}
	})
}
