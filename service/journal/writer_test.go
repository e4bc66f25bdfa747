package journal

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	sqlite3 "modernc.org/sqlite/lib"
)

// started runs j until the test ends.
func started(t *testing.T, j *Journal) {
	t.Helper()
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan error, 1)
	go func() { done <- j.Run(ctx) }()
	t.Cleanup(func() {
		cancel()
		<-done
	})
}

func TestRunWritesInTime(t *testing.T) {
	clk := newHandClock()
	j := mustOpen(t, Options{Dir: place(t), Clock: clk})
	news := make(chan struct{}, 1)
	defer j.Notify(news)()
	started(t, j)
	ctx := context.Background()

	urgent := entry(1, "hold")
	urgent.Urgent = true
	must(t, j.Append([]Entry{urgent}))
	must(t, j.Wait(ctx, 1)) // with no time gone by
	<-news

	must(t, j.Append([]Entry{entry(2, "aim")}))
	clk.advance(99 * time.Millisecond)
	if s := j.State(); s.Durable != 1 || s.Behind != 99*time.Millisecond {
		t.Fatalf("before its time: %+v", s)
	}
	clk.advance(time.Millisecond)
	must(t, j.Wait(ctx, 2))

	must(t, j.Append(entries(3, 1002, "aim"))) // a full block does not wait
	must(t, j.Append(entries(1003, 1003, "aim")))
	must(t, j.Wait(ctx, 1002))
	clk.advance(100 * time.Millisecond)
	must(t, j.Wait(ctx, 1003))

	short, cancel := context.WithCancel(ctx)
	cancel()
	if err := j.Wait(short, 2000); !errors.Is(err, context.Canceled) {
		t.Fatalf("waiting in vain: %v", err)
	}
}

func TestRunFlushesAtTheEnd(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan error)
	go func() { done <- j.Run(ctx) }()
	must(t, j.Append(entries(1, 1500, "aim")))
	cancel()
	must(t, <-done)
	if s := j.State(); s.Durable != 1500 || s.Sound {
		t.Fatalf("after Run: %+v", s)
	}
}

func TestCloseTellsWhatIsMissing(t *testing.T) {
	f := &faults{}
	j := mustOpen(t, Options{Dir: place(t), Fault: f.fault})
	must(t, j.Append(entries(1, 3, "aim")))
	f.op, f.times, f.err = "commit", -1, errDisk
	if err := j.Close(); !errors.Is(err, errDisk) {
		t.Fatalf("closing with entries left: %v", err)
	}
	if err := j.Close(); err != nil {
		t.Fatalf("closing again: %v", err)
	}
}

// The k-th call of each step of the store fails, once or ten times; the writer
// recovers by itself and the record is the same as without.
func TestEveryStepMayFail(t *testing.T) {
	for _, op := range []string{"open", "begin", "list", "block", "commit", "committed"} {
		for k := range 3 {
			for _, times := range []int{1, 10}[:1+1/thin] { // only once under the race detector
				t.Run(fmt.Sprintf("%s/%d/%d", op, k, times), func(t *testing.T) {
					f := &faults{}
					clk := newHandClock()
					j := mustOpen(t, Options{Dir: place(t), Clock: clk, Fault: f.fault})
					f.op, f.k, f.times, f.err = op, k, times, errDisk
					if op == "open" { // only tried after another failure
						f.k = 0
						j.store.close()
					}
					ctx := context.Background()
					var want []Entry
					for n := range uint64(5) {
						b, err := Pack(fmt.Sprint("list-", n), []byte{byte(n)})
						must(t, err)
						e := entry(n+1, "aim")
						want = append(want, e)
						must(t, j.Append([]Entry{e}, b))
						if err := j.Flush(ctx); err != nil && !errors.Is(err, errDisk) {
							t.Fatal(err)
						}
					}
					for range times + k {
						_ = j.Flush(ctx)
					}
					if op == "committed" {
						f.times = 0 // a retry finds the work done and does not commit again
					}
					if f.times != 0 {
						t.Fatalf("the fault came %d times too few", f.times)
					}
					must(t, j.Flush(ctx))
					if s := j.State(); s.Failures == 0 || s.Err != nil || !s.Sound {
						t.Fatalf("after all: %+v", s)
					}
					same(t, readAll(t, j.Reader, Query{}), want)
					if rep, err := j.Verify(ctx, nil); err != nil || rep.Damage != nil || rep.Lists != 5 {
						t.Fatalf("verify: %+v %v", rep, err)
					}
				})
			}
		}
	}
}

func TestRunBacksOffAndRecovers(t *testing.T) {
	var broken atomic.Bool
	tried := make(chan struct{}, 100)
	clk := newHandClock()
	j := mustOpen(t, Options{Dir: place(t), Clock: clk, Fault: func(op string) error {
		if op == "begin" && broken.Load() {
			tried <- struct{}{}
			return errDisk
		}
		return nil
	}})
	news := make(chan struct{}, 1)
	defer j.Notify(news)()
	started(t, j)
	broken.Store(true)
	e := entry(1, "hold")
	e.Urgent = true
	must(t, j.Append([]Entry{e}))
	<-tried
	<-news
	if s := j.State(); !errors.Is(s.Err, errDisk) || s.Sound {
		t.Fatalf("failing: %+v", s)
	}
	broken.Store(false)
	done := make(chan error)
	go func() { done <- j.Wait(context.Background(), 1) }()
	for {
		select {
		case err := <-done:
			must(t, err)
			return
		default:
			clk.advance(firstRetry)
		}
	}
}

// SQLite's own word that there is no room, from a bound on the file's pages.
func TestFullDisk(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	ctx := context.Background()
	must(t, j.Append(entries(1, 10, "aim")))
	must(t, j.Flush(ctx))
	if _, err := j.store.conn.ExecContext(ctx, `PRAGMA max_page_count = 1`); err != nil {
		t.Fatal(err)
	}
	big := Entry{Seq: 11, At: evening, Kind: "aim", Body: make([]byte, 1<<20)}
	for i := range big.Body {
		big.Body[i] = byte(i * i >> 7)
	}
	must(t, j.Append([]Entry{big}))
	err := j.Flush(ctx)
	var s *StoreError
	if !is(err, sqlite3.SQLITE_FULL) || !errors.As(err, &s) || s.Mend == "" {
		t.Fatalf("a full disk: %v", err)
	}
	must(t, j.Flush(ctx)) // the connection is new, and so is the bound
	same(t, readAll(t, j.Reader, Query{}), append(entries(1, 10, "aim"), big))
}

func TestFileTakenAway(t *testing.T) {
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	must(t, j.Append(entries(1, 1, "aim")))
	must(t, j.Flush(ctx))
	path := filepath.Join(dir, File)
	must(t, os.Rename(path, path+".away"))
	must(t, j.Append(entries(2, 2, "aim")))
	if err := j.Flush(ctx); !errors.Is(err, errMoved) {
		t.Fatalf("writing to a file that was moved: %v", err)
	}
	must(t, os.WriteFile(path, nil, 0o600))
	if err := j.Flush(ctx); !errors.Is(err, errMoved) {
		t.Fatalf("writing to another file: %v", err)
	}
	must(t, os.Rename(path+".away", path))
	must(t, j.Flush(ctx))
	same(t, readAll(t, j.Reader, Query{}), entries(1, 2, "aim"))
}

func TestAnotherWriterIsNoticed(t *testing.T) {
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	must(t, j.Append(entries(1, 1, "aim")))
	must(t, j.Flush(ctx))
	other := &store{path: filepath.Join(dir, File), fault: func(string) error { return nil }}
	must(t, other.open(ctx))
	defer other.close()
	_, err := other.conn.ExecContext(ctx, `DELETE FROM block`)
	must(t, err)
	must(t, j.Append(entries(2, 2, "aim")))
	if err := j.Flush(ctx); err == nil {
		t.Fatal("wrote behind a head that is gone")
	}
	if s := j.State(); s.Damage == nil || s.Sound {
		t.Fatalf("state: %+v", s)
	}
}

// Everything at once; the race detector looks on.
func TestConcurrentUse(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t), Clock: machineClock{time.Now()}, BlockAge: time.Millisecond})
	news := make(chan struct{}, 1)
	defer j.Notify(news)()
	started(t, j)
	ctx := context.Background()
	const last = 500
	var all sync.WaitGroup
	for _, do := range []func() error{
		func() error { _, err := j.Verify(ctx, nil); return err },
		func() error { _, _, err := j.LastOf(ctx, KindDurable); return err },
		func() error {
			return j.Read(ctx, Query{NewestFirst: true, Pruned: func(uint64, uint64, int) error { return nil }}, func(Entry) error { return nil })
		},
		func() error { _, err := j.Prune(ctx, Retention{Before: later}); return err },
		func() error { return j.Flush(ctx) },
		func() error { return j.Backup(ctx, filepath.Join(t.TempDir(), "copy")) },
	} {
		all.Go(func() {
			for j.State().Durable < last {
				if err := do(); err != nil {
					t.Error(err)
					return
				}
				if rep, err := j.Verify(ctx, nil); err != nil || rep.Damage != nil {
					t.Error(rep.Damage, err)
					return
				}
			}
		})
	}
	for seq := uint64(1); seq <= last; seq += 10 {
		must(t, j.Append(append(entries(seq, seq+8, "aim"), entry(seq+9, KindDurable))))
		must(t, j.Wait(ctx, seq))
	}
	must(t, j.Wait(ctx, last))
	all.Wait()
	if s := j.State(); !s.Sound || s.Durable != last {
		t.Fatalf("at the end: %+v", s)
	}
}
