package crossing

import (
	"math"
	"strings"
	"testing"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
)

func plain() (Beam, Telescope, []Part) {
	return Beam{Site: earth.Position{Lat: -0.55, Lon: -0.07, Height: 2450}, Launch: r3.Vector{Z: 12}, Radius: 0.15, Spread: 5e-6, AimError: 30 * geometry.Arcsecond, Rate: 7.3e-5},
		Telescope{Position: r3.Vector{X: 140, Y: -60, Z: 3}, Field: 0.005, Aperture: 8, AimError: 5e-5, Rate: 7.3e-5},
		[]Part{Column(0), Sodium(0)}
}

// TestRefused spoils one value at a time.
func TestRefused(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, spoil := range map[string]func(*Beam, *Telescope, *[]Part){
		"site":                func(b *Beam, _ *Telescope, _ *[]Part) { b.Site.Lat = 2 },
		"launch must lie":     func(b *Beam, _ *Telescope, _ *[]Part) { b.Launch.X = nan },
		"launch must lie far": func(b *Beam, _ *Telescope, _ *[]Part) { b.Launch.X = 1e6 },
		"beam's radius":       func(b *Beam, _ *Telescope, _ *[]Part) { b.Radius = 0 },
		"beam's spread":       func(b *Beam, _ *Telescope, _ *[]Part) { b.Spread = -1e-9 },
		"beam's pointing":     func(b *Beam, _ *Telescope, _ *[]Part) { b.AimError = 0.06 },
		"beam's rate":         func(b *Beam, _ *Telescope, _ *[]Part) { b.Rate = nan },
		"telescope must lie":  func(_ *Beam, s *Telescope, _ *[]Part) { s.Position.Y = inf },
		"km from the launch": func(b *Beam, s *Telescope, _ *[]Part) {
			b.Launch.X, s.Position.X = -300e3, 300e3
		},
		"field radius":           func(_ *Beam, s *Telescope, _ *[]Part) { s.Field = -1 },
		"aperture":               func(_ *Beam, s *Telescope, _ *[]Part) { s.Aperture = 201 },
		"telescope's pointing":   func(_ *Beam, s *Telescope, _ *[]Part) { s.AimError = 4 },
		"telescope's rate":       func(_ *Beam, s *Telescope, _ *[]Part) { s.Rate = -1 },
		"1 to 4 parts, not 0":    func(_ *Beam, _ *Telescope, p *[]Part) { *p = nil },
		"1 to 4 parts, not 5":    func(_ *Beam, _ *Telescope, p *[]Part) { *p = make([]Part, 5) },
		"heights must rise":      func(_ *Beam, _ *Telescope, p *[]Part) { (*p)[1].Until = 80e3 },
		"heights must rise, NaN": func(_ *Beam, _ *Telescope, p *[]Part) { (*p)[1].Until = geometry.Length(nan) },
		"not above the launch":   func(_ *Beam, _ *Telescope, p *[]Part) { (*p)[0].Until = 2000 },
		"halo":                   func(_ *Beam, _ *Telescope, p *[]Part) { (*p)[0].Halo = -1 },
	} {
		b, s, p := plain()
		spoil(&b, &s, &p)
		pair, err := Prepare(b, s, p...)
		word, _, _ := strings.Cut(name, ",")
		word = strings.TrimSuffix(word, " far")
		if name == "1 to 4 parts, not 0" || name == "1 to 4 parts, not 5" {
			word = name
		}
		if err == nil || !strings.Contains(err.Error(), word) {
			t.Errorf("%s: error %v", name, err)
		}
		if got := pair.Margin(r3.Vector{Z: 1}, r3.Vector{Z: 1}); !math.IsNaN(got.Margin) {
			t.Errorf("%s: a refused pair answers %+v", name, got)
		}
		if got := pair.HeightAt(r3.Vector{Z: 1}, 1); !math.IsNaN(float64(got)) {
			t.Errorf("%s: a refused pair gives the height %v", name, got)
		}
	}
}

// TestUnknown gives directions that are none.
func TestUnknown(t *testing.T) {
	b, s, p := plain()
	pair, err := Prepare(b, s, p...)
	if err != nil {
		t.Fatal(err)
	}
	up := r3.Vector{Z: 1}
	for _, v := range []r3.Vector{{}, {X: math.NaN(), Z: 1}, {Z: math.Inf(1)}, {Z: 1.001}, {Z: 0.5}} {
		for _, got := range []Result{pair.Margin(v, up), pair.Margin(up, v)} {
			if !math.IsNaN(got.Margin) || !math.IsNaN(got.Rate) {
				t.Errorf("%v: %+v", v, got)
			}
		}
	}
	if got := pair.Margin(up, up.Mul(1+1e-9)); math.IsNaN(got.Margin) {
		t.Errorf("a direction off unit length by rounding: %+v", got)
	}
}

// TestHeightAt compares with the sphere's formula straight up, and checks that
// the least point of a star lies within it.
func TestHeightAt(t *testing.T) {
	b, s, p := plain()
	pair, err := Prepare(b, s, p[1])
	if err != nil {
		t.Fatal(err)
	}
	if got := pair.HeightAt(r3.Vector{Z: 1}, 1000); math.Abs(float64(got)-3462) > 1e-6 {
		t.Errorf("height %v, want 3462 m", got)
	}
	for el := 0.2; el < 1.5; el += 0.1 {
		dir := r3.Vector{X: math.Cos(el), Z: math.Sin(el)}
		r := pair.Margin(dir, dir)
		// 20 m/tan: what the pointing error does to the ends.
		if h := float64(pair.HeightAt(dir, r.Slant)); h < 80e3-100 || h > 110e3+100 {
			t.Errorf("elevation %.1f: least at %.0f m", el, h)
		}
	}
}

// TestInTheWay passes a beam by a telescope ever nearer.
func TestInTheWay(t *testing.T) {
	b, s, p := plain()
	b.Spread, b.AimError, b.Radius = 0, 0, 0.2
	s.Position, s.Aperture = r3.Vector{X: 50, Z: 12}, 4
	for _, c := range []struct {
		miss float64
		want bool
	}{{2.5, false}, {2.41, false}, {2.39, true}, {1, true}, {0, true}} {
		// Toward a point that the beam passes by c.miss above the telescope.
		el := math.Asin(c.miss / 50)
		dir := r3.Vector{X: math.Cos(el), Z: math.Sin(el)}
		pair, err := Prepare(b, s, p...)
		if err != nil {
			t.Fatal(err)
		}
		got := pair.Margin(dir, r3.Vector{Y: 1})
		if got.InTheWay != c.want || c.want != (got.Margin < 0) {
			t.Errorf("a miss of %v m: %+v", c.miss, got)
		}
	}
}

func TestNoAllocation(t *testing.T) {
	b, s, p := plain()
	pair, err := Prepare(b, s, p...)
	if err != nil {
		t.Fatal(err)
	}
	v := r3.Vector{X: 0.6, Z: 0.8}
	if n := testing.AllocsPerRun(100, func() { pair.Margin(v, v) }); n != 0 {
		t.Errorf("%v allocations", n)
	}
}
