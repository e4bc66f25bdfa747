package listfile

import (
	"bytes"
	"fmt"
	"io"
	"math/rand/v2"
	"runtime"
	"runtime/debug"
	"strings"
	"sync"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry/span"

	"github.com/golang/geo/s1"
)

// generated returns a list of n windows, 20 a region, as a night's list has
// them: regions scattered over the sky, windows in order of region and time.
func generated(n int) *closures.ListText {
	rnd := rand.New(rand.NewPCG(1, uint64(n)))
	start := time.Date(2031, 2, 14, 0, 0, 0, 0, time.UTC)
	t := &closures.ListText{ID: "bench", Authority: "orbital-desk", Issued: start.Add(-6 * time.Hour),
		Covers: span.Span{From: start, Until: start.Add(12 * time.Hour)}}
	for i := 0; i < n; i++ {
		if i%20 == 0 {
			t.Regions = append(t.Regions, closures.Region{ID: fmt.Sprintf("f-%06d", i/20), Shape: closures.ICRSCone,
				Direction: equator(picodegrees(rnd.Int64N(360_000_000))*1e6, picodegrees(rnd.Int64N(180_000_000)-90_000_000)*1e6),
				Radius:    0.05 * s1.Degree})
		}
		from := start.Add(time.Duration(i%20)*36*time.Minute + time.Duration(rnd.Int64N(30*60))*time.Second)
		t.Windows = append(t.Windows, closures.Window{Region: int32(len(t.Regions) - 1), From: from.UnixNano(),
			Until: from.Add(time.Duration(10+rnd.Int64N(50)) * time.Second).UnixNano(), Ref: fmt.Sprintf("A-%07d", i)})
	}
	t.Digest = Digest(t)
	return t
}

// heapPeak runs f and returns the largest heap in use that a sampler saw,
// above what was in use before.
func heapPeak(f func()) (peak uint64) {
	debug.FreeOSMemory()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	before := m.HeapInuse
	stop := make(chan struct{})
	var done sync.WaitGroup
	done.Go(func() {
		tick := time.NewTicker(5 * time.Millisecond)
		defer tick.Stop()
		for {
			select {
			case <-stop:
				return
			case <-tick.C:
				var m runtime.MemStats
				runtime.ReadMemStats(&m)
				peak = max(peak, m.HeapInuse-min(before, m.HeapInuse))
			}
		}
	})
	f()
	close(stop)
	done.Wait()
	return peak
}

// textOf returns a list of n windows as a writer writes it.
func textOf(b *testing.B, list *closures.ListText, write func(io.Writer, *closures.ListText) error) []byte {
	var text bytes.Buffer
	if err := write(&text, list); err != nil {
		b.Fatal(err)
	}
	return text.Bytes()
}

// benchmarkLoad reads a text until it is ready for use, and prints the budget.
func benchmarkLoad(b *testing.B, what string, text []byte, budget string, load func(io.Reader) error) {
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	b.ResetTimer()
	for b.Loop() {
		if err := load(bytes.NewReader(text)); err != nil {
			b.Fatal(err)
		}
	}
	b.StopTimer()
	peak := heapPeak(func() { _ = load(bytes.NewReader(text)) })
	b.ReportMetric(float64(peak)/mebibyte, "MiB-peak")
	b.Logf("%s: %.2f s; %.0f MiB at most on the heap; budget %s", what, b.Elapsed().Seconds()/float64(b.N), float64(peak)/mebibyte, budget)
}

func benchmarkRead(b *testing.B, n int, format Format, write func(io.Writer, *closures.ListText) error, budget string) {
	text := textOf(b, generated(n), write)
	benchmarkLoad(b, fmt.Sprintf("%d windows as %v", n, format), text, budget, func(r io.Reader) error {
		_, _, err := Load(r, format, Limits{})
		return err
	})
}

func BenchmarkReadCSV1M(b *testing.B) {
	benchmarkRead(b, 1_000_000, CSV, WriteCSV, "3 s, 600 MiB")
}

func BenchmarkReadJSON1M(b *testing.B) {
	benchmarkRead(b, 1_000_000, JSON, WriteJSON, "none is set")
}

func BenchmarkReadYAML50k(b *testing.B) {
	benchmarkRead(b, 50_000, YAML, WriteYAML, "3 s")
}

// BenchmarkReadCSV1MUnordered reads windows in no order, which have to be
// sorted.
func BenchmarkReadCSV1MUnordered(b *testing.B) {
	list := generated(1_000_000)
	rnd := rand.New(rand.NewPCG(2, 3))
	rnd.Shuffle(len(list.Windows), func(i, j int) { list.Windows[i], list.Windows[j] = list.Windows[j], list.Windows[i] })
	benchmarkLoad(b, "1000000 windows as csv in no order", textOf(b, list, WriteCSV), "3 s, 600 MiB", func(r io.Reader) error {
		_, _, err := Load(r, CSV, Limits{})
		return err
	})
}

// BenchmarkLayout reads the invented table made long.
func BenchmarkLayout(b *testing.B) {
	l := compiled(b, file(b, "table.yaml"))
	lines := strings.SplitAfter(string(file(b, "table.txt")), "\n")
	var rows strings.Builder
	const n = 50_000
	for i := range n {
		fmt.Fprintf(&rows, " s-%-5d |  10.006667 | +02.2000 |  180 | %02d:%02d:%02d     |    39 | A%d\n", i/20, 21+i%20/10, i%10*5, i%7, i)
	}
	text := strings.Join(lines[:9], "") + rows.String() + fmt.Sprintf("rows %d\n", n)
	benchmarkLoad(b, fmt.Sprintf("%d windows through a layout", n), []byte(text), "none is set", func(r io.Reader) error {
		_, _, err := l.Load(r, Limits{})
		return err
	})
}
