package closures

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// How long an elevation stays off some levels, against dense samples: never a
// moment longer, and mostly as long as it does. BW-018
func TestElevationsStayNoLongerThanTrue(t *testing.T) {
	rng := rand.New(rand.NewPCG(15, 16))
	var told, tight, reached int
	for range 20_000 {
		r := busyRules()
		r.Site.Position.Lat = s1.Angle(180*rng.Float64()-90) * s1.Degree
		night, err := sky.Prepare(r.Site.Position, evening, r.Site.UT1)
		if err != nil {
			t.Fatal(err)
		}
		bin := BinOf(night)
		at := bin.From.Add(time.Duration(rng.Int64N(int64(bin.Length()))))
		a := &Aim{Frame: ICRS, Direction: night.ICRS(geometry.FromHorizon(s1.Angle(2*math.Pi*rng.Float64()), s1.Angle(math.Asin(2*rng.Float64()-1))), at), Reference: at}
		if rng.IntN(3) == 0 {
			a.RateRA, a.RateDec = 1e-6*rng.NormFloat64(), 1e-6*rng.NormFloat64()
		}
		q := Question{Beam: &r.Beams[0], Aim: a, Over: span.Span{From: at, Until: bin.Until}, Nights: []*sky.Night{night}}
		direction, rate := q.overhead()
		turn := q.turning(&Foreseen{Rules: r})
		el := func(at time.Time) float64 {
			d := direction(night, at)
			return math.Atan2(d.Z, math.Hypot(d.X, d.Y))
		}
		now := el(at)
		levels := []float64{math.Asin(2*rng.Float64() - 1), now + rng.NormFloat64()*math.Exp(-12*rng.Float64()), 1.6}
		soon := math.Inf(1)
		for _, l := range levels {
			soon = min(soon, math.Abs(now-l)/rate)
		}
		sure := turn.stays(direction(night, at), soon, levels...)
		if !(sure >= 0) {
			t.Fatalf("%v", sure)
		}
		if sure == 0 {
			continue
		}
		told++
		sides := func(e float64) (s [3]bool) {
			for i, l := range levels {
				s[i] = e > l
			}
			return s
		}
		was := sides(now)
		for k := range 30 {
			part := float64(k) / 29
			if k%3 == 0 {
				part = 1 - math.Pow(10, -1-float64(k)/6)
			}
			if then := at.Add(time.Duration(sure * part * 1e9)); bin.Contains(then) && sides(el(then)) != was {
				t.Fatalf("elevation %v, levels %v: sure for %v s, but not after %v of it", now, levels, sure, part)
			}
		}
		if end := at.Add(time.Duration(sure * 1e9)); bin.Contains(end) && sure < 29*soon && sure < 40_000 {
			reached++
			e := el(end)
			for _, l := range levels {
				if math.Abs(e-l) < 2*(turn.turns*30*soon+1e-9) {
					tight++
					break
				}
			}
		}
	}
	t.Logf("%d told, %d of %d reach a level where they end", told, tight, reached)
	if told < 15_000 || tight < reached*9/10 {
		t.Error("what is told is of little use")
	}
}
