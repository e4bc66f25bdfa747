package span_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"runtime"
	"sync"
	"testing"
	"time"

	"beamward/geometry"
	"beamward/geometry/span"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

const omega = 7.292115e-5 // the Earth's rate of rotation, rad/s

var dusk = time.Date(2031, 2, 14, 18, 0, 0, 0, time.UTC)

// star is a direction fixed among the stars, over a site.
type star struct {
	sinLat, cosLat, sinDec, cosDec float64
	hour, rate                     float64 // hour angle at dusk; radians a second
}

func newStar(lat, dec, hour, rate float64) star {
	s := star{hour: hour, rate: rate}
	s.sinLat, s.cosLat = math.Sincos(lat)
	s.sinDec, s.cosDec = math.Sincos(dec)
	return s
}

// at returns the direction in the horizon's frame.
func (s star) at(t time.Time) r3.Vector {
	sin, cos := math.Sincos(s.hour + s.rate*t.Sub(dusk).Seconds())
	return r3.Vector{
		X: -s.cosDec * sin,
		Y: s.cosLat*s.sinDec - s.sinLat*s.cosDec*cos,
		Z: s.sinLat*s.sinDec + s.cosLat*s.cosDec*cos,
	}
}

// scene is one margin to search, with its bound.
type scene struct {
	what      string
	margin    func(time.Time) float64
	rate      float64
	over      span.Span
	tolerance time.Duration
}

// short keeps a failure readable.
func short(s span.Set) string {
	if len(s) > 4 {
		return fmt.Sprintf("%d spans", len(s))
	}
	return fmt.Sprint([]span.Span(s))
}

func (s scene) String() string {
	return fmt.Sprintf("%s, rate %g, over %v from %v, to %v", s.what, s.rate, s.over.Length(), s.over.From.Sub(dusk), s.tolerance)
}

// randomScene draws a site, a star, a shape and a span. It leans to what is
// hard: the poles, a pass through the zenith, limits grazed at culmination,
// boxes over north and up to the zenith, and the tightest bound there is.
func randomScene(r *rand.Rand) scene {
	pick := func(special ...float64) float64 {
		if r.IntN(3) == 0 {
			return special[r.IntN(len(special))]
		}
		return math.Asin(2*r.Float64() - 1)
	}
	lat := pick(-math.Pi/2, math.Pi/2, 0, -0.55, 0.35)
	dec := pick(-math.Pi/2, math.Pi/2, 0, lat, lat+1e-4, -lat)
	turn := omega
	if r.IntN(20) == 0 {
		turn *= 200 // a low satellite's pace
	}
	s := newStar(lat, dec, r.Float64()*2*math.Pi, turn)
	own := turn * math.Abs(s.cosDec) // how fast the direction moves

	from := dusk.Add(time.Duration(r.Float64() * 24 * float64(time.Hour)))
	length := time.Duration(math.Exp(math.Log(60)+r.Float64()*math.Log(1440)) * float64(time.Second))
	o := scene{
		over:      span.Span{From: from, Until: from.Add(length)},
		tolerance: []time.Duration{time.Millisecond, 10 * time.Millisecond, 100 * time.Millisecond, 100 * time.Millisecond, time.Second}[r.IntN(5)],
		rate:      own * []float64{1, 1.000001, 1.3, 5}[r.IntN(4)],
	}
	if turn > omega {
		o.over.Until = from.Add(min(length, 20*time.Minute))
		length = o.over.Length()
	}
	o.tolerance = max(o.tolerance, length/1_000_000)
	o.rate = max(o.rate, omega/20) // a target at a pole does not move at all
	// A place on the star's way, so that shapes are met.
	met := s.at(from.Add(time.Duration(r.Float64() * float64(length))))
	az, el := geometry.ToHorizon(met)
	graze := func() float64 { return math.Copysign(math.Exp(-2-28*r.Float64()), r.Float64()-0.5) }
	top := math.Pi/2 - math.Abs(lat-dec)
	switch r.IntN(9) {
	case 0:
		limit := pick(float64(el), 0.5, top+graze())
		o.what = fmt.Sprint("elevation above ", limit)
		o.margin = func(t time.Time) float64 { return float64(geometry.Elevation(s.at(t))) - limit }
	case 1:
		limit := pick(float64(el), 1.5, top+graze())
		o.what = fmt.Sprint("elevation below ", limit)
		o.margin = func(t time.Time) float64 { return limit - float64(geometry.Elevation(s.at(t))) }
	case 2, 3:
		off := r3.Vector{X: r.NormFloat64(), Y: r.NormFloat64(), Z: r.NormFloat64()}.Mul(math.Exp(-12 * r.Float64()))
		cone := geometry.Cone{Axis: met.Add(off), Radius: s1.Angle(math.Exp(-10 * r.Float64()))}
		if r.IntN(4) == 0 {
			cone.Radius = geometry.Separation(cone.Axis, met) + s1.Angle(graze())
		}
		o.what = fmt.Sprint("cone ", cone)
		o.margin = func(t time.Time) float64 { return cone.Margin(s.at(t)) }
	case 4:
		other := newStar(lat, pick(dec, 0), r.Float64()*2*math.Pi, -2*turn) // a field that moves too
		radius := s1.Angle(math.Exp(-6 * r.Float64()))
		o.what = fmt.Sprint("moving cone ", radius)
		o.rate += 2 * turn
		o.margin = func(t time.Time) float64 { return geometry.Cone{Axis: other.at(t), Radius: radius}.Margin(s.at(t)) }
	default:
		box := randomBox(r, az, el)
		side := 1.0
		if r.IntN(3) == 0 {
			side = -1 // must stay inside
		}
		o.what = fmt.Sprintf("box %v × %v", box, side)
		o.margin = func(t time.Time) float64 { return side * box.Margin(s.at(t)) }
	}
	o.what = fmt.Sprintf("latitude %v, declination %v: %s", lat, dec, o.what)
	return o
}

func randomBox(r *rand.Rand, az, el s1.Angle) geometry.Box {
	for {
		wide, high := s1.Angle(math.Exp(2-9*r.Float64())), s1.Angle(math.Exp(-7*r.Float64()))
		b := geometry.Box{AzFrom: az - wide*s1.Angle(r.Float64()), ElFrom: el - high*s1.Angle(r.Float64())}
		b.AzTo, b.ElTo = b.AzFrom+wide, min(b.ElFrom+high, math.Pi/2)
		b.ElFrom = max(b.ElFrom, -math.Pi/2)
		b.AzFrom = s1.Angle(math.Mod(float64(b.AzFrom)+6*math.Pi, 2*math.Pi))
		b.AzTo = s1.Angle(math.Mod(float64(b.AzTo)+6*math.Pi, 2*math.Pi))
		switch r.IntN(6) {
		case 0:
			b.ElTo = math.Pi / 2
		case 1:
			b.AzFrom, b.AzTo = 0, 2*math.Pi
		case 2:
			b.AzFrom, b.AzTo = s1.Angle(2*math.Pi-r.Float64()), s1.Angle(r.Float64())
		}
		if b.Valid() {
			return b
		}
	}
}

// Against dense sampling, over every shape: nothing is missed, and every edge
// is on the safe side and within the tolerance. BW-019
func TestBelowAgainstSampling(t *testing.T) {
	cases := 104_000
	if os.Getenv("BEAMWARD_LONG") != "" {
		cases = 5_000_000
	}
	var (
		workers = runtime.GOMAXPROCS(0)
		wait    sync.WaitGroup
		sum     = make([]tally, workers)
	)
	for w := range workers {
		wait.Go(func() {
			r := rand.New(rand.NewPCG(20310214, uint64(w)))
			for i := w; i < cases && !t.Failed(); i += workers {
				check(t, randomScene(r), r, &sum[w])
			}
		})
	}
	wait.Wait()
	var all tally
	for _, s := range sum {
		all.spans, all.touched, all.edges, all.steep, all.evaluations = all.spans+s.spans, all.touched+s.touched, all.edges+s.edges, all.steep+s.steep, all.evaluations+s.evaluations
	}
	t.Logf("%d cases, %d touched, %d spans, %d edges of which %d crossed at an eighth of the rate or more; %d evaluations a case",
		cases, all.touched, all.spans, all.edges, all.steep, all.evaluations/cases)
	if all.touched < cases/4 || all.steep < cases/4 {
		t.Error("too few cases touch anything")
	}
}

type tally struct{ spans, touched, edges, steep, evaluations int }

// rounding is how far, in radians, a margin may err.
const rounding = 3e-15

func check(t *testing.T, o scene, r *rand.Rand, sum *tally) {
	found := span.Below(func(at time.Time) float64 { sum.evaluations++; return o.margin(at) }, o.rate, o.over, o.tolerance)
	if !found.Valid() || len(found) > 0 && !o.over.Covers(found.Hull()) {
		t.Errorf("%v: not a set within the span: %v", o, found)
		return
	}
	if len(found) > 0 {
		sum.touched++
	}
	sum.spans += len(found)

	const samples = 100
	length := o.over.Length()
	least, leastAt := math.Inf(1), time.Time{} // outside what was found
	look := func(at time.Time) {
		if !o.over.Contains(at) {
			return
		}
		m := o.margin(at)
		switch inside := found.Contains(at); {
		case !inside && m <= -rounding:
			t.Errorf("%v: missed %v rad at %v; found %v", o, m, at.Sub(o.over.From), short(found))
		case !inside && m < least:
			least, leastAt = m, at
		case inside && m > 2*o.rate*o.tolerance.Seconds()+rounding:
			t.Errorf("%v: closed with %v rad at %v; found %v", o, m, at.Sub(o.over.From), short(found))
		}
	}
	cell := length / samples
	for i := range samples {
		look(o.over.From.Add(time.Duration(i)*cell + time.Duration(r.Int64N(int64(cell)))))
	}
	for _, f := range found {
		for _, by := range []time.Duration{1, o.tolerance / 100, o.tolerance, 10 * o.tolerance} {
			look(f.From.Add(-by))
			look(f.Until.Add(by - 1))
		}
	}
	// The lowest sample that was left open: go down from it as far as it goes.
	for cell, at := length/samples, leastAt; cell > 0 && !at.IsZero(); cell /= 2 {
		look(at.Add(-cell))
		look(at.Add(cell))
		at = leastAt
	}
	for _, f := range found {
		slow := grazes(o, f.From)
		edge(t, o, found, f.From, o.over.From, 1, slow, sum)
		edge(t, o, found, f.Until, o.over.Until, -1, slow, sum)
	}
}

// edge checks a start (sign 1) or an end (sign -1) that is not the span's own:
// the margin is nearly used up there, and where it goes on at an eighth of the
// rate or more it is used up within a tolerance, but in a graze.
func edge(t *testing.T, o scene, found span.Set, at, own time.Time, sign time.Duration, grazing bool, sum *tally) {
	if at.Equal(own) {
		return
	}
	sum.edges++
	limit := o.rate * o.tolerance.Seconds()
	m := o.margin(at)
	if m > 2*limit+rounding || sign > 0 && m > limit+rounding {
		t.Errorf("%v: the edge %d at %v with %v rad; found %v", o, sign, at.Sub(o.over.From), m, short(found))
	}
	if grazing {
		return
	}
	const parts = 20
	for i := range time.Duration(parts) {
		next := o.margin(at.Add(sign * (i + 1) * o.tolerance / parts))
		switch {
		case m-next < limit/8/parts+rounding:
			return
		case next <= 0:
			sum.steep++
			return
		}
		m = next
	}
	t.Errorf("%v: the edge %d at %v is more than a tolerance out: still %v rad; found %v", o, sign, at.Sub(o.over.From), m, short(found))
}

// grazes reports whether the margin was near zero for 50 tolerances before at.
func grazes(o scene, at time.Time) bool {
	limit := o.rate * o.tolerance.Seconds()
	for i := range time.Duration(50) {
		if o.margin(at.Add(-i*o.tolerance)) > limit+rounding {
			return false
		}
	}
	return true
}

// grid is Below without thought: every instant a step apart, each with the step
// that follows it.
func grid(margin func(time.Time) float64, limit float64, over span.Span, step time.Duration) span.Set {
	var hits []span.Span
	for at := over.From; at.Before(over.Until); at = at.Add(step) {
		if !(margin(at) > limit) {
			hits = append(hits, span.Span{From: at, Until: at.Add(step)}.Intersect(over))
		}
	}
	return span.Make(hits...)
}

// Between two grids: all that is at or below zero is found, and all that is
// found lies within the tolerance after what is at or below rate x tolerance.
func TestBelowAgainstTheGrid(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 10))
	for range 300 {
		o := randomScene(r)
		o.tolerance = time.Second
		o.over.Until = o.over.From.Add(min(o.over.Length(), time.Hour))
		const step = 250 * time.Millisecond
		found := span.Below(o.margin, o.rate, o.over, o.tolerance)
		// A grid's instant stands for a step of which only the start was looked at.
		for _, hit := range grid(o.margin, -o.rate*step.Seconds()-rounding, o.over, step) {
			if !found.Covers(hit) {
				t.Fatalf("%v: %v is not all in %v", o, hit, found)
			}
		}
		might := grid(o.margin, o.rate*(o.tolerance+step).Seconds()+rounding, o.over, step).Widen(0, o.tolerance)
		if extra := found.Subtract(might); len(extra) > 0 {
			t.Fatalf("%v: %v is in %v without cause", o, extra, found)
		}
	}
}

// A bound that is larger than need be, or a margin that is smaller, never opens.
func TestBelowIsMonotone(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for range 3000 {
		o := randomScene(r)
		less := math.Exp(-14 * r.Float64())
		wide := span.Below(func(at time.Time) float64 { return o.margin(at) - less - 2*o.rate*o.tolerance.Seconds() }, o.rate, o.over, o.tolerance)
		if lost := span.Below(o.margin, o.rate, o.over, o.tolerance).Subtract(wide); len(lost) > 0 {
			t.Fatalf("%v: with %v rad less, %v opens", o, less, lost)
		}
	}
}

// A rate that is stated step by step finds what the largest one finds, sooner.
func TestBelowRatedAgainstTheLargestRate(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 14))
	one, all := 0, 0
	for range 2000 {
		a, w, v := 1e4*r.Float64(), 1e3*r.Float64(), math.Exp(-3*r.Float64())
		// Far away it moves slowly: the bound on the coming step grows toward a.
		distance := func(at time.Time) float64 { return math.Abs(at.Sub(dusk).Seconds()-a) - w }
		margin := func(at time.Time) float64 {
			d := distance(at)
			return v * math.Copysign(math.Log1p(math.Abs(d)/100), d)
		}
		over, tolerance := span.Span{From: dusk, Until: dusk.Add(4 * time.Hour)}, 100*time.Millisecond
		rated := span.BelowRated(func(at time.Time) (float64, float64) {
			one++
			d := math.Abs(distance(at))
			// Within half of d the slope is at most v/(100+d/2), which lasts for
			// |m|/rate only if that is no longer; else the largest slope holds.
			m, rate := margin(at), v/(100+d/2)
			if math.Abs(m)/rate > d/2 {
				rate = max(math.Abs(m)/(d/2), rate)
			}
			if d < 1 {
				rate = v / 100
			}
			return m, rate
		}, over, tolerance)
		plain := span.Below(func(at time.Time) float64 { all++; return margin(at) }, v/100, over, tolerance)
		for _, f := range []span.Set{rated, plain} {
			if !f.Covers(span.Span{From: at(a - w), Until: at(a + w)}.Intersect(over)) || f.Total() > time.Duration(2*w*1e9)+2*tolerance {
				t.Fatalf("a %v, w %v: %v", a, w, f)
			}
		}
	}
	t.Logf("evaluations a case: %d rated, %d with the largest rate", one/2000, all/2000)
}

func at(seconds float64) time.Time { return dusk.Add(time.Duration(seconds * 1e9)) }
