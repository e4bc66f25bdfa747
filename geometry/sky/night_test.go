package sky

import (
	"math"
	"strings"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"github.com/soniakeys/meeus/v3/sidereal"
	"pgregory.net/rapid"
)

func drawSite(t *rapid.T) earth.Position {
	return earth.Position{
		Lat:    deg(rapid.Float64Range(-90, 90).Draw(t, "lat")),
		Lon:    deg(rapid.Float64Range(-180, 360).Draw(t, "lon")),
		Height: geometry.Length(rapid.Float64Range(-400, 6000).Draw(t, "height")),
	}
}

func drawInstant(t *rapid.T) time.Time {
	return utc("2020-01-01T00:00:00Z").Add(time.Duration(rapid.Int64Range(0, int64(16*365*24*time.Hour)).Draw(t, "at")))
}

func drawStar(t *rapid.T) r3.Vector {
	return geometry.FromEquator(deg(rapid.Float64Range(0, 360).Draw(t, "ra")), deg(rapid.Float64Range(-90, 90).Draw(t, "dec")))
}

func drawNight(t *rapid.T, site earth.Position, at time.Time) *Night {
	n, err := Prepare(site, at, UT1{})
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// TestBinDecides: any instant of a bin prepares the same bits.
func TestBinDecides(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		site, at := drawSite(t), drawInstant(t)
		bin := Bin(at)
		if !bin.Contains(at) || bin.Until.Sub(bin.From) != 12*time.Hour || bin.From.Hour()%12 != 0 || bin.From.Location() != time.UTC {
			t.Fatalf("Bin(%v) = %v", at, bin)
		}
		other := bin.From.Add(time.Duration(rapid.Int64Range(0, int64(12*time.Hour)-1).Draw(t, "other")))
		zone := time.FixedZone("", 3600*rapid.IntRange(-12, 14).Draw(t, "zone"))
		a, b := drawNight(t, site, at), drawNight(t, site, other.In(zone))
		if *a != *b {
			t.Fatalf("%v and %v prepare different nights", at, other)
		}
		if !a.Covers().Covers(span.Span{From: bin.From.Add(-12 * time.Hour), Until: bin.Until.Add(12 * time.Hour)}) {
			t.Fatalf("covers %v", a.Covers())
		}
	})
}

// TestTwoForms: the direct form and the prepared one agree, and so do both
// ways back.
func TestTwoForms(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		site, at, star := drawSite(t), drawInstant(t), drawStar(t)
		n := drawNight(t, site, at)
		o := n.At(at)
		h := n.Horizon(star, at)
		near := func(what string, a, b r3.Vector) {
			if s := geometry.Separation(a, b).Radians(); !(s <= 1e-11) {
				t.Fatalf("%s: %g rad apart", what, s)
			}
		}
		near("Horizon", h, o.Horizon(star))
		near("ICRS", n.ICRS(h, at), star)
		near("Sun", n.Sun(at), o.Sun())
		near("OfDate", n.OfDate(star, at), o.OfDate(star))
		near("ToDate", n.ToDate(h, at), o.ToDate(h))
		near("ToDate back", n.OfDate(n.ToDate(h, at), at), h)
		if d := math.Abs(h.Norm() - 1); d > 1e-15 {
			t.Fatalf("length off by %g", d)
		}
	})
}

// TestNeighbouringBins: two nights that both cover an instant agree to 0.03
// arcsec, so that a search may pass from one to the next.
func TestNeighbouringBins(t *testing.T) {
	var worst float64
	rapid.Check(t, func(t *rapid.T) {
		site, at, star := drawSite(t), drawInstant(t), drawStar(t)
		a, b := drawNight(t, site, at), drawNight(t, site, at.Add(12*time.Hour))
		off := geometry.Separation(a.Horizon(star, at), b.Horizon(star, at)).Radians() / arcsec
		worst = max(worst, off)
		if !(off <= 0.03) {
			t.Fatalf("%v arcsec apart", off)
		}
	})
	t.Logf("at most %.4f arcsec apart", worst)
}

// TestSlowTwin compares with the chain computed afresh for the instant, step by
// step: the night's straight lines over 18 h cost no more than 0.02 arcsec.
func TestSlowTwin(t *testing.T) {
	var worst float64
	rapid.Check(t, func(t *rapid.T) {
		site, star := drawSite(t), drawStar(t)
		n := drawNight(t, site, drawInstant(t))
		at := n.Covers().From.Add(time.Duration(rapid.Int64Range(0, int64(36*time.Hour)-1).Draw(t, "in")))

		jd := julianDay(at)
		s := slowAt(jd + ttMinusUTC.Hours()/24)
		p := s.toDate.turn(star)
		if off := geometry.Separation(p, s.sun).Radians(); off > deg(0.3).Radians() {
			p = p.Add(p.Mul(p.Dot(s.sun)).Sub(s.sun).Normalize().Mul(solarDeflection / math.Tan(off/2)))
		}
		p = p.Add(s.velocity).Normalize()
		turned := sidereal.Mean(jd).Rad() + s.equinoxes + site.Lon.Radians()
		meridian := aboutZ(turned)
		p = meridian.turn(p)
		p = r3.Vector{X: p.X, Y: p.Y + n.diurnal, Z: p.Z} // Y is east
		sl, cl := math.Sincos(site.Lat.Radians())
		want := r3.Vector{X: p.Y, Y: cl*p.Z - sl*p.X, Z: sl*p.Z + cl*p.X}

		off := geometry.Separation(n.Horizon(star, at), want).Radians() / arcsec
		worst = max(worst, off)
		if !(off <= 0.02) {
			t.Fatalf("%v arcsec apart", off)
		}
	})
	t.Logf("at most %.4f arcsec apart", worst)
}

// TestRates: nothing moves faster than it is said to, stars near the Sun and
// at the poles included.
func TestRates(t *testing.T) {
	var star, sun float64
	rapid.Check(t, func(t *rapid.T) {
		n := drawNight(t, drawSite(t), drawInstant(t))
		c := n.Covers()
		span := c.Until.Sub(c.From)
		at := c.From.Add(time.Duration(rapid.Int64Range(0, int64(span)-int64(time.Hour)-1).Draw(t, "in")))
		step := time.Duration(rapid.Int64Range(int64(time.Millisecond), int64(time.Hour)).Draw(t, "step"))
		v := drawStar(t)
		if rapid.Bool().Draw(t, "near the Sun") {
			v = n.ICRS(n.Sun(at), at)
		}
		turned := geometry.Separation(n.Horizon(v, at), n.Horizon(v, at.Add(step))).Radians() / step.Seconds()
		star = max(star, turned)
		if !(turned <= SkyRate) {
			t.Fatalf("star: %v arcsec a second", turned/arcsec)
		}
		turned = geometry.Separation(n.Sun(at), n.Sun(at.Add(step))).Radians() / step.Seconds()
		sun = max(sun, turned)
		if !(turned <= SunRate) {
			t.Fatalf("Sun: %v arcsec a second", turned/arcsec)
		}
	})
	t.Logf("fastest star %.4f, Sun %.4f arcsec a second", star/arcsec, sun/arcsec)
}

// TestUT1: the sky is turned by 15 arcsec for each second of UT1-UTC, forward,
// and not knowing it costs at least what it can be.
func TestUT1(t *testing.T) {
	at := utc("2031-02-14T03:00:00Z")
	site := earth.Position{Lat: deg(-31.5), Lon: deg(-4), Height: 2450}
	covers := prepared(t, site, at, UT1{}).Covers()
	unknown := prepared(t, site, at, UT1{})
	for _, offset := range []time.Duration{-900 * time.Millisecond, -30 * time.Millisecond, 0, 420 * time.Millisecond, 900 * time.Millisecond} {
		n := prepared(t, site, at, UT1{Offset: offset, Until: covers.Until, Known: true})
		nearAngle(t, "sidereal time", n.SiderealTime(at), unknown.SiderealTime(at)+hms(0, 0, offset.Seconds()*1.00273790935), 1e-6)
		for dec := -90.0; dec <= 90; dec += 10 {
			star := geometry.FromEquator(deg(77), deg(dec))
			off := geometry.Separation(n.Horizon(star, at), unknown.Horizon(star, at))
			near(t, "moved (arcsec)", off.Radians()/arcsec, math.Abs(offset.Seconds())*15.041*math.Cos(deg(dec).Radians()), 0.05) // the pole of date is 0.2 degree from that of ICRS
			if !(off <= unknown.Error()) {
				t.Errorf("offset %v, dec %v: %v off, stated %v", offset, dec, off, unknown.Error())
			}
		}
		// Past its end the offset is not used at all: a stale one may be
		// farther from the truth than none.
		expired := prepared(t, site, at, UT1{Offset: offset, Until: covers.Until.Add(-1), Known: true})
		if *expired != *unknown {
			t.Errorf("offset %v: an expired UT1 is not an unknown one", offset)
		}
		if !(n.Error() < unknown.Error()) {
			t.Errorf("known %v, unknown %v", n.Error(), unknown.Error())
		}
	}
	near(t, "error, unknown (arcsec)", unknown.Error().Radians()/arcsec, 0.75+0.9*15.041, 0.001)
	near(t, "error, known (arcsec)", prepared(t, site, at, known(0)).Error().Radians()/arcsec, 0.75+0.05*15.041, 0.001)
}

func TestPrepareRefuses(t *testing.T) {
	at := utc("2031-02-14T03:00:00Z")
	ok := earth.Position{Lat: deg(-31.5), Lon: deg(-4), Height: 2450}
	for _, c := range []struct {
		site earth.Position
		at   time.Time
		ut1  UT1
		want string
	}{
		{earth.Position{Lat: s1.Angle(math.NaN())}, at, UT1{}, "latitude"},
		{earth.Position{Lat: deg(91)}, at, UT1{}, "latitude"},
		{earth.Position{Height: geometry.Length(math.Inf(1))}, at, UT1{}, "height"},
		{ok, at, UT1{Known: true, Offset: time.Second}, "UT1-UTC of 1s"},
		{ok, at, UT1{Known: true, Offset: -901 * time.Millisecond}, "UT1-UTC of -901ms"},
		{ok, time.Time{}, UT1{}, "1900 to 2100"},
		{ok, utc("2500-01-01T00:00:00Z"), UT1{}, "1900 to 2100"},
	} {
		n, err := Prepare(c.site, c.at, c.ut1)
		if n != nil || err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v: %v, %v; want an error with %q", c, n, err, c.want)
		}
	}
}

// TestUnknownIsNaN: what is not known never looks like a direction.
func TestUnknownIsNaN(t *testing.T) {
	at := utc("2031-02-14T03:00:00Z")
	n := prepared(t, earth.Position{Lat: deg(-31.5)}, at, UT1{})
	star := r3.Vector{X: 1}
	all := func(n *Night, v r3.Vector, at time.Time) []r3.Vector {
		o := n.At(at)
		return []r3.Vector{n.Horizon(v, at), n.ICRS(v, at), n.OfDate(v, at), n.ToDate(v, at), o.Horizon(v), o.ICRS(v), o.OfDate(v), o.ToDate(v)}
	}
	nan := func(what string, vs ...r3.Vector) {
		for i, v := range vs {
			if !(math.IsNaN(v.X) && math.IsNaN(v.Y) && math.IsNaN(v.Z)) {
				t.Errorf("%s: answer %d is %v", what, i, v)
			}
		}
	}
	c := n.Covers()
	for _, v := range all(n, star, c.From) {
		if !geometry.FiniteVector(v) {
			t.Errorf("at the start: %v", v)
		}
	}
	nan("at the end", all(n, star, c.Until)...)
	nan("before", all(n, star, c.From.Add(-1))...)
	nan("far off", all(n, star, time.Time{})...)
	nan("Sun at the end", n.Sun(c.Until))
	for _, v := range []r3.Vector{{}, {X: 0.9}, {X: 1.1}, {X: math.NaN()}, {Y: math.Inf(1)}} {
		nan("not a direction", all(n, v, at)...)
	}
	for _, none := range []*Night{nil, {}} {
		nan("no night", append(all(none, star, at), none.Sun(at))...)
		if !(none.Error() >= math.Pi) {
			t.Errorf("error of no night: %v", none.Error())
		}
		if a := none.SiderealTime(at); !math.IsNaN(a.Radians()) {
			t.Errorf("sidereal time of no night: %v", a)
		}
		if !none.Covers().Empty() {
			t.Errorf("no night covers %v", none.Covers())
		}
	}
	var o Orientation
	nan("zero Orientation", o.Horizon(star), o.ICRS(star), o.OfDate(star), o.ToDate(star), o.Sun())
}

// TestNoAllocation: nothing after Prepare takes memory.
func TestNoAllocation(t *testing.T) {
	at := utc("2031-02-14T03:00:00Z")
	n := prepared(t, earth.Position{Lat: deg(-31.5)}, at, UT1{})
	r := n.Refraction(Atmosphere{})
	v := r3.Vector{Y: 1}
	if k := testing.AllocsPerRun(100, func() {
		o := n.At(at)
		sink = o.Horizon(v)
		sink = o.ICRS(sink)
		sink = n.Horizon(v, at)
		sink = n.OfDate(sink, at)
		sink = n.ICRS(sink, at)
		sink = n.Sun(at)
		sink, _ = r.Refract(sink)
		sink, _ = r.Unrefract(sink)
	}); k != 0 {
		t.Errorf("%v allocations", k)
	}
}
