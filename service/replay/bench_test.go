package replay_test

import (
	"context"
	"fmt"
	"testing"
	"time"

	"github.com/golang/geo/r3"

	"beamward/service/journal"
	"beamward/service/replay"
)

// busy is a record of a site with so many aircraft, each reported about once a
// second, over a minute of two beams.
func busy(b *testing.B, aircraft int) *journal.Reader {
	b.Helper()
	w := newWorld(b, 1, siteText(b))
	w.opened()
	w.calm(4 * time.Second)
	for i := range aircraft {
		w.tracks[fmt.Sprintf("4%05x", i)] = &flight{from: "rx-1", at: r3.Vector{X: (w.rng.Float64() - 0.5) * 150e3, Y: (w.rng.Float64() - 0.5) * 150e3, Z: 3e3 + 8e3*w.rng.Float64()}, v: r3.Vector{X: (w.rng.Float64() - 0.5) * 400, Y: (w.rng.Float64() - 0.5) * 400}}
	}
	for range 600 {
		w.steady(nil)
		w.fly(100 * time.Millisecond)
		w.turn(100 * time.Millisecond)
		w.flush()
	}
	w.stop()
	r, err := journal.OpenReader(w.dir)
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(func() { _ = r.Close() })
	return r
}

// The bar is 20 times as quick as it happened.
func BenchmarkReplay(b *testing.B) {
	for _, aircraft := range []int{0, 500, 5000} {
		b.Run(fmt.Sprintf("aircraft=%d", aircraft), func(b *testing.B) {
			r := busy(b, aircraft)
			opt := options(r)
			b.ReportAllocs()
			b.ResetTimer()
			var entries uint64
			var span time.Duration
			for b.Loop() {
				rep, err := replay.Replay(context.Background(), r, replay.Range{}, opt)
				if err != nil || !rep.Identical() {
					b.Fatalf("%v, %+v", err, rep.Differences)
				}
				entries += rep.Entries
				span += rep.Until.Sub(rep.From)
			}
			b.ReportMetric(float64(entries)/b.Elapsed().Seconds(), "entries/s")
			b.ReportMetric(span.Seconds()/b.Elapsed().Seconds(), "x-real-time")
			b.ReportMetric(20, "x-real-time-bar")
		})
	}
}

// What an explanation costs, from the run's beginning and amid the run.
func BenchmarkExplain(b *testing.B) {
	s := whole(b)
	for name, near := range map[string]uint64{"whole": 0, "amid": 10} {
		b.Run(name, func(b *testing.B) {
			opt := replay.Options{Texts: s.texts(), Build: thisBuild, Near: near}
			for b.Loop() {
				if _, err := replay.Explain(context.Background(), s.entries, s.named["late"], opt); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(len(s.entries)), "entries-on-record")
		})
	}
}
