package recheck

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

func random(rng *rand.Rand) r3.Vector {
	return r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize()
}

// The other formulas agree with the decision's within Unsure, which tells that
// both are right, for any direction from 2020 to 2040 at any site.
func TestDirectionsAgree(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	worst, worstBack, worstSun := 0.0, 0.0, 0.0
	for range 300 {
		site := earth.Position{Lat: s1.Angle(math.Asin(2*rng.Float64() - 1)), Lon: s1.Angle(math.Pi * (2*rng.Float64() - 1)), Height: 2000}
		ut1 := sky.UT1{Offset: time.Duration(rng.Int64N(int64(800 * time.Millisecond))), Until: time.Date(2050, 1, 1, 0, 0, 0, 0, time.UTC), Known: true}
		at := time.Date(2020, 1, 1, 0, 0, 0, 0, time.UTC).Add(time.Duration(rng.Int64N(int64(20 * 365 * 24 * time.Hour))))
		n, err := sky.Prepare(site, at, ut1)
		if err != nil {
			t.Fatal(err)
		}
		p := placeOf(&closures.Rules{Site: closures.SiteRules{Position: site, UT1: ut1}})
		for range 20 {
			v := random(rng)
			worst = max(worst, apart(horizontal(n.Horizon(v, at)), p.local(equatorial(v), at)))
			worst = max(worst, apart(horizontal(n.OfDate(v, at)), p.ofDate(equatorial(v), at)))
			worstBack = max(worstBack, apart(equatorial(n.ICRS(v, at)), p.stars(horizontal(v), at)))
		}
		worstSun = max(worstSun, math.Abs(horizontal(n.Sun(at)).lat-p.ofDate(sun(at), at).lat))
	}
	t.Logf("worst: %.1f arcsec to the horizon, %.1f back; Sun %.4f degrees", worst/arcsec, worstBack/arcsec, worstSun/degree)
	if worst > 0.75*Unsure || worstBack > 0.75*Unsure {
		t.Errorf("directions differ by %.1f and %.1f arcsec", worst/arcsec, worstBack/arcsec)
	}
	if worstSun > 0.03*degree {
		t.Errorf("the Sun differs by %.4f degrees", worstSun/degree)
	}
}

// Separations, and motions along great circles, against vectors: 1 mas.
func TestGreatCircles(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 8))
	for range 5000 {
		a, b := random(rng), random(rng)
		if rng.IntN(2) == 0 {
			b = a.Add(b.Mul(1e-4 * rng.Float64())).Normalize()
		}
		if d := apart(equatorial(a), equatorial(b)) - geometry.Separation(a, b).Radians(); math.Abs(d) > 1e-3*arcsec && math.Abs(a.Z) < 0.99999 && math.Abs(b.Z) < 0.99999 {
			t.Fatalf("%v %v: differs by %g arcsec", a, b, d/arcsec)
		}
		east, north, s := rng.NormFloat64()*1e-4, rng.NormFloat64()*1e-4, 100*rng.Float64()
		m := sky.Drift{RA: east, Dec: north}
		if d := apart(along(equatorial(a), east, north, s), equatorial(m.At(a, time.Time{}.Add(time.Duration(s*1e9))))); d > 1e-3*arcsec && math.Abs(a.Z) < 0.99999 {
			t.Fatalf("%v: differs by %g arcsec", a, d/arcsec)
		}
	}
}

// A rate of azimuth carries through east: the azimuth rises.
func TestAzimuthRises(t *testing.T) {
	for _, az := range []float64{10, 100, 190, 280} {
		a := aim{Aim: &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(s1.Angle(az)*s1.Degree, 45*s1.Degree), RateRA: 1e-3}}
		p, ok := a.own(a.Reference.Add(10 * time.Second))
		want := az*degree + 0.01/math.Cos(45*degree)
		if d := math.Remainder(p.lon-want, 2*math.Pi); !ok || math.Abs(d) > 1e-4 {
			t.Errorf("azimuth %g: %g degrees, want %g", az, p.lon/degree, want/degree)
		}
	}
}

// Aircraft are placed within 30 m of where the ellipsoid's own formulas put
// them, out to 60 km.
func TestPlacesAgree(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 8))
	worst := 0.0
	for range 20000 {
		site := earth.Position{Lat: s1.Angle(1.3 * (2*rng.Float64() - 1)), Lon: s1.Angle(math.Pi * (2*rng.Float64() - 1)), Height: geometry.Length(4000 * rng.Float64())}
		f := earth.FrameAt(site)
		v := geometry.FromHorizon(s1.Angle(6.28*rng.Float64()), 0).Mul(60e3 * rng.Float64()).Add(r3.Vector{Z: 15e3 * rng.Float64()})
		l := look{rules: &closures.Rules{Site: closures.SiteRules{Position: site}, Aircraft: closures.AircraftRules{SpeedMax: 350, ClimbMax: 30}}}
		p, _, ok := l.flying(&closures.AircraftSeen{Position: earth.FromECEF(f.ECEF(v)), AltitudeFrom: closures.AboveEllipsoid})
		if !ok {
			t.Fatal("not placed")
		}
		worst = max(worst, p.Sub(v).Norm())
	}
	t.Logf("worst %.1f m", worst)
	if worst > 30 {
		t.Errorf("off by %.1f m", worst)
	}
}

// The air never lifts more than is allowed for.
func TestLiftIsABound(t *testing.T) {
	for _, air := range []sky.Atmosphere{{PressureHPa: 1040, TemperatureC: -25, Known: true}, {PressureHPa: 700, TemperatureC: 0, Known: true}} {
		for el := 0.0; el < 90; el += 0.25 {
			d := geometry.FromHorizon(1, s1.Angle(el)*s1.Degree)
			up, _ := sky.Refract(d, air)
			if l := (geometry.Elevation(up) - geometry.Elevation(d)).Radians(); l > lifted(el*degree)+0.01*arcsec {
				t.Errorf("at %g degrees the air lifts by %g arcsec, not at most %g", el, l/arcsec, lifted(el*degree)/arcsec)
			}
		}
	}
}
