package encounter

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// testdata/cpa_vectors.csv: 180 straight courses past a fixed ray from the
// origin, computed from the formulas in its head. Tolerance: one unit of the
// last printed digit, 1e-9.
func TestStraightCoursesMatchTheTable(t *testing.T) {
	f, err := os.Open("testdata/cpa_vectors.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	column := map[string]int{}
	for i, name := range rows[0] {
		column[name] = i
	}
	const digit = 1e-9 // one unit of the last printed digit
	worst := map[string]float64{}
	for _, row := range rows[1:] {
		cell := func(name string) string {
			i, ok := column[name]
			if !ok {
				t.Fatalf("no column %s", name)
			}
			return row[i]
		}
		num := func(name string) float64 {
			v, err := strconv.ParseFloat(cell(name), 64)
			if err != nil {
				t.Fatalf("row %s, %s: %v", row[0], name, err)
			}
			return v
		}
		check := func(name string, got float64) {
			t.Helper()
			d := math.Abs(got - num(name))
			worst[name] = max(worst[name], d)
			if !(d <= 1.01*digit) {
				t.Errorf("row %s: %s = %.12f, want %s", row[0], name, got, cell(name))
			}
		}
		c := Course{
			Axis:     geometry.FromHorizon(s1.Angle(num("beam_az_deg"))*s1.Degree, s1.Angle(num("beam_el_deg"))*s1.Degree),
			Position: r3.Vector{X: num("p_e_m"), Y: num("p_n_m"), Z: num("p_u_m")},
			Velocity: r3.Vector{X: num("v_e_mps"), Y: num("v_n_mps"), Z: num("v_u_mps")},
		}
		over := time.Duration(num("T_s") * 1e9)
		a := c.Closest(over)
		check("t_min_sep_s", a.SeparationAt.Seconds())
		check("min_sep_deg", a.Separation.Degrees())
		check("t_min_dist_s", a.DistanceAt.Seconds())
		check("min_dist_m", float64(a.Distance))
		passage := func(p Passage, in, out string) {
			t.Helper()
			if p.Ok != (cell(in) != "") {
				t.Errorf("row %s: inside %v, want %s=%q", row[0], p.Ok, in, cell(in))
				return
			}
			if p.Ok {
				check(in, p.In.Seconds())
				check(out, p.Out.Seconds())
			}
		}
		passage(c.InCone(s1.Angle(num("alpha_deg"))*s1.Degree, over), "cone_in_s", "cone_out_s")
		passage(c.InCylinder(geometry.Length(num("R_m")), over), "cyl_in_s", "cyl_out_s")
	}
	if len(rows) != 181 {
		t.Errorf("%d rows, want 180 and a head", len(rows))
	}
	t.Logf("worst differences: %v", worst)
}

// Rows computed with DAIDALUS C++ 2.0.4 (nasa/daidalus: CD2D), horizontal
// motion relative to a point: the same as past an upright beam. A circle of
// 5 NM, 300 s ahead; a closest approach in the past is now. s points from the
// intruder to the point, so the aircraft is at -s.
func TestHorizontalApproachMatchesDaidalus(t *testing.T) {
	for _, c := range []struct {
		sx, sy, vx, vy      float64
		tcpa, dcpa, in, out float64
	}{
		{-10000, 0, 200, 0, 50.000000000, 0, 3.700000, 96.300000},
		{-10000, 1000, 200, 0, 50.000000000, 1000, 3.970770, 96.029230},
		{-5000, -3000, 150, 60, 35.632183908, 928.476690885, 0, 92.661292},
		{-20000, 4000, 300, -100, 64.000000000, 2529.822128135, 35.831294, 92.168706},
		{3000, 2000, 50, 10, 0, math.Hypot(3000, 2000), 0, 114.212139}, // diverging: tcpa -65.384615385
	} {
		course := Course{Axis: r3.Vector{Z: 1}, Position: r3.Vector{X: c.sx, Y: c.sy, Z: 9000}, Velocity: r3.Vector{X: c.vx, Y: c.vy}}
		a := course.Closest(300 * time.Second)
		if !(math.Abs(a.DistanceAt.Seconds()-c.tcpa) <= 1e-9 && math.Abs(float64(a.Distance)-c.dcpa) <= 1e-9) {
			t.Errorf("%+v: closest %+v", c, a)
		}
		p := course.InCylinder(5*1852, 300*time.Second)
		if !p.Ok || !(math.Abs(p.In.Seconds()-c.in) <= 1e-6 && math.Abs(p.Out.Seconds()-c.out) <= 1e-6) {
			t.Errorf("%+v: passage %+v", c, p)
		}
	}
	// The diverging course's closest approach lies in the past: flown backward,
	// it is met at the printed time and distance.
	back := Course{Axis: r3.Vector{Z: 1}, Position: r3.Vector{X: 3000, Y: 2000, Z: 9000}, Velocity: r3.Vector{X: -50, Y: -10}}
	if a := back.Closest(300 * time.Second); !(math.Abs(a.DistanceAt.Seconds()-65.384615385) <= 1e-9 && math.Abs(float64(a.Distance)-1372.812945967) <= 1e-9) {
		t.Errorf("backward: %+v", a)
	}
}

func TestCoursesThatAreNone(t *testing.T) {
	good := Course{Axis: r3.Vector{Z: 2}, Position: r3.Vector{X: 100, Z: 1000}, Velocity: r3.Vector{X: 1}}
	for name, change := range map[string]func(*Course){
		"no axis":               func(c *Course) { c.Axis = r3.Vector{} },
		"position not a number": func(c *Course) { c.Position.Y = math.NaN() },
		"velocity infinite":     func(c *Course) { c.Velocity.Y = math.Inf(1) },
	} {
		c := good
		change(&c)
		if a := c.Closest(time.Second); !math.IsNaN(float64(a.Distance)) || !math.IsNaN(a.Separation.Radians()) {
			t.Errorf("%s: %+v", name, a)
		}
		if c.InCone(1, time.Second).Ok || c.InCylinder(1e9, time.Second).Ok {
			t.Errorf("%s is inside", name)
		}
	}
	still := good
	still.Velocity = r3.Vector{}
	if a := still.Closest(time.Second); a.DistanceAt != 0 || math.Abs(float64(a.Distance)-100) > 1e-9 {
		t.Errorf("at rest: %+v", a)
	}
	if p := still.InCylinder(100, time.Second); !p.Ok || p.In != 0 || p.Out != time.Second {
		t.Errorf("at rest on the edge: %+v", p)
	}
	under := good
	under.Position = r3.Vector{X: 3, Z: -4}
	under.Velocity = r3.Vector{}
	if a := under.Closest(time.Second); math.Abs(float64(a.Distance)-5) > 1e-12 {
		t.Errorf("behind the launch: %+v", a)
	}
}

// Turns at 3°/s and at 25° of bank; radii in m computed as V²/(g tan bank),
// g = 9.80665 m/s². Each stays in the reach of a report of its beginning, by
// the default bounds, as long as its acceleration is within them.
func TestTurnsStayInTheReach(t *testing.T) {
	const knot = 1852.0 / 3600
	m := Civil()
	for _, row := range []struct{ kt, bank3, radius3, rate25, radius25 float64 }{
		{100, 15.3588, 982.517, 5.09304, 578.740}, {120, 18.2426, 1179.020, 4.24420, 833.386}, {180, 26.3083, 1768.530, 2.82947, 1875.119},
		{250, 34.4767, 2456.291, 2.03722, 3617.127}, {300, 39.4892, 2947.550, 1.69768, 5208.663}, {600, 58.7514, 5895.099, 0.84884, 20834.651},
	} {
		v := row.kt * knot
		for _, c := range []struct{ radius, bankDeg, rateDeg float64 }{{row.radius3, row.bank3, 3}, {row.radius25, 25, row.rate25}} {
			rate := c.rateDeg * math.Pi / 180
			if lateral := 9.80665 * math.Tan(c.bankDeg*math.Pi/180); math.Abs(v*v/c.radius-lateral) > 1e-4*lateral || math.Abs(v/c.radius-rate) > 1e-5*rate {
				t.Errorf("%v kt: radius %v, bank %v and rate %v do not agree", row.kt, c.radius, c.bankDeg, c.rateDeg)
			}
			if a := v * v / c.radius; !(a <= float64(m.HorizontalAcceleration)) {
				t.Errorf("%v kt turns with %v m/s²", row.kt, a)
			}
			r := Report{At: epoch, AltitudeKnown: true, CourseKnown: true, Velocity: r3.Vector{Y: v}}
			w := Of(&r, &m)
			for s := 0.0; s < 60; s += 0.5 {
				sin, cos := math.Sincos(rate * s)
				if !w.Holds(r3.Vector{X: c.radius * (1 - cos), Y: c.radius * sin}, epoch.Add(time.Duration(s*1e9)), 0) {
					t.Errorf("%v kt: after %v s of turning at %v°/s outside the reach", row.kt, s, c.rateDeg)
				}
			}
		}
	}
}
