package earth

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

func degrees(lat, lon float64, height geometry.Length) Position {
	return Position{s1.Angle(lat) * s1.Degree, s1.Angle(lon) * s1.Degree, height}
}

// apart checks that two points are within tolerance metres in each component.
func apart(t *testing.T, what string, got, want r3.Vector, tolerance float64) {
	t.Helper()
	d := got.Sub(want)
	if !(math.Max(math.Abs(d.X), math.Max(math.Abs(d.Y), math.Abs(d.Z))) <= tolerance) {
		t.Errorf("%s: %v, want %v ± %g", what, got, want, tolerance)
	}
}

func within(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.12g, want %.12g ± %g", what, got, want, tolerance)
	}
}

// Every row of testdata/geodesy_vectors.csv (its head says where it is from),
// both ways, to 1 mm; the printed angles to 1e-8 degrees.
func TestGeodesyVectors(t *testing.T) {
	file, err := os.Open("testdata/geodesy_vectors.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	reader := csv.NewReader(file)
	reader.Comment = '#'
	rows, err := reader.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	const rowsInFile = 120
	if len(rows)-1 != rowsInFile {
		t.Fatalf("%d rows, want %d", len(rows)-1, rowsInFile)
	}
	const mm = 1e-3
	for _, row := range rows[1:] {
		var v [19]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(row[i], 64); err != nil {
				t.Fatal(err)
			}
		}
		site := degrees(v[1], v[2], geometry.Length(v[3]))
		target := degrees(v[4], v[5], geometry.Length(v[6]))
		siteECEF, targetECEF := r3.Vector{X: v[7], Y: v[8], Z: v[9]}, r3.Vector{X: v[10], Y: v[11], Z: v[12]}
		enu := r3.Vector{X: v[13], Y: v[14], Z: v[15]}
		frame := FrameAt(site)

		apart(t, row[0]+" site", site.ECEF(), siteECEF, mm)
		apart(t, row[0]+" target", target.ECEF(), targetECEF, mm)
		apart(t, row[0]+" ENU", frame.ENU(target.ECEF()), enu, mm)
		apart(t, row[0]+" back", frame.ECEF(enu), targetECEF, mm)
		apart(t, row[0]+" turned", frame.Turn(targetECEF.Sub(siteECEF)), enu, mm)
		apart(t, row[0]+" offset", site.Offset(enu).ECEF(), targetECEF, mm)
		apart(t, row[0]+" geodetic", FromECEF(targetECEF).ECEF(), targetECEF, 1e-6)
		within(t, row[0]+" height", float64(FromECEF(targetECEF).Height), v[6], mm)
		within(t, row[0]+" latitude, mm", (FromECEF(targetECEF).Lat-target.Lat).Radians()*6.4e9, 0, 1)
		within(t, row[0]+" longitude, mm", (FromECEF(targetECEF).Lon-target.Lon).Radians()*6.4e9*math.Cos(target.Lat.Radians()), 0, 1)

		sight := frame.Sight(target)
		within(t, row[0]+" azimuth", sight.Az.Degrees(), v[16], 1e-8)
		within(t, row[0]+" elevation", sight.El.Degrees(), v[17], 1e-8)
		within(t, row[0]+" range", float64(sight.Range), v[18], mm)
		apart(t, row[0]+" sighted", frame.Position(sight).ECEF(), target.ECEF(), 1e-6)
	}
}

// From the ERFA library's own test program, t_erfa_c.c: eraGd2gc and eraGc2gd
// on WGS 84, its tolerances 1e-7 m, 1e-14 rad, 1e-8 m.
func TestERFAGeodetic(t *testing.T) {
	apart(t, "gd2gc", Position{-0.5, 3.1, 2500}.ECEF(), r3.Vector{X: -5599000.5577049947, Y: 233011.67223479203, Z: -3040909.4706983363}, 1e-7)
	p := FromECEF(r3.Vector{X: 2e6, Y: 3e6, Z: 5.244e6})
	within(t, "gc2gd longitude", p.Lon.Radians(), 0.9827937232473290680, 1e-14)
	within(t, "gc2gd latitude", p.Lat.Radians(), 0.97160184819075459, 1e-14)
	within(t, "gc2gd height", float64(p.Height), 331.4172461426059892, 1e-8)
}

// IOGP publication 373-7-2, geocentric to topocentric, as in PROJ's
// test/gie/builtins.gie; tolerance 1 mm.
func TestIOGPTopocentric(t *testing.T) {
	want := r3.Vector{X: -189013.869, Y: -128642.040, Z: -4220.171}
	frame := FrameAt(FromECEF(r3.Vector{X: 3652755.3058, Y: 319574.6799, Z: 5201547.3536}))
	apart(t, "from ECEF", frame.ENU(r3.Vector{X: 3771793.968, Y: 140253.342, Z: 5124304.349}), want, 1e-3)
	frame = FrameAt(degrees(55, 5, 200))
	apart(t, "from positions", frame.ENU(degrees(53.80939444444444, 2.12955, 73).ECEF()), want, 1e-3)
}

// GeographicLib 2.1.2, CartConvert, to the six digits of a run; the manual page
// prints two and cuts the last off.
func TestCartConvert(t *testing.T) {
	p := degrees(33.3, 44.4, 6000)
	apart(t, "geocentric", p.ECEF(), r3.Vector{X: 3816209.604493, Y: 3737108.550254, Z: 3485109.572568}, 0.51e-6)
	apart(t, "local", FrameAt(degrees(33, 44, 20)).ENU(p.ECEF()), r3.Vector{X: 37288.973197, Y: 33374.294947, Z: 5783.646616}, 0.51e-6)
}

// The tests of pymap3d 2.9.1, to a unit of their last printed digits, which are
// cut rather than rounded.
func TestPymap3d(t *testing.T) {
	site := degrees(42, -82, 200)
	frame := FrameAt(site)
	apart(t, "ecef", site.ECEF(), r3.Vector{X: 660675.2518247, Y: -4700948.68316, Z: 4245737.66222}, 1e-5)
	s := Sight{33 * s1.Degree, 70 * s1.Degree, 1000}
	apart(t, "aer2ecef", frame.ECEF(s.ENU()), r3.Vector{X: 660930.19276, Y: -4701424.22296, Z: 4246579.60463}, 1e-5)
	apart(t, "aer2enu", s.ENU(), r3.Vector{X: 186.2775, Y: 286.8422, Z: 939.6926}, 0.51e-4)
	p := frame.Position(Sight{33 * s1.Degree, 77 * s1.Degree, 1000})
	within(t, "aer2geodetic latitude", p.Lat.Degrees(), 42.0016981935, 1e-10)
	within(t, "aer2geodetic longitude", p.Lon.Degrees(), -81.99852, 0.51e-5)
	within(t, "aer2geodetic height", float64(p.Height), 1174.374035, 0.51e-6)
}

// The rows computed with pymap3d 2.9.1 across the date line and over the pole,
// to half a unit of their last digits.
func TestAcrossTheDateLineAndThePole(t *testing.T) {
	for _, c := range []struct {
		site, target Position
		enu          r3.Vector
		az, el       float64
		distance     float64
	}{
		{degrees(0, 179.9, 100), degrees(0.1, -179.9, 9000), r3.Vector{X: 22295.235078, Y: 11073.130036, Z: 8851.424303}, 63.588291737, 19.573868988, 26420.435806},
		{degrees(89.5, 0, 0), degrees(89.6, 180, 10000), r3.Vector{Y: 100677.499251, Z: 9209.264475}, 0, 5.226467304, 101097.820984},
	} {
		frame := FrameAt(c.site)
		s := frame.Sight(c.target)
		apart(t, "ENU", frame.ENU(c.target.ECEF()), c.enu, 0.51e-6)
		within(t, "azimuth", math.Remainder(s.Az.Degrees()-c.az, 360), 0, 0.51e-9)
		within(t, "elevation", s.El.Degrees(), c.el, 0.51e-9)
		within(t, "range", float64(s.Range), c.distance, 0.51e-6)
	}
}

func TestGeodeticLimits(t *testing.T) {
	const a, b = 6378137.0, 6356752.314245179
	for _, c := range []struct {
		p Position
		v r3.Vector
	}{
		{degrees(0, 0, 0), r3.Vector{X: a}},
		{degrees(0, 90, 5), r3.Vector{Y: a + 5}},
		{degrees(0, 180, 0), r3.Vector{X: -a}},
		{degrees(0, -90, -7), r3.Vector{Y: -a + 7}},
		{degrees(90, 0, 0), r3.Vector{Z: b}},
		{degrees(90, 15, -1), r3.Vector{Z: b - 1}},
		{degrees(-90, 0, 3), r3.Vector{Z: -b - 3}},
	} {
		apart(t, "there", c.p.ECEF(), c.v, 2e-9)
		back := FromECEF(c.v)
		within(t, "latitude", back.Lat.Degrees(), c.p.Lat.Degrees(), 1e-13)
		within(t, "height", float64(back.Height), float64(c.p.Height), 2e-9)
		if math.Abs(c.p.Lat.Degrees()) < 90 {
			within(t, "longitude", back.Lon.Degrees(), c.p.Lon.Degrees(), 1e-13)
		}
	}
	for _, v := range []r3.Vector{{}, {X: 1}, {Z: 99e3}, {X: math.NaN(), Z: 7e6}, {Y: math.Inf(1)}} {
		if p := FromECEF(v); p.Valid() || !math.IsNaN(float64(p.Height)) || !math.IsNaN(p.Lat.Radians()) || !math.IsNaN(p.Lon.Radians()) {
			t.Errorf("%v: %v", v, p)
		}
	}
}

// There and back from the deepest mine to well beyond what is promised.
func TestGeodeticThereAndBack(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for i := range 200_000 {
		lat := (r.Float64() - 0.5) * math.Pi
		switch i % 4 {
		case 0:
			lat = math.Copysign(math.Pi/2-math.Exp(-40*r.Float64()), lat)
		case 1:
			lat = math.Copysign(math.Exp(-40*r.Float64()), lat)
		}
		p := Position{s1.Angle(lat), s1.Angle((r.Float64()*2 - 1) * math.Pi), geometry.Length(-10e3 + 1010e3*r.Float64())}
		back := FromECEF(p.ECEF())
		if d := back.ECEF().Sub(p.ECEF()).Norm(); !(d < 1e-8) || math.Abs(float64(back.Height-p.Height)) > 1e-8 || math.Abs(float64(back.Lat-p.Lat)) > 2e-15 {
			t.Fatalf("%v comes back %g m off as %v", p, d, back)
		}
	}
}

func TestPositionValid(t *testing.T) {
	if !degrees(90, 360, 1000e3).Valid() || !degrees(-90, -360, -10e3).Valid() || !(Position{}).Valid() {
		t.Error("the limits are valid")
	}
	nan := math.NaN()
	for _, p := range []Position{
		degrees(90.0001, 0, 0), degrees(0, 360.1, 0), degrees(0, 0, 1001e3), degrees(0, 0, -10.1e3),
		degrees(nan, 0, 0), degrees(0, nan, 0), degrees(0, 0, geometry.Length(nan)), degrees(0, math.Inf(1), 0),
	} {
		if p.Valid() {
			t.Errorf("%v is valid", p)
		}
	}
}
