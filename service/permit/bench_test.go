package permit

import (
	"bufio"
	"io"
	"net"
	"net/http"
	"sync/atomic"
	"testing"
	"time"

	"beamward/closures"
)

// reads asks over and over on one connection of each of two readers, and
// returns how many answers came a second.
func reads(b *testing.B, addr, target string) float64 {
	b.Helper()
	var left atomic.Int64
	left.Store(int64(b.N))
	const readers = 2
	done := make(chan error, readers)
	start := time.Now()
	for range readers {
		go func() {
			done <- func() error {
				c, err := net.Dial("tcp", addr)
				if err != nil {
					return err
				}
				defer c.Close()
				in := bufio.NewReader(c)
				for left.Add(-1) >= 0 {
					if _, err := io.WriteString(c, "GET "+target+" HTTP/1.1\r\nHost: permits\r\n\r\n"); err != nil {
						return err
					}
					r, err := http.ReadResponse(in, nil)
					if err != nil {
						return err
					}
					if _, err := io.Copy(io.Discard, r.Body); err != nil {
						return err
					}
				}
				return nil
			}()
		}()
	}
	for range readers {
		if err := <-done; err != nil {
			b.Fatal(err)
		}
	}
	return float64(b.N) / time.Since(start).Seconds()
}

// moving is a stage on the machine's clock, on which a decision is published
// at each decision interval.
type moving struct {
	*stage
	start time.Time
}

func (m moving) Read() (time.Time, time.Duration) {
	d := time.Since(m.start)
	return evening.Add(d), time.Hour + d
}

func (m moving) Sight(id closures.BeamID) (Sight, bool) {
	s, ok := m.stage.Sight(id)
	wall, boot := m.Read()
	n := (boot - time.Hour) / (100 * time.Millisecond)
	s.Boot = time.Hour + n*100*time.Millisecond
	s.At, s.Number = wall.Add(s.Boot-boot), uint64(n)
	return s, ok
}

// Permits read over TCP beside a handler that only writes the same bytes.
func BenchmarkPermitRead(b *testing.B) {
	m := moving{newStage(), time.Now()}
	k, err := LoadKey(b.TempDir())
	if err != nil {
		b.Fatal(err)
	}
	i, err := New(m, m, k, false)
	if err != nil {
		b.Fatal(err)
	}
	addr := serving(b, NewServer(NewHandler(i), 0))
	same, err := i.Answer("north", "")
	if err != nil {
		b.Fatal(err)
	}
	bare := serving(b, NewServer(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		w.Header().Set("Content-Type", "application/json")
		_, _ = w.Write(same)
	}), 0))
	for _, c := range []struct{ name, target string }{
		{"without nonce", "/v1/beams/north/permit"},
		{"with nonce", "/v1/beams/north/permit?nonce=abcdefgh12345678"},
	} {
		b.Run(c.name, func(b *testing.B) {
			signed := i.Signed()
			rate := reads(b, addr, c.target)
			signed = i.Signed() - signed
			rival := reads(b, bare, c.target)
			b.ReportMetric(rate, "permits/s")
			b.ReportMetric(rival, "bare/s")
			b.ReportMetric(rate/rival, "of-bare")
			b.ReportMetric(float64(signed), "signed")
			b.ReportMetric(float64(len(same)), "bytes")
		})
	}
}

func BenchmarkAnswer(b *testing.B) {
	m := moving{newStage(), time.Now()}
	k, err := LoadKey(b.TempDir())
	if err != nil {
		b.Fatal(err)
	}
	i, err := New(m, m, k, false)
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct{ name, nonce string }{{"kept", ""}, {"signed", "n"}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for range b.N {
				if _, err := i.Answer("north", c.nonce); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
