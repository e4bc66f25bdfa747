package simulate

import (
	"context"
	"fmt"
	"os"
	"slices"
	"sync"
	"testing"
	"time"

	"beamward/service/journal"
	"beamward/service/replay"
)

const thisBuild = "beamward test"

// folder is in memory where the machine has such a place: a night writes often.
func folder(t testing.TB) string {
	t.Helper()
	base := "/dev/shm"
	if info, err := os.Stat(base); err != nil || !info.IsDir() {
		base = ""
	}
	dir, err := os.MkdirTemp(base, "beamward-night-")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = os.RemoveAll(dir) })
	return dir
}

// played plays a night and names its seed whatever goes wrong.
func played(t testing.TB, o Options) Result {
	t.Helper()
	o.Build = thisBuild
	r, err := Night(context.Background(), o)
	if err != nil {
		t.Fatalf("seed %d: %v", o.Seed, err)
	}
	return r
}

// sum adds up what nights were.
type sum struct {
	mu                                             sync.Mutex
	nights, turns, reads, kills, reloads, restored int
	unsafe, length, open                           time.Duration
	needless                                       map[string]time.Duration
}

func (s *sum) add(r *Result) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.nights++
	s.turns, s.reads, s.kills, s.reloads, s.restored = s.turns+r.Turns, s.reads+r.Reads, s.kills+r.Kills, s.reloads+r.Reloads, s.restored+r.Restored
	s.unsafe += r.UnsafeFor()
	for _, d := range r.Available {
		s.length += r.Length
		s.open += d
	}
	if s.needless == nil {
		s.needless = map[string]time.Duration{}
	}
	for code, d := range r.Needless {
		s.needless[code] += d
	}
}

func (s *sum) tell(t testing.TB) {
	t.Logf("%d nights: %d decisions, %d permits read, %d kills, %d reloads; %d holds and sightings outlived a kill; unsafe %v; open %.1f %% of the time",
		s.nights, s.turns, s.reads, s.kills, s.reloads, s.restored, s.unsafe, 100*float64(s.open)/float64(max(s.length, 1)))
	var codes []string
	for code := range s.needless {
		codes = append(codes, code)
	}
	slices.Sort(codes)
	for _, code := range codes {
		t.Logf("shuttered without a true cause, by %s: %.1f %%", code, 100*float64(s.needless[code])/float64(max(s.length, 1)))
	}
}

// sound checks one night: nothing was unsafe, its record verifies, and its
// replay is identical.
func sound(t testing.TB, r *Result, dir string) {
	t.Helper()
	for i := range r.Unsafe {
		u := &r.Unsafe[i]
		t.Errorf("seed %d: %v: beam %s: %s (%v)", r.Seed, u.At.Sub(r.Start), u.Beam, u.What, u.For)
		if i == 9 {
			t.Errorf("seed %d: and %d more", r.Seed, len(r.Unsafe)-10)
			break
		}
	}
	ctx := context.Background()
	reader, err := journal.OpenReader(dir)
	if err != nil {
		t.Fatalf("seed %d: %v", r.Seed, err)
	}
	defer reader.Close()
	if v, err := reader.Verify(ctx, nil); err != nil || v.Damage != nil {
		t.Errorf("seed %d: the record does not verify: %v %v", r.Seed, err, v.Damage)
	}
	rep, err := replay.Replay(ctx, reader, replay.Range{}, replay.Options{Texts: Texts(ctx, reader), Build: thisBuild})
	if err != nil {
		t.Fatalf("seed %d: %v", r.Seed, err)
	}
	if !rep.Identical() || rep.Last != r.Entries || len(rep.Runs) < r.Starts {
		t.Errorf("seed %d: the replay is not identical, or not whole: entry %d of %d, %d runs: %+v", r.Seed, rep.Last, r.Entries, len(rep.Runs), rep.Differences)
	}
}

// BW-005: nothing opens after a start before it is warm. BW-012: what was
// acknowledged outlives a kill: the judge goes on counting on it.
func TestNights(t *testing.T) {
	nights, length := 20, Short
	if os.Getenv("BEAMWARD_LONG") != "" {
		nights, length = 1000, 9*time.Hour
	}
	var all sum
	t.Run("seeds", func(t *testing.T) {
		for seed := range nights {
			t.Run(fmt.Sprintf("seed-%d", seed+1), func(t *testing.T) {
				t.Parallel()
				dir := folder(t)
				r := played(t, Options{Seed: uint64(seed + 1), Length: length, Dir: dir})
				sound(t, &r, dir)
				all.add(&r)
				if err := os.RemoveAll(dir); err != nil { // a thousand nights are not kept at once
					t.Error(err)
				}
			})
		}
	})
	all.tell(t)
	if all.kills == 0 || all.reloads == 0 || all.restored == 0 || all.open == 0 {
		t.Error("the nights show too little: no kill, reload, restored hold or open permit")
	}
}

func TestOneSeedIsOneNight(t *testing.T) {
	t.Parallel()
	o := Options{Seed: 7, Length: 6 * time.Minute}
	o.Dir = folder(t)
	a := played(t, o)
	o.Dir = folder(t)
	b := played(t, o)
	if a.Head != b.Head || a.Entries != b.Entries {
		t.Errorf("seed %d: two records: %s of %d entries, and %s of %d", o.Seed, a.Head, a.Entries, b.Head, b.Entries)
	}
	o.Seed, o.Dir = 8, folder(t)
	if c := played(t, o); c.Head == a.Head {
		t.Error("two seeds gave one record")
	}
}
