package closures

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// crossingScene is a beam and a neighbour at a random site, from 10 m to 50 km
// apart, with aims of any frame that turns with the sky, often near to each
// other as seen from the telescope.
func crossingScene(rng *rand.Rand) (f *Foreseen, q *Question, n *NeighbourRules, p *Pointing, night *sky.Night, at time.Time) {
	r := busyRules()
	r.Site.Position.Lat = s1.Angle(170*rng.Float64()-85) * s1.Degree
	r.Site.Position.Lon = s1.Angle(360*rng.Float64()-180) * s1.Degree
	b := &r.Beams[0]
	b.Launches = []Launch{{ID: "a", Offset: r3.Vector{X: 20 * rng.NormFloat64(), Y: 20 * rng.NormFloat64(), Z: 10 * rng.Float64()}}}
	b.Aim.Error = s1.Angle(rng.Float64()*100) * geometry.Arcsecond
	if rng.IntN(4) == 0 {
		b.GuideStar = GuideStar{Rayleigh: true, From: 8000, Until: geometry.Length(12e3 + 20e3*rng.Float64())}
	}
	apart := math.Exp(math.Log(10) + rng.Float64()*math.Log(5000))
	az := rng.Float64() * 2 * math.Pi
	r.Neighbours = []NeighbourRules{{ID: "t", Offset: r3.Vector{X: apart * math.Sin(az), Y: apart * math.Cos(az), Z: apart * 0.2 * rng.NormFloat64()}, Aperture: geometry.Length(8 * rng.Float64()), Field: s1.Angle(math.Exp(-6*rng.Float64())) * 3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: time.Hour}}
	n = &r.Neighbours[0]
	night, err := sky.Prepare(r.Site.Position, evening, r.Site.UT1)
	if err != nil {
		panic(err)
	}
	bin := BinOf(night)
	at = bin.From.Add(time.Duration(rng.Int64N(int64(bin.Length()))))
	up := func() r3.Vector {
		return geometry.FromHorizon(s1.Angle(rng.Float64()*2*math.Pi), s1.Angle(math.Asin(rng.Float64())))
	}
	aim := func(dir r3.Vector) *Aim {
		a := &Aim{Frame: ICRS, Direction: night.ICRS(dir, at), Reference: at, Motion: Tracking}
		switch rng.IntN(5) {
		case 0:
			a.RateRA, a.RateDec = rng.NormFloat64()*1e-7, rng.NormFloat64()*1e-7
		case 1:
			a.Frame, a.Direction = OfDate, night.ToDate(dir, at)
		case 2:
			a.Frame = Table
			v := a.Direction
			for k := range 4 {
				a.Points = append(a.Points, AimPoint{At: at.Add(time.Duration(k-1) * 30 * time.Minute), Direction: v})
				v = v.Add(r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Mul(1e-4)).Normalize()
			}
		}
		return a
	}
	beam := up()
	axis := up()
	if rng.IntN(3) > 0 { // look at a point of the beam, nearly
		s := math.Exp(rng.Float64() * math.Log(200e3))
		axis = b.Launches[0].Offset.Add(beam.Mul(s)).Sub(n.Offset).Normalize()
		off := float64(n.Field) * 3 * math.Abs(rng.NormFloat64()) * math.Exp(-4*rng.Float64())
		axis = axis.Add(r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize().Mul(off)).Normalize()
	}
	f = &Foreseen{Rules: r, Air: r.Site.Air.Over(r.Site.Position.Height), Pointings: []Pointing{{Telescope: "t", Aim: aim(axis), Heard: at}}}
	q = &Question{Beam: b, Aim: aim(beam), Over: span.Span{From: at, Until: at.Add(time.Hour)}, Nights: []*sky.Night{night}, Edge: EdgePlan, Slack: PlanSlack}
	return f, q, n, &f.Pointings[0], night, at
}

// How long a margin stays on its side, as a passage says, against dense samples
// of the margin: never a moment longer. BW-018
func TestPassagesPromiseNoLongerThanTrue(t *testing.T) {
	scenes := 60_000
	if os.Getenv("BEAMWARD_LONG") != "" {
		scenes = 1_000_000
	}
	rng := rand.New(rand.NewPCG(5, 6))
	var clear, shut, clearMore, shutMore int
	var gain float64
	for range scenes {
		f, q, n, p, night, at := crossingScene(rng)
		o, err := f.passage(q, n, p, &q.Beam.Launches[0])
		if err != nil {
			t.Fatal(err)
		}
		beam, _ := q.overhead()
		theirs := Question{Beam: q.Beam, Aim: p.Aim}
		axis, axisRate := theirs.overhead()
		margin := func(at time.Time) (m, rate float64) {
			a := axis(night, at)
			r := o.pair.Margin(beam(night, at), a)
			lift, slope := liftNear(a)
			return r.Margin - lift, r.Rate + slope*axisRate
		}
		b, a := beam(night, at), axis(night, at)
		r := o.pair.Margin(b, a)
		lift, _ := liftNear(a)
		m, rate := margin(at)
		spare := rng.Float64() * 1e-5
		sure := 0.0
		if m > spare {
			if sure = o.clear(b, a, &r, spare, lift, m/rate); sure > 0 {
				clear++
			}
			if sure > m/rate {
				clearMore++
				gain += math.Log(sure * rate / m)
			}
		} else {
			if sure = o.shut(b, a, &r, spare, lift); sure > 0 {
				shut++
			}
			if sure > -m/rate {
				shutMore++
			}
		}
		if math.IsNaN(sure) || sure < 0 {
			t.Fatalf("a time of %v", sure)
		}
		for k := range 24 {
			part := float64(k+1) / 24
			if k%3 == 0 {
				part = 1 - math.Pow(10, -1-float64(k)/6)
			}
			then := at.Add(time.Duration(sure * part * 1e9))
			if !BinOf(night).Contains(then) || q.Aim.Frame == Table && then.Sub(at) > 55*time.Minute || p.Aim.Frame == Table && then.Sub(at) > 55*time.Minute {
				continue
			}
			// 1e-9 rad is the rounding that package crossing states.
			switch now, _ := margin(then); {
			case m > spare && !(now > spare-1e-9):
				t.Fatalf("clear by %v for %v s, but %v after %v of that; beam %v axis %v neighbour %+v", m, sure, now, part, b, a, n)
			case m <= spare && !(now <= spare+1e-9):
				t.Fatalf("shut by %v for %v s, but %v after %v of that; beam %v axis %v neighbour %+v", m, sure, now, part, b, a, n)
			}
		}
	}
	t.Logf("%d clear, %d of them longer than the pair's rate says, by a factor of %.1f in the mean; %d shut, %d of them longer", clear, clearMore, math.Exp(gain/float64(clearMore)), shut, shutMore)
	if clearMore < scenes/10 || shutMore < scenes/50 {
		t.Error("the scenes leave nothing to test")
	}
}

// A fixed star's airless direction, turned back by the sky's turn about the
// pole, drifts no faster than together says.
func TestStarsTurnTogether(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	worst := 0.0
	for range 2000 {
		r := busyRules()
		r.Site.Position.Lat = s1.Angle(180*rng.Float64()-90) * s1.Degree
		at := time.Date(2020+rng.IntN(15), 1, 1, 0, 0, 0, 0, time.UTC).Add(time.Duration(rng.Int64N(int64(365 * 24 * time.Hour))))
		night, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
		if err != nil {
			t.Fatal(err)
		}
		sin, cos := math.Sincos(r.Site.Position.Lat.Radians())
		pole := r3.Vector{Y: cos, Z: sin}
		star := r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize()
		if rng.IntN(4) == 0 { // beside the Sun
			star = night.ICRS(night.Sun(at).Add(r3.Vector{X: rng.NormFloat64(), Y: rng.NormFloat64(), Z: rng.NormFloat64()}.Normalize().Mul(0.005)).Normalize(), at)
		}
		later := at.Add(time.Duration(1+rng.IntN(3600)) * time.Second)
		if !BinOf(night).Contains(later) {
			continue
		}
		past := later.Sub(at).Seconds()
		v := night.Horizon(star, later)
		s, c := math.Sincos(skyTurn * past)
		back := v.Mul(c).Add(pole.Cross(v).Mul(s)).Add(pole.Mul(pole.Dot(v) * (1 - c)))
		worst = max(worst, geometry.Separation(back, night.Horizon(star, at)).Radians()/past)
	}
	t.Logf("at most %.2g of the bound", worst/together)
	if !(worst <= together) {
		t.Errorf("%g rad/s, bound %g", worst, together)
	}
}
