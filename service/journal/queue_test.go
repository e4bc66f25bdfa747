package journal

import (
	"context"
	"errors"
	"fmt"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// broken makes a Fault that fails with err from the k-th call of op on (0: the
// first), times times; times < 0 is for good. The zero switch passes all.
type faults struct {
	op    string
	k     int
	times int
	err   error
	seen  map[string]int
}

func (f *faults) fault(op string) error {
	if f.seen == nil {
		f.seen = map[string]int{}
	}
	f.seen[op]++
	if op != f.op || f.times == 0 {
		return nil
	}
	if f.k > 0 {
		f.k--
		return nil
	}
	f.times--
	return f.err
}

var errDisk = errors.New("the disk said no")

func TestQueueLimitsAndGap(t *testing.T) {
	f := &faults{op: "begin", times: -1, err: errDisk}
	clk := newHandClock()
	j := mustOpen(t, Options{Dir: place(t), Clock: clk, Capacity: 10_000, Reserve: 1_000, Fault: f.fault})
	ctx := context.Background()
	var want []Entry
	seq := uint64(0)
	put := func(n int) error {
		seq++
		e := Entry{Seq: seq, At: evening, Kind: "aim", Body: make([]byte, n)}
		err := j.Append([]Entry{e})
		if err == nil {
			want = append(want, e)
		}
		return err
	}
	for j.State().Bytes <= 5_000 {
		if s := j.State(); !s.Sound || s.Half || s.Full {
			t.Fatalf("below half: %+v", s)
		}
		must(t, put(100))
	}
	if s := j.State(); s.Sound || !s.Half || s.Full {
		t.Fatalf("over half: %+v", s)
	}
	for !j.State().Full {
		must(t, put(100))
	}
	// The reserve takes some more; then entries are lost, all of a call or none.
	for put(100) == nil {
	}
	firstLost := seq
	if s := j.State(); !s.Gap || s.Sound || s.Bytes > s.Cap {
		t.Fatalf("over the brim: %+v", s)
	}
	if err := put(1); !errors.Is(err, ErrFull) {
		t.Fatalf("a small entry into an open gap: %v", err)
	}
	if err := j.Append([]Entry{{Seq: seq + 1, At: evening, Kind: "aim"}, {Seq: seq + 2, At: evening, Kind: "aim"}}); !errors.Is(err, ErrFull) {
		t.Fatalf("two more: %v", err)
	}
	seq += 2
	lastLost := seq
	if err := j.Wait(ctx, firstLost); !errors.Is(err, ErrFull) {
		t.Fatalf("waiting for a lost entry: %v", err)
	}
	if err := j.Flush(ctx); !errors.Is(err, errDisk) {
		t.Fatalf("flushing into a broken store: %v", err)
	}
	if s := j.State(); !errors.Is(s.Err, errDisk) || s.Failures != 1 || s.Durable != 0 {
		t.Fatalf("after the failure: %+v", s)
	}
	f.times = 0
	must(t, j.Flush(ctx))
	if s := j.State(); !s.Sound || s.Durable != lastLost || s.Gap || s.Bytes != 0 {
		t.Fatalf("after the recovery: %+v", s)
	}
	if err := j.Wait(ctx, firstLost); !errors.Is(err, ErrFull) {
		t.Fatalf("a lost entry whose gap is durable: %v", err)
	}
	must(t, put(1))
	must(t, j.Flush(ctx))
	must(t, j.Wait(ctx, seq))

	gap := Entry{Seq: lastLost, At: evening, Kind: KindGap,
		Body: fmt.Appendf(nil, `{"count":%d,"first":%d,"last":%d}`, lastLost-firstLost+1, firstLost, lastLost)}
	n := len(want) - 1
	same(t, readAll(t, j.Reader, Query{}), append(append(want[:n:n], gap), want[n]))
	rep, err := j.Verify(ctx, nil)
	if err != nil || rep.Damage != nil || rep.Gaps != lastLost-firstLost+1 {
		t.Fatalf("verify: %+v %v", rep, err)
	}
}

func TestBehindCounts(t *testing.T) {
	clk := newHandClock()
	j := mustOpen(t, Options{Dir: place(t), Clock: clk})
	must(t, j.Append(entries(1, 1, "aim")))
	clk.advance(time.Second)
	must(t, j.Append(entries(2, 2, "aim")))
	if s := j.State(); s.Behind != time.Second || !s.Sound {
		t.Fatalf("a second behind: %+v", s)
	}
	clk.advance(time.Millisecond)
	if s := j.State(); s.Sound {
		t.Fatalf("more than a second behind: %+v", s)
	}
	must(t, j.Flush(context.Background()))
	if s := j.State(); s.Behind != 0 || !s.Sound {
		t.Fatalf("flushed: %+v", s)
	}
}

func TestAppendRefuses(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	for name, e := range map[string]Entry{
		"number zero":     {At: evening, Kind: "aim"},
		"number too high": {Seq: 1 << 63, At: evening, Kind: "aim"},
		"no kind":         {Seq: 1, At: evening},
		"odd kind":        {Seq: 1, At: evening, Kind: "Aim"},
		"own kind":        {Seq: 1, At: evening, Kind: KindGap},
		"large body":      {Seq: 1, At: evening, Kind: "aim", Body: make([]byte, MaxBody+1)},
	} {
		if err := j.Append([]Entry{entry(1, "aim"), e}); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if err := j.Append([]Entry{entry(2, "aim"), entry(2, "aim")}); !errors.Is(err, ErrOrder) {
		t.Errorf("one number twice: %v", err)
	}
	if s := j.State(); s.Queued != 0 || s.Bytes != 0 {
		t.Errorf("a refused call left something: %+v", s)
	}
	must(t, j.Close())
	if err := j.Append([]Entry{entry(1, "aim")}); !errors.Is(err, ErrClosed) {
		t.Errorf("after Close: %v", err)
	}
}

func TestBlocksKeepTheirBounds(t *testing.T) {
	j := mustOpen(t, Options{Dir: place(t)})
	es := entries(1, 1001, "aim")
	es = append(es, Entry{Seq: 1002, At: evening.Add(-time.Hour), Kind: "aim"}) // the clock went back
	es = append(es, Entry{Seq: 1003, At: time.Time{}, Kind: "aim"})
	es = append(es, Entry{Seq: 1004, At: time.Date(9999, 1, 1, 0, 0, 0, 999999999, time.UTC), Kind: "aim", Body: make([]byte, 2<<20)})
	must(t, j.Append(es))
	must(t, j.Flush(context.Background()))
	var counts []int
	must(t, j.blocks(context.Background(), Query{}, func(b *block) error {
		counts = append(counts, b.count)
		return nil
	}))
	if want := []int{1000, 1, 1, 1, 1}; fmt.Sprint(counts) != fmt.Sprint(want) {
		t.Fatalf("blocks of %v entries, want %v", counts, want)
	}
	same(t, readAll(t, j.Reader, Query{}), es)
}

// Whatever is appended and however the store fails meanwhile: what was taken
// is read back in order, and every number that was not is inside a gap.
func TestNothingIsLostUncounted(t *testing.T) {
	runs := 0
	rapid.Check(t, func(rt *rapid.T) {
		if runs++; runs > 100/thin {
			return
		}
		f := &faults{}
		j, err := Open(Options{Dir: place(t), Clock: newHandClock(), Capacity: 4_000, Reserve: 500, Fault: f.fault})
		if err != nil {
			rt.Fatal(err)
		}
		defer j.Close()
		ctx := context.Background()
		taken := map[uint64]string{}
		lost := map[uint64]bool{}
		seq := uint64(0)
		for range rapid.IntRange(5, 60).Draw(rt, "steps") {
			switch rapid.IntRange(0, 5).Draw(rt, "what") {
			case 0:
				f.op = rapid.SampledFrom([]string{"open", "begin", "list", "block", "commit", "committed"}).Draw(rt, "op")
				f.k, f.times, f.err = rapid.IntRange(0, 3).Draw(rt, "k"), rapid.IntRange(-1, 2).Draw(rt, "times"), errDisk
			case 1:
				_ = j.Flush(ctx)
			default:
				var es []Entry
				for range rapid.IntRange(1, 8).Draw(rt, "n") {
					seq += rapid.Uint64Range(1, 3).Draw(rt, "skip")
					es = append(es, Entry{Seq: seq, At: evening, Kind: "aim", Body: make([]byte, rapid.IntRange(0, 900).Draw(rt, "size"))})
				}
				b, err := Pack(fmt.Sprint("list-", seq), []byte("text"))
				if err != nil {
					rt.Fatal(err)
				}
				err = j.Append(es, b)
				if err != nil && !errors.Is(err, ErrFull) {
					rt.Fatal(err)
				}
				for _, e := range es {
					if err != nil {
						lost[e.Seq] = true
					} else {
						taken[e.Seq] = string(e.Body)
					}
				}
				if s := j.State(); s.Bytes > s.Cap {
					rt.Fatalf("%d bytes of %d", s.Bytes, s.Cap)
				}
			}
		}
		f.times = 0
		if err := j.Flush(ctx); err != nil {
			rt.Fatal(err)
		}
		last := uint64(0)
		err = j.Read(ctx, Query{}, func(e Entry) error {
			if e.Seq <= last {
				rt.Fatalf("%d after %d", e.Seq, last)
			}
			last = e.Seq
			if e.Kind == KindGap {
				var n, from, to uint64
				if _, err := fmt.Sscanf(string(e.Body), `{"count":%d,"first":%d,"last":%d}`, &n, &from, &to); err != nil {
					rt.Fatal(err)
				}
				for s := range lost {
					if s >= from && s <= to {
						delete(lost, s)
						n--
					}
				}
				if n != 0 {
					rt.Fatalf("gap %s counts %d too many", e.Body, int64(n))
				}
				return nil
			}
			if body, ok := taken[e.Seq]; !ok || body != string(e.Body) {
				rt.Fatalf("%d was not taken like this", e.Seq)
			}
			delete(taken, e.Seq)
			return nil
		})
		if err != nil || len(taken) != 0 || len(lost) != 0 {
			rt.Fatalf("%v: %d taken and %d lost are missing", err, len(taken), len(lost))
		}
		if rep, err := j.Verify(ctx, nil); err != nil || rep.Damage != nil {
			rt.Fatalf("verify: %v %v", rep.Damage, err)
		}
	})
}
