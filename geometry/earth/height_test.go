package earth

import (
	"math"
	"math/rand/v2"
	"testing"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Computed from d = -(R+h) cos z + √((R+H)² - ((R+h) sin z)²), R = 6371000 m;
// half a unit of the last digit.
func TestShellRange(t *testing.T) {
	for _, c := range []struct {
		h, shell geometry.Length
		want     [6]float64 // at zenith angles of 0, 30, 45, 60, 70 and 80 degrees
	}{
		{0, 92090, [6]float64{92090.000, 106085.037, 129320.038, 180402.791, 256144.155, 444757.666}},
		{2635, 92090, [6]float64{89455.000, 103056.546, 125644.850, 175341.778, 249146.621, 433765.290}},
		{2635, 80000, [6]float64{77365.000, 89155.557, 108762.296, 152042.135, 216792.906, 382228.872}},
		{2635, 105000, [6]float64{102365.000, 117891.147, 143639.494, 200092.399, 283291.091, 487059.545}},
		{4160, 92090, [6]float64{87930.000, 101303.628, 123517.177, 172410.116, 245088.660, 427368.430}},
	} {
		for i, z := range []s1.Angle{0, 30, 45, 60, 70, 80} {
			got := ShellRange(c.h, c.shell, (90-z)*s1.Degree)
			within(t, "range to the shell", float64(got), c.want[i], 0.51e-3)
		}
	}
	within(t, "at the shell", float64(ShellRange(90e3, 90e3, 0.5)), 0, 1e-9)
	for _, bad := range []geometry.Length{ShellRange(2, 1, 1), ShellRange(geometry.Length(math.NaN()), 1, 1), ShellRange(0, 1, s1.Angle(math.NaN()))} {
		if !math.IsNaN(float64(bad)) {
			t.Errorf("of no use: %v", bad)
		}
	}
}

// The line of sight of pymap3d's tests: from 1 km above 10 N 20 W, 45 degrees
// down to the north-east, where it meets the ellipsoid. To a unit of the
// last printed digits, which are cut rather than rounded.
func TestLookDownToTheGround(t *testing.T) {
	frame := FrameAt(degrees(10, -20, 1000))
	down := geometry.FromHorizon(45*s1.Degree, -45*s1.Degree)
	at, ok := frame.RangeToHeight(down, 0)
	if !ok {
		t.Fatal("no ground below")
	}
	within(t, "range", float64(at), 1414.324795, 1e-5)
	ground := FromECEF(frame.ECEF(down.Mul(float64(at))))
	within(t, "latitude", ground.Lat.Degrees(), 10.00639336, 0.51e-8)
	within(t, "longitude", ground.Lon.Degrees(), -19.993549978, 1e-9)
}

// Up or down, the distance found is at the height asked for, and before it the
// beam has not been there.
func TestRangeToHeight(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	up, down, none := 0, 0, 0
	for range 20_000 {
		site := Position{s1.Angle(math.Asin(2*r.Float64() - 1)), s1.Angle(r.Float64() * 2 * math.Pi), geometry.Length(-400 + 6e3*r.Float64())}
		height := geometry.Length(-1e3 + 200e3*r.Float64()*r.Float64()*r.Float64())
		dir := geometry.FromHorizon(s1.Angle(r.Float64()*2*math.Pi), s1.Angle((r.Float64()-0.3)*math.Pi/1.4))
		frame := FrameAt(site)
		at, ok := frame.RangeToHeight(dir, height)
		switch {
		case ok && height > site.Height:
			up++
		case ok:
			down++
		default:
			none++
			if height > site.Height || !math.IsNaN(float64(at)) {
				t.Fatalf("%v along %v never at %v m (%v)", site, dir, height, at)
			}
			// A beam that never comes down to the height: look along it.
			for s := geometry.Length(0); s < 400e3; s += 1000 {
				if frame.HeightAlong(dir, s) < height {
					t.Fatalf("%v along %v is below %v m at %v, yet never there", site, dir, height, s)
				}
			}
			continue
		}
		within(t, "height there", float64(frame.HeightAlong(dir, at)), float64(height), 2e-6)
		if !(at >= 0) {
			t.Fatalf("at %v", at)
		}
		for i := range 20 {
			s := at * geometry.Length(i) / 20
			if h := frame.HeightAlong(dir, s); (h < height) != (site.Height < height) && math.Abs(float64(h-height)) > 1e-5 {
				t.Fatalf("%v along %v: at %v m before %v m, at %v of %v", site, dir, h, height, s, at)
			}
		}
	}
	if up < 1000 || down < 1000 || none < 1000 {
		t.Errorf("cases too few: up %d, down %d, none %d", up, down, none)
	}
}

func TestRangeToHeightCornerCases(t *testing.T) {
	frame := FrameAt(degrees(-31.5, -4, 2450))
	zenith := r3.Vector{Z: 1}
	at, ok := frame.RangeToHeight(zenith, 92000)
	within(t, "straight up", float64(at), 92000-2450, 2e-6)
	if !ok {
		t.Error("straight up: not found")
	}
	at, ok = frame.RangeToHeight(zenith, 2450)
	if !ok || math.Abs(float64(at)) > 2e-6 {
		t.Errorf("at the origin's own height: %v, %v", at, ok)
	}
	nan := math.NaN()
	for _, c := range []struct {
		dir    r3.Vector
		height float64
	}{
		{zenith, 0}, {zenith, nan}, {zenith, math.Inf(1)}, {r3.Vector{}, 9e3}, {r3.Vector{Z: 2}, 9e3}, {r3.Vector{X: nan}, 9e3},
		{r3.Vector{Z: -1}, -6.4e6},
	} {
		if at, ok := frame.RangeToHeight(c.dir, geometry.Length(c.height)); ok || !math.IsNaN(float64(at)) {
			t.Errorf("%v to %v m: %v, %v", c.dir, c.height, at, ok)
		}
	}
}

// The Earth falls away: at 200 km along a level beam the ground is 3.1 km down.
func TestHeightAlongCurves(t *testing.T) {
	frame := FrameAt(degrees(-31.5, -4, 0))
	for az := s1.Angle(0); az < 2*math.Pi; az += 0.3 {
		within(t, "height", float64(frame.HeightAlong(geometry.FromHorizon(az, 0), 200e3)), 200e3*200e3/2/6.37e6, 20)
	}
}

// Directions and points turn back to what they were.
func TestFrameThereAndBack(t *testing.T) {
	frame := FrameAt(degrees(61.2, 170, 300))
	v := r3.Vector{X: 1, Y: -2, Z: 3}
	apart(t, "direction", frame.Turn(frame.TurnBack(v)), v, 1e-15)
	apart(t, "point", frame.ENU(frame.ECEF(v)), v, 2e-9)
	apart(t, "origin", frame.Origin(), degrees(61.2, 170, 300).ECEF(), 0)
}

func BenchmarkEarth(b *testing.B) {
	frame, p := FrameAt(degrees(-31.5, -4, 2450)), degrees(-31.2, -4.3, 11000)
	v, dir := p.ECEF(), geometry.FromHorizon(1, 0.8)
	b.Run("FromECEF", func(b *testing.B) {
		for b.Loop() {
			FromECEF(v)
		}
	})
	b.Run("Sight", func(b *testing.B) {
		for b.Loop() {
			frame.Sight(p)
		}
	})
	b.Run("RangeToHeight", func(b *testing.B) {
		for b.Loop() {
			frame.RangeToHeight(dir, 92000)
		}
	})
}
