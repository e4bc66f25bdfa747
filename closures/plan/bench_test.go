package plan_test

import (
	"encoding/json"
	"fmt"
	"io"
	"math/rand/v2"
	"os/exec"
	"runtime"
	"runtime/debug"
	"sync"
	"syscall"
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
			spans, before := 0, processor()
			for b.Loop() {
				spans = t.all(b, cores)
			}
			b.ReportMetric(float64(processor()-before)/float64(b.N), "cpu-ns/op")
			b.ReportMetric(1e9, "budget-ns/op")
			b.ReportMetric(float64(spans)/float64(len(t.aims)), "spans/target")
		})
	}
}

// processor is the processor time that this process has had: on a machine that
// others use too it tells more than the wall clock.
func processor() time.Duration {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

// BenchmarkGrowth prints what a target costs as one thing grows.
func BenchmarkGrowth(b *testing.B) {
	grow := func(what string, of ...sizes) {
		for _, z := range of {
			n := map[string]int{"targets": z.targets, "windows": z.windows, "neighbours": z.neighbours}[what]
			b.Run(fmt.Sprintf("%s-%d", what, n), func(b *testing.B) {
				t := makeTask(b, z)
				before := processor()
				for b.Loop() {
					t.all(b, 1)
				}
				each := float64(b.N) * float64(len(t.aims))
				b.ReportMetric(float64(b.Elapsed())/each, "ns/target")
				b.ReportMetric(float64(processor()-before)/each, "cpu-ns/target")
			})
		}
	}
	grow("targets", sizes{100, 20, 2}, sizes{1000, 20, 2}, sizes{10_000, 20, 2}, sizes{30_000, 20, 2})
	grow("windows", sizes{1000, 0, 2}, sizes{1000, 20, 2}, sizes{1000, 100, 2}, sizes{1000, 500, 2})
	grow("neighbours", sizes{1000, 20, 0}, sizes{1000, 20, 1}, sizes{1000, 20, 2}, sizes{1000, 20, 4}, sizes{1000, 20, 8})
}

// BenchmarkStream reads 100,000 targets and plans one after the other, keeping
// no plan: within 300 MiB, a list of 200,000 windows included.
func BenchmarkStream(b *testing.B) {
	const targets = 100_000
	t := makeTask(b, sizes{10_000, 20, 2})
	t.aims = nil
	var most uint64
	look := func() {
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		most = max(most, m.Sys-m.HeapReleased)
	}
	debug.FreeOSMemory()
	for b.Loop() {
		list, err := plan.ReadTargets(&catalogue{left: targets, rng: rand.New(rand.NewPCG(1, 1))})
		if err != nil || len(list) != targets {
			b.Fatal(len(list), err)
		}
		var scratch plan.Scratch
		for i := range list {
			p, err := t.planner.Target(&list[i], &scratch)
			if err != nil || len(p.Blocked) == 0 && len(p.Spans) == 0 {
				b.Fatal(err)
			}
			if i%5000 == 0 {
				look()
			}
		}
	}
	b.ReportMetric(float64(most)/(1<<20), "MiB")
	b.ReportMetric(300, "budget-MiB")
	b.ReportMetric(float64(b.Elapsed())/float64(b.N)/targets, "ns/target")
}

// catalogue writes a table of targets as it is read.
type catalogue struct {
	left int
	rng  *rand.Rand
	rest []byte
	head bool
}

func (c *catalogue) Read(p []byte) (int, error) {
	if len(c.rest) == 0 {
		switch {
		case !c.head:
			c.head = true
			c.rest = []byte("name,ra_deg,dec_deg,pm_ra_mas_yr,pm_dec_mas_yr,length_s,priority\n")
		case c.left > 0:
			c.rest = fmt.Appendf(c.rest[:0], "field-%06d,%.6f,%.6f,%.2f,%.2f,900,1\n", c.left, 360*c.rng.Float64(), 170*c.rng.Float64()-85, 50*c.rng.NormFloat64(), 50*c.rng.NormFloat64())
			c.left--
		default:
			return 0, io.EOF
		}
	}
	n := copy(p, c.rest)
	c.rest = c.rest[n:]
	return n, nil
}

// BenchmarkFit prints how much of the bound is reached where many targets want
// the night.
func BenchmarkFit(b *testing.B) {
	for _, n := range []int{50, 200, 1000} {
		b.Run(fmt.Sprint("targets-", n), func(b *testing.B) {
			t := makeTask(b, sizes{n, 20, 2})
			rng := rand.New(rand.NewPCG(9, 9))
			var targets []plan.Target
			for i, a := range t.aims {
				targets = append(targets, plan.Target{Name: fmt.Sprint(i), Aim: a, Length: time.Duration(5+rng.IntN(40)) * time.Minute, Priority: float64(1 + rng.IntN(5)), Use: plan.Use{Reacquire: time.Minute}})
			}
			var scratch plan.Scratch
			var got plan.Fitted
			for b.Loop() {
				var err error
				if got, err = t.planner.Fit(targets, &scratch); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(100*got.Loss(), "%loss-at-most")
			b.ReportMetric(float64(len(got.Placed)), "placed")
		})
	}
}

// BenchmarkBesideGrid prints what a target costs here and, where Debian's
// python3-astroplan is installed, on its grid of one minute: for one target
// alone, and for 10,000 at once. The grid knows elevation and twilight; "plain"
// here is as much, "whole" adds lists and neighbours.
func BenchmarkBesideGrid(b *testing.B) {
	alone, version := grid(b, 1)
	many, _ := grid(b, 10_000)
	b.Logf("astroplan %s: %.0f ns a target alone, %.0f of 10,000 at once", version, alone, many)
	for name, z := range map[string]sizes{"plain": {10_000, 0, 0}, "whole": {10_000, 20, 2}} {
		b.Run(name, func(b *testing.B) {
			t := makeTask(b, z)
			for b.Loop() {
				t.all(b, 1)
			}
			each := float64(b.Elapsed()) / float64(b.N) / float64(len(t.aims))
			b.ReportMetric(each, "ns/target")
			b.ReportMetric(alone/each, "times-alone")
			b.ReportMetric(many/each, "times-at-once")
		})
	}
}

// grid runs the rival and returns ns a target.
func grid(b *testing.B, targets int) (each float64, version string) {
	for _, python := range []string{"python3", "/usr/bin/python3"} {
		if exec.Command(python, "-c", "import astroplan").Run() != nil {
			continue
		}
		out, err := exec.Command(python, "testdata/grid.py", fmt.Sprint(targets)).Output()
		if err != nil {
			b.Skipf("the grid does not run: %v", err)
		}
		var said struct {
			Seconds float64
			Version string
		}
		if err := json.Unmarshal(out, &said); err != nil {
			b.Skipf("the grid says %q", out)
		}
		return said.Seconds * 1e9 / float64(targets), said.Version
	}
	b.Skip("no python3 with astroplan is installed (Debian: python3-astroplan)")
	return 0, ""
}
