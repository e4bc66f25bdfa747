package journal

import (
	"context"
	"fmt"
	"testing"
	"time"
)

// BenchmarkDurable measures entries a second, each on disk before the next:
// alone, and in batches. Rivals: a bare row a transaction in the same SQLite
// set-up, which is the most that the store can give.
func BenchmarkDurable(b *testing.B) {
	body := []byte(`{"at":"2031-02-14T20:00:00.000Z","beam":"north","kind":"aim","icrs":{"ra_deg":150.1,"dec_deg":2.2},"error_arcsec":30}`)
	for _, n := range []int{1, 100, 1000} {
		b.Run(fmt.Sprintf("batch=%d", n), func(b *testing.B) {
			j := mustOpen(b, Options{Dir: place(b), Clock: machineClock{time.Now()}})
			ctx := context.Background()
			seq := uint64(0)
			es := make([]Entry, n)
			b.ResetTimer()
			for b.Loop() {
				for i := range es {
					seq++
					es[i] = Entry{Seq: seq, At: evening.Add(time.Duration(seq)), Kind: "aim", Body: body}
				}
				must(b, j.Append(es))
				must(b, j.Flush(ctx))
			}
			b.ReportMetric(float64(seq)/b.Elapsed().Seconds(), "entries/s")
		})
	}
	b.Run("rival-bare-row", func(b *testing.B) {
		j := mustOpen(b, Options{Dir: place(b)})
		c := j.store.conn
		ctx := context.Background()
		if _, err := c.ExecContext(ctx, `CREATE TABLE bare (n INTEGER PRIMARY KEY, body BLOB)`); err != nil {
			b.Fatal(err)
		}
		insert, err := c.PrepareContext(ctx, `INSERT INTO bare (body) VALUES (?)`)
		must(b, err)
		defer insert.Close()
		b.ResetTimer()
		for b.Loop() {
			if _, err := insert.ExecContext(ctx, body); err != nil {
				b.Fatal(err)
			}
		}
		b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "entries/s")
	})
}

// BenchmarkAppend measures what the engine's goroutine pays; the budget is
// that of 20,000 recorded facts a second, 50 µs each.
func BenchmarkAppend(b *testing.B) {
	j := mustOpen(b, Options{Dir: place(b), Clock: machineClock{time.Now()}})
	ctx := context.Background()
	body := make([]byte, 150)
	seq := uint64(0)
	es := make([]Entry, 20)
	b.ReportAllocs()
	for b.Loop() {
		for i := range es {
			seq++
			es[i] = Entry{Seq: seq, At: evening.Add(time.Duration(seq)), Kind: "aircraft", Body: body}
		}
		must(b, j.Append(es))
		if seq%100_000 == 0 {
			b.StopTimer()
			must(b, j.Flush(ctx))
			b.StartTimer()
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(seq), "ns/entry")
}

// BenchmarkRead measures proving and reading back.
func BenchmarkRead(b *testing.B) {
	j := mustOpen(b, Options{Dir: place(b), Clock: machineClock{time.Now()}})
	ctx := context.Background()
	const blocks, each = 1000, 10 // a hundred milliseconds of a quiet night a block
	for n := range uint64(blocks) {
		must(b, j.Append(entries(n*each+1, n*each+each, "aim")))
		must(b, j.Flush(ctx))
	}
	for b.Loop() {
		n := 0
		must(b, j.Read(ctx, Query{}, func(Entry) error {
			n++
			return nil
		}))
		if n != blocks*each {
			b.Fatal(n)
		}
	}
	b.ReportMetric(float64(b.N*blocks*each)/b.Elapsed().Seconds(), "entries/s")
	b.ReportMetric(float64(b.N*blocks)/b.Elapsed().Seconds(), "blocks/s")
}
