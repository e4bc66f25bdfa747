package sky

import (
	"math"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"
)

func sunElevation(n *Night, at time.Time) float64 {
	_, el := geometry.ToHorizon(n.Sun(at))
	return el.Degrees()
}

// sunCrosses returns when the Sun's centre passes an elevation, rising or
// setting, within a span that holds one such instant.
func sunCrosses(t *testing.T, site earth.Position, elevation float64, from time.Time, length time.Duration, rising bool) time.Time {
	t.Helper()
	above := func(at time.Time) bool {
		return (sunElevation(prepared(t, site, at, UT1{}), at) >= elevation) == rising
	}
	const step = 10 * time.Minute
	for at := from; at.Before(from.Add(length)); at = at.Add(step) {
		lo, hi := at, at.Add(step)
		if above(lo) || !above(hi) {
			continue
		}
		for hi.Sub(lo) > time.Millisecond {
			if mid := lo.Add(hi.Sub(lo) / 2); above(mid) {
				hi = mid
			} else {
				lo = mid
			}
		}
		return hi
	}
	t.Fatalf("no crossing of %v after %v", elevation, from)
	return time.Time{}
}

const riseSet = -0.8333 // the Sun's centre: 34 arcmin of refraction and 16 of radius (USNO)

// TestSunriseAndTwilight: published times to the printed minute (USNO through
// the tests of skyfield and of pvlib), and beside them astropy 5.2.1 to the
// second: 12 s allow for 0.02 degree, UT1 unknown, and the Sun's slant. Where
// the exact instant lies within those 12 s of the rounding's edge either minute
// is right.
func TestSunriseAndTwilight(t *testing.T) {
	bluffton := earth.Position{Lat: deg(40.8939), Lon: deg(-83.8917)}
	defiance := earth.Position{Lat: deg(41.281944), Lon: deg(-84.362778)}
	golden := earth.Position{Lat: deg(39), Lon: deg(-105)}
	beijing := earth.Position{Lat: deg(39.917), Lon: deg(116.383)}
	type event struct {
		site      earth.Position
		elevation float64
		rising    bool
		published string // UTC to the minute
		astropy   string // UTC
	}
	up, down := true, false
	for _, c := range []event{
		{bluffton, riseSet, up, "2018-09-12T11:13:00Z", "2018-09-12T11:13:12.5Z"},
		{bluffton, riseSet, down, "2018-09-12T23:50:00Z", "2018-09-12T23:49:37.6Z"},
		{defiance, -18, up, "2019-11-08T10:42:00Z", "2019-11-08T10:42:26.8Z"},
		{defiance, -12, up, "2019-11-08T11:15:00Z", "2019-11-08T11:14:49.3Z"},
		{defiance, -6, up, "2019-11-08T11:48:00Z", "2019-11-08T11:47:48.0Z"},
		{defiance, riseSet, up, "2019-11-08T12:17:00Z", "2019-11-08T12:16:56.7Z"},
		{defiance, riseSet, down, "2019-11-08T22:25:00Z", "2019-11-08T22:24:55.8Z"},
		{defiance, -6, down, "2019-11-08T22:54:00Z", "2019-11-08T22:54:03.6Z"},
		{defiance, -12, down, "2019-11-08T23:27:00Z", "2019-11-08T23:27:01.2Z"},
		{defiance, -18, down, "2019-11-08T23:59:00Z", "2019-11-08T23:59:22.2Z"},
		{golden, riseSet, up, "2015-01-02T14:19:00Z", "2015-01-02T14:19:04Z"},
		{golden, riseSet, up, "2015-04-02T12:43:00Z", "2015-04-02T12:43:21Z"},
		{golden, riseSet, up, "2015-08-02T12:01:00Z", "2015-08-02T12:01:27Z"},
		{golden, riseSet, up, "2015-12-02T14:01:00Z", "2015-12-02T14:00:39Z"},
		{golden, riseSet, down, "2015-01-02T23:49:00Z", "2015-01-02T23:49:10Z"},
		{golden, riseSet, down, "2015-04-03T01:24:00Z", "2015-04-03T01:24:28Z"},
		{golden, riseSet, down, "2015-08-03T02:10:00Z", "2015-08-03T02:10:29Z"},
		{golden, riseSet, down, "2015-12-02T23:38:00Z", "2015-12-02T23:37:53Z"},
		{beijing, riseSet, up, "2015-01-01T23:36:00Z", "2015-01-01T23:36:09Z"},
		{beijing, riseSet, up, "2015-04-01T21:58:00Z", "2015-04-01T21:58:13Z"},
		{beijing, riseSet, up, "2015-08-01T21:13:00Z", "2015-08-01T21:13:14Z"},
		{beijing, riseSet, up, "2015-12-01T23:17:00Z", "2015-12-01T23:17:04Z"},
		{beijing, riseSet, down, "2015-01-02T09:00:00Z", "2015-01-02T09:00:26Z"},
		{beijing, riseSet, down, "2015-04-02T10:39:00Z", "2015-04-02T10:38:55Z"},
		{beijing, riseSet, down, "2015-08-02T11:28:00Z", "2015-08-02T11:27:42Z"},
		{beijing, riseSet, down, "2015-12-02T08:50:00Z", "2015-12-02T08:49:56Z"},
	} {
		published := utc(c.published)
		got := sunCrosses(t, c.site, c.elevation, published.Add(-time.Hour), 2*time.Hour, c.rising)
		off := got.Sub(utc(c.astropy)).Seconds()
		t.Logf("%s at %v: %s, %+.1f s from astropy", c.published, c.elevation, got.Format("15:04:05.0"), off)
		if !(math.Abs(off) <= 12) {
			t.Errorf("%s at %v: %v, %+.1f s from astropy", c.published, c.elevation, got, off)
		}
		if minute := got.Round(time.Minute); !minute.Equal(published) {
			edge := got.Sub(published).Seconds()
			if math.Abs(edge) > 30+12 {
				t.Errorf("%s at %v: %v is another minute", c.published, c.elevation, got)
			} else {
				t.Logf("  %.1f s past the edge of the minute", math.Abs(edge)-30)
			}
		}
	}
}

// TestSunSouth: the example of NREL's SPA report (NREL/TP-560-34302) at 35
// degrees south, 1996 and 2004, UT to the second, through pvlib.
func TestSunSouth(t *testing.T) {
	site := earth.Position{Lat: deg(-35)}
	for _, c := range []struct{ rise, set string }{
		{"1996-07-05T07:08:15Z", "1996-07-05T17:01:04Z"},
		{"2004-12-04T04:38:57Z", "2004-12-04T19:02:02Z"},
	} {
		for at, rising := range map[string]bool{c.rise: true, c.set: false} {
			got := sunCrosses(t, site, riseSet, utc(at).Add(-time.Hour), 2*time.Hour, rising)
			near(t, at+" (s)", got.Sub(utc(at)).Seconds(), 0, 12)
		}
	}
}

// TestSunNearThePole: skyfield's documentation, degrees: transits of a polar
// night and the lower transit of a midnight sun.
func TestSunNearThePole(t *testing.T) {
	harra := earth.Position{Lat: deg(67.4066), Lon: deg(20.0997)}
	for day, want := range []float64{-0.8387, -0.8464, -0.8461, -0.8380} {
		from := utc("2022-12-20T06:00:00Z").AddDate(0, 0, day)
		highest := -90.0
		for at := from; at.Before(from.Add(10 * time.Hour)); at = at.Add(20 * time.Second) {
			highest = max(highest, sunElevation(prepared(t, harra, at, UT1{}), at))
		}
		near(t, from.Format(time.DateOnly), highest, want, 0.01)
	}
	at := utc("2023-06-21T10:28:55Z")
	utqiagvik := earth.Position{Lat: deg(71.2906), Lon: deg(-156.7886)}
	near(t, "lower transit", sunElevation(prepared(t, utqiagvik, at, UT1{}), at), 4.7265, 0.01)
}

// TestSunSPA: NREL/TP-560-34302, App. A.5: elevation without refraction and
// azimuth, degrees.
func TestSunSPA(t *testing.T) {
	at := utc("2003-10-17T12:30:30-07:00")
	n := prepared(t, earth.Position{Lat: deg(39.742476), Lon: deg(-105.1786), Height: 1830.14}, at, known(0))
	az, el := geometry.ToHorizon(n.Sun(at))
	near(t, "azimuth", az.Degrees(), 194.340240510191620, 0.02)
	near(t, "elevation", el.Degrees(), 39.872046, 0.01)
	// Its lift there is 0.016332 by Saemundsson's formula, 0.1 arcmin from
	// Bennett's; air of 820 hPa and 11 °C.
	_, observed := geometry.ToHorizon(n.Sun(at))
	lifted, _ := air(820, 11).Observed(observed)
	near(t, "zenith distance observed", 90-lifted.Degrees(), 50.111622024029721, 0.01)
	near(t, "refraction", (lifted - observed).Degrees(), 0.016332, 0.1/60)
}
