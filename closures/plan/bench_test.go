package plan_test

import (
	"fmt"
	"math/rand/v2"
	"runtime"
	"sync"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry"
	"beamward/geometry/span"
)

// sizes of a planning task.
type sizes struct{ targets, windows, neighbours int }

// task is a night with a list that has a region and its windows for each
// target, and neighbours that track stars high in the sky.
type task struct {
	foreseen *closures.Foreseen
	over     span.Span
	planner  *plan.Planner
	aims     []*closures.Aim
}

func makeTask(tb testing.TB, z sizes) *task {
	tb.Helper()
	rng := rand.New(rand.NewPCG(3, 4))
	r := rules(-31.5, -4)
	r.Beams[0].Launches = r.Beams[0].Launches[:1]
	from := time.Date(2031, 2, 13, 19, 0, 0, 0, time.UTC)
	t := &task{over: span.Span{From: from, Until: from.Add(12 * time.Hour)}}
	nights, err := plan.Nights(r, t.over)
	if err != nil {
		tb.Fatal(err)
	}
	r.Neighbours = nil
	f := &closures.Foreseen{Rules: r, Air: r.Site.Air.Over(r.Site.Position.Height)}
	upAt := func(at time.Time) *closures.Aim {
		n := nights[0]
		for _, o := range nights {
			if closures.BinOf(o).Contains(at) {
				n = o
			}
		}
		up := geometry.FromHorizon(s1.Angle(rng.Float64())*360*s1.Degree, s1.Angle(20+65*rng.Float64())*s1.Degree)
		return &closures.Aim{Frame: closures.ICRS, Direction: n.ICRS(up, at), Reference: from, Motion: closures.Tracking}
	}
	for i := range z.neighbours {
		id := closures.TelescopeID(fmt.Sprint("t", i))
		n := closures.NeighbourRules{ID: id, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: 2 * time.Hour}
		n.Offset.X, n.Offset.Y, n.Offset.Z = 140*float64(i+1), -60, 3
		r.Neighbours = append(r.Neighbours, n)
		f.Pointings = append(f.Pointings, closures.Pointing{Telescope: id, Aim: upAt(from.Add(5 * time.Hour)), Heard: from, AimBegan: from})
	}
	text := &closures.ListText{ID: "tonight", Authority: "orbital-desk", Issued: from.Add(-time.Hour), Covers: span.Span{From: from.Add(-time.Hour), Until: t.over.Until.Add(time.Hour)}, UnlistedOpen: true, Digest: closures.Digest{9}}
	for i := range z.targets {
		a := upAt(from.Add(time.Duration(rng.Int64N(int64(12 * time.Hour)))))
		t.aims = append(t.aims, a)
		if z.windows == 0 {
			continue
		}
		text.Regions = append(text.Regions, closures.Region{ID: fmt.Sprint("f", i), Shape: closures.ICRSCone, Direction: a.Direction, Radius: 0.05 * s1.Degree})
		for range z.windows {
			w := text.Covers.From.Add(time.Duration(rng.Int64N(int64(13 * time.Hour))))
			text.Windows = append(text.Windows, closures.Window{Region: int32(i), From: w.UnixNano(), Until: w.Add(time.Duration(10+rng.IntN(50)) * time.Second).UnixNano()})
		}
	}
	l, err := closures.Index(text)
	if err != nil {
		tb.Fatal(err)
	}
	f.Lists = []closures.Listed{{List: l}}
	t.foreseen = f
	if t.planner, err = plan.Prepare(f, "north", t.over, nights); err != nil {
		tb.Fatal(err)
	}
	return t
}

// all plans every target on so many cores.
func (t *task) all(tb testing.TB, cores int) (spans int) {
	var wg sync.WaitGroup
	counts := make([]int, cores)
	for c := range cores {
		wg.Add(1)
		go func() {
			defer wg.Done()
			var scratch plan.Scratch
			for i := c; i < len(t.aims); i += cores {
				a, err := t.planner.One(t.aims[i], &scratch)
				if err != nil {
					tb.Error(err)
					return
				}
				counts[c] += len(a.Spans)
			}
		}()
	}
	wg.Wait()
	for _, n := range counts {
		spans += n
	}
	return spans
}

// BenchmarkNight is the budget: 10,000 targets over 12 h against 2 neighbours
// and 20 windows a target, edges to 0.1 s, within a second on two cores.
func BenchmarkNight(b *testing.B) {
	t := makeTask(b, sizes{10_000, 20, 2})
	for _, cores := range []int{1, 2} {
		b.Run(fmt.Sprintf("cores-%d", cores), func(b *testing.B) {
			if cores > runtime.GOMAXPROCS(0) {
				b.Skip("not so many cores")
			}
			b.ReportAllocs()
			spans := 0
			for b.Loop() {
				spans = t.all(b, cores)
			}
			b.ReportMetric(1e9, "budget-ns/op")
			b.ReportMetric(float64(spans)/float64(len(t.aims)), "spans/target")
		})
	}
}
