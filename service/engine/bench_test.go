package engine

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"path/filepath"
	"runtime"
	"slices"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// machineClock is the machine's own, without any check.
type machineClock struct{ start time.Time }

func (c machineClock) Read() (time.Time, time.Duration) {
	d := time.Since(c.start)
	return evening.Add(d), time.Hour + d
}
func (c machineClock) Boot() time.Duration { _, b := c.Read(); return b }
func (c machineClock) Wall() time.Time     { w, _ := c.Read(); return w }
func (c machineClock) AfterFunc(d time.Duration, f func()) func() bool {
	return time.AfterFunc(d, f).Stop
}

// traffic is lines of aircraft reports about the site, each aircraft in turn.
func traffic(r *closures.Rules, aircraft int, at time.Time) [][]byte {
	lines := make([][]byte, aircraft)
	for i := range lines {
		turn := 2 * math.Pi * float64(i) / float64(aircraft)
		lat := r.Site.Position.Lat.Degrees() + 0.6*math.Sin(turn)
		lon := r.Site.Position.Lon.Degrees() + 0.6*math.Cos(turn)
		lines[i] = fmt.Appendf(nil, `{"kind":"aircraft","source":"rx-%d","at":"%s","aircraft":"%06x","lat_deg":%.5f,"lon_deg":%.5f,"altitude_m":%d,"altitude_from":"ellipsoid","speed_mps":220,"track_deg":%.1f,"climb_mps":0,"error_m":50,"vertical_error_m":30,"velocity_error_mps":5,"on_ground":false}`,
			1+i%2, wire.FormatTime(at), 0x400000+i, lat, lon, 9000+i%3000, 360*float64(i)/float64(aircraft))
	}
	return lines
}

// bareAircraft is what a sender's line holds, for encoding/json.
type bareAircraft struct {
	Kind          string    `json:"kind"`
	Source        string    `json:"source"`
	At            time.Time `json:"at"`
	Aircraft      string    `json:"aircraft"`
	Lat           float64   `json:"lat_deg"`
	Lon           float64   `json:"lon_deg"`
	Altitude      float64   `json:"altitude_m"`
	AltitudeFrom  string    `json:"altitude_from"`
	Speed         float64   `json:"speed_mps"`
	Track         float64   `json:"track_deg"`
	Climb         float64   `json:"climb_mps"`
	Error         float64   `json:"error_m"`
	VerticalError float64   `json:"vertical_error_m"`
	VelocityError float64   `json:"velocity_error_mps"`
	OnGround      bool      `json:"on_ground"`
}

// Aircraft reports read from their lines, offered as fast as one sender can,
// and applied or superseded by the running engine. Beside it, encoding/json
// alone on the same lines. Budget: 100,000 /s, and half of the rival.
func BenchmarkIntake(b *testing.B) {
	clk := machineClock{time.Now()}
	r := withAircraft(siteRules())
	e, err := New(Options{
		Clock: clk, Health: func() ClockReport { return newHandClock().report }, Record: &slate{forget: true}, Rules: r,
		Boot: closures.Boot{ID: "bench", At: evening}, Prepare: nights,
	})
	if err != nil {
		b.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	ended := make(chan error, 1)
	go func() { ended <- e.Run(ctx) }()
	lines := traffic(r, 1000, evening)
	parser := wire.NewParser(4096)

	b.ResetTimer()
	start := time.Now()
	for i := range b.N {
		_, body, err := parser.Fact(lines[i%len(lines)], evening)
		if err != nil {
			b.Fatal(err)
		}
		if _, err := e.Offer("tcp", body); err != nil {
			b.Fatal(err)
		}
	}
	took := time.Since(start)
	b.StopTimer()
	cancel()
	if err := <-ended; err != nil {
		b.Fatal(err)
	}
	var in, superseded uint64
	for _, k := range e.Stats().Kinds {
		if k.Kind == "aircraft" {
			in, superseded = k.Accepted, k.Superseded
		}
	}
	if in != uint64(b.N) {
		b.Fatalf("%d of %d taken in", in, b.N)
	}

	bareStart := time.Now()
	n := min(max(b.N, 1000), 100_000)
	for i := range n {
		var a bareAircraft
		if err := json.Unmarshal(lines[i%len(lines)], &a); err != nil {
			b.Fatal(err)
		}
	}
	bare := float64(n) / time.Since(bareStart).Seconds()
	rate := float64(b.N) / took.Seconds()
	b.ReportMetric(rate, "facts/s")
	b.ReportMetric(float64(in-superseded)/took.Seconds(), "applied/s")
	b.ReportMetric(float64(superseded)/took.Seconds(), "superseded/s")
	b.ReportMetric(bare, "bare-json/s")
	b.ReportMetric(rate/bare, "of-bare-json")
	b.ReportMetric(100_000, "budget-facts/s")
}

// onRecord writes the engine's entries into a journal, as the service does.
type onRecord struct{ *journal.Journal }

func (r onRecord) Append(entries []Entry) error {
	out := make([]journal.Entry, len(entries))
	for i, e := range entries {
		out[i] = journal.Entry{Seq: e.Seq, At: e.At, Urgent: e.Urgent, Kind: "other", Body: []byte("{}")}
		var err error
		switch w := e.What.(type) {
		case Admitted:
			out[i].Kind, out[i].Body, err = wire.EncodeBody(nil, w.Fact)
		case Decided:
			out[i].Kind = wire.KindDecision
			out[i].Body, err = wire.EncodeDecision(nil, &w.Decision)
		case Kept:
			out[i].Kind = journal.KindDurable
			out[i].Body, err = wire.EncodeDurable(nil, &w.Durable)
		}
		if err != nil {
			return err
		}
	}
	return r.Journal.Append(out)
}

func (r onRecord) Condition() Condition {
	s := r.Journal.State()
	return Condition{Durable: s.Durable, Behind: s.Behind, Half: s.Half, Full: s.Full, Gap: s.Gap, Failed: s.Err != nil}
}

func (r onRecord) Flush(ctx context.Context) error {
	return r.Journal.Wait(ctx, r.Journal.State().Queued)
}

// Every report admitted, decided and on disk: 5,000 aircraft, 200 reports a
// turn, which is 10 ms at the budget of 20,000 /s. It ends when the store has
// all of them.
func BenchmarkEachOnRecord(b *testing.B) {
	clk := machineClock{time.Now()}
	j, err := journal.Open(journal.Options{Dir: filepath.Join(b.TempDir(), "record"), Clock: clk})
	if err != nil {
		b.Fatal(err)
	}
	defer j.Close()
	ctx, cancel := context.WithCancel(context.Background())
	ended := make(chan error, 1)
	go func() { ended <- j.Run(ctx) }()
	defer func() { cancel(); <-ended }()
	r := withAircraft(siteRules())
	e, err := New(Options{
		Clock: clk, Health: func() ClockReport { return newHandClock().report }, Record: onRecord{j}, Rules: r,
		Boot: closures.Boot{ID: "bench", At: evening}, Prepare: nights,
	})
	if err != nil {
		b.Fatal(err)
	}
	s, err := e.Stepper()
	if err != nil {
		b.Fatal(err)
	}
	lines := traffic(r, 5000, evening)
	parser := wire.NewParser(16384)
	b.ResetTimer()
	start := time.Now()
	for i := range b.N {
		_, body, err := parser.Fact(lines[i%len(lines)], evening)
		if err != nil {
			b.Fatal(err)
		}
		for {
			if _, err := e.Offer("tcp", body); err == nil {
				break
			}
			runtime.Gosched() // the record is full: a sender waits
			if _, err := s.Turn(); err != nil {
				b.Fatal(err)
			}
		}
		if i%200 == 199 {
			if _, err := s.Turn(); err != nil {
				b.Fatal(err)
			}
		}
	}
	if _, err := s.Turn(); err != nil {
		b.Fatal(err)
	}
	if err := (onRecord{j}).Flush(ctx); err != nil {
		b.Fatal(err)
	}
	took := time.Since(start)
	b.StopTimer()
	st := e.Stats()
	b.ReportMetric(float64(b.N)/took.Seconds(), "facts/s")
	b.ReportMetric(float64(st.Lost), "lost-entries")
	b.ReportMetric(float64(st.Decide.Sum.Microseconds())/float64(st.Batches), "µs/step")
	b.ReportMetric(20_000, "budget-facts/s")
}

// A turn in which one aim came: what each decision costs beside the core.
func BenchmarkTurn(b *testing.B) {
	w := newSite(b, siteRules()).opened()
	w.rec.forget = true
	b.ReportAllocs()
	b.ResetTimer()
	for range b.N {
		w.clock.advance(time.Millisecond)
		w.steady()
		if _, err := w.s.Turn(); err != nil {
			b.Fatal(err)
		}
	}
}

// From the arrival of a device's word to the view that shows it, with 2,000
// aircraft reports a second beside it. Budget: 10 ms at the 99th percentile,
// of which HTTP and the stream take their part.
func BenchmarkWordToView(b *testing.B) {
	clk := machineClock{time.Now()}
	r := withAircraft(siteRules())
	e, err := New(Options{
		Clock: clk, Health: func() ClockReport { return newHandClock().report }, Record: &slate{forget: true}, Rules: r,
		Boot: closures.Boot{ID: "bench", At: evening}, Prepare: nights,
	})
	if err != nil {
		b.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	ended := make(chan error, 2)
	go func() { ended <- e.Run(ctx) }()
	go func() {
		lines := traffic(r, 500, evening)
		parser := wire.NewParser(4096)
		tick := time.NewTicker(5 * time.Millisecond)
		defer tick.Stop()
		for n := 0; ctx.Err() == nil; <-tick.C {
			for range 10 {
				_, body, err := parser.Fact(lines[n%len(lines)], evening)
				if err == nil {
					_, err = e.Offer("tcp", body)
				}
				if err != nil {
					b.Error(err)
				}
				n++
			}
		}
		ended <- nil
	}()
	updates, stop := e.Watch(1 << 16)
	defer stop()
	for u := range updates { // until the first turn is made
		if u.View.Started {
			break
		}
	}
	took := make([]time.Duration, 0, b.N)
	b.ResetTimer()
	for i := range b.N {
		at, _ := clk.Read()
		start := time.Now()
		if _, err := e.Offer("tcp", closures.InterlockSeen{Source: "catwalk", Said: at, Safe: i%2 == 1}); err != nil {
			b.Fatal(err)
		}
		for u := range updates {
			if u.View.At.After(at) && len(u.Beams) > 0 {
				break
			}
		}
		took = append(took, time.Since(start))
		time.Sleep(time.Millisecond)
	}
	b.StopTimer()
	cancel()
	for range 2 {
		if err := <-ended; err != nil {
			b.Fatal(err)
		}
	}
	slices.Sort(took)
	b.ReportMetric(float64(took[len(took)/2].Microseconds()), "µs-p50")
	b.ReportMetric(float64(took[len(took)*99/100].Microseconds()), "µs-p99")
	b.ReportMetric(10_000, "budget-µs-p99")
}
