package closures

import (
	"math"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
)

// A rate of azimuth carries the aim from north through east, one of elevation
// upward, one of right ascension eastward on the sky and one of declination
// northward: in all four quadrants, both ways, by the angle that it states.
func TestRatesGoTheRightWay(t *testing.T) {
	r := siteRules()
	w := newWorld(t, r)
	n := w.s.night(w.at)
	const rate, seconds = 1e-4, 10.0
	later := w.at.Add(seconds * time.Second)
	for _, az := range []float64{10, 100, 190, 280} {
		for _, sign := range []float64{1, -1} {
			a := &Aim{Frame: Horizon, Direction: geometry.FromHorizon(s1.Angle(az)*s1.Degree, 50*s1.Degree), Reference: w.at, RateRA: sign * rate, Motion: Fixed}
			d, _, ok := a.At(n, later)
			if !ok {
				t.Fatal("the aim is not known")
			}
			got, _ := geometry.ToHorizon(d)
			if moved := math.Remainder(got.Radians()-az*math.Pi/180, 2*math.Pi) * math.Cos(50*math.Pi/180); math.Abs(moved-sign*rate*seconds) > 1e-5 {
				t.Errorf("azimuth %v, rate %v: moved %v", az, sign*rate, moved)
			}
			a.RateRA, a.RateDec = 0, sign*rate
			d, _, _ = a.At(n, later)
			if _, el := geometry.ToHorizon(d); math.Abs(el.Radians()-50*math.Pi/180-sign*rate*seconds) > 1e-6 {
				t.Errorf("elevation at azimuth %v, rate %v: at %v", az, sign*rate, el.Degrees())
			}
			for _, dec := range []float64{-50, 50} {
				s := &Aim{Frame: ICRS, Direction: geometry.FromEquator(s1.Angle(az)*s1.Degree, s1.Angle(dec)*s1.Degree), Reference: w.at, RateRA: sign * rate, Motion: Tracking}
				v, _, _ := s.InSky(n, later)
				ra, _ := geometry.ToEquator(v)
				if moved := math.Remainder(ra.Radians()-az*math.Pi/180, 2*math.Pi) * math.Cos(dec*math.Pi/180); math.Abs(moved-sign*rate*seconds) > 1e-5 {
					t.Errorf("right ascension %v, declination %v, rate %v: moved %v", az, dec, sign*rate, moved)
				}
			}
		}
	}
}
