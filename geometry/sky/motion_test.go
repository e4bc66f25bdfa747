package sky

import (
	"math"
	"testing"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/r3"
	"pgregory.net/rapid"
)

// TestProperMotion: along a great circle from J2000.0
// on: a star of 10 arcsec a year over 31 years, checked by hand along both
// axes at the equator and at 60 degrees.
func TestProperMotion(t *testing.T) {
	epoch := utc("2000-01-01T11:58:50.816Z") // J2000.0 TT with TAI-UTC of 37 s
	at := epoch.Add(time.Duration(31 * julianYear * 1e9))
	for _, dec := range []float64{-60, 0, 60} {
		star := geometry.FromEquator(deg(200), deg(dec))
		north := ProperMotion{Dec: 10 * arcsec}.At(star, at)
		ra, d := geometry.ToEquator(north)
		nearAngle(t, "right ascension", ra, deg(200), 1e-5)
		nearAngle(t, "declination", d, deg(dec+310./3600), 1e-5)
		east := ProperMotion{RA: 10 * arcsec}.At(star, at)
		ra, d = geometry.ToEquator(east)
		nearAngle(t, "right ascension", ra, deg(200+310./3600/math.Cos(deg(dec).Radians())), 0.002)
		nearAngle(t, "declination", d, deg(dec), 0.5) // the great circle leaves the parallel by 0.4 arcsec
		if got := (ProperMotion{RA: 1e-3, Dec: -1e-3}).At(star, epoch); geometry.Separation(got, star) > 1e-15 {
			t.Errorf("moved at the epoch: %v", got)
		}
	}
}

func TestDrift(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := drawStar(t)
		d := Drift{
			RA:   rapid.Float64Range(-1e-5, 1e-5).Draw(t, "ra"),
			Dec:  rapid.Float64Range(-1e-5, 1e-5).Draw(t, "dec"),
			From: utc("2031-02-14T03:00:00Z"),
		}
		s := rapid.Float64Range(-43200, 43200).Draw(t, "s")
		got := d.At(v, d.From.Add(seconds(s)))
		if off := geometry.Separation(v, got).Radians() - math.Abs(s)*d.Rate(); !(math.Abs(off) <= 1e-12) {
			t.Fatalf("moved %g rad more than its rate", off)
		}
		// The direction it leaves in.
		soon := d.At(v, d.From.Add(time.Second)).Sub(v)
		ra, dec := geometry.ToEquator(v)
		sr, cr := math.Sincos(ra.Radians())
		sd, cd := math.Sincos(dec.Radians())
		if math.Hypot(v.X, v.Y) > 1e-12 {
			east, north := soon.Dot(r3.Vector{X: -sr, Y: cr}), soon.Dot(r3.Vector{X: -sd * cr, Y: -sd * sr, Z: cd})
			if !(math.Abs(east-d.RA) <= 1e-9 && math.Abs(north-d.Dec) <= 1e-9) {
				t.Fatalf("leaves at %g, %g; want %g, %g", east, north, d.RA, d.Dec)
			}
		}
	})
}

func TestMotionUnknown(t *testing.T) {
	at := utc("2031-02-14T03:00:00Z")
	for _, got := range []r3.Vector{
		ProperMotion{RA: math.NaN()}.At(r3.Vector{X: 1}, at),
		ProperMotion{Dec: math.Inf(1)}.At(r3.Vector{X: 1}, at),
		ProperMotion{}.At(r3.Vector{}, at),
		Drift{RA: 1e-6, Dec: math.NaN(), From: at}.At(r3.Vector{X: 1}, at.Add(1)),
		Drift{From: at}.At(r3.Vector{X: math.NaN()}, at),
	} {
		if geometry.FiniteVector(got) {
			t.Errorf("%v from what is not known", got)
		}
	}
	// At a pole east is taken for right ascension 0 h.
	got := Drift{RA: 1e-6, From: at}.At(r3.Vector{Z: 1}, at.Add(time.Second))
	if geometry.Separation(got, r3.Vector{Y: 1e-6, Z: 1}) > 1e-15 {
		t.Errorf("from the pole: %v", got)
	}
}
