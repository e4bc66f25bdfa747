package plan

import (
	"math/rand/v2"
	"reflect"
	"testing"
)

// randomJobs compete for a span of over.
func randomJobs(rng *rand.Rand, n int, over, longest int64) []job {
	jobs := make([]job, n)
	for i := range jobs {
		j := &jobs[i]
		j.need = 1 + rng.Int64N(longest)
		j.value = float64(1+rng.IntN(5)) * float64(j.need)
		if rng.IntN(3) == 0 {
			j.value = float64(1 + rng.IntN(20))
		}
		at := int64(0)
		for range rng.IntN(5) {
			from := at + rng.Int64N(over/2)
			until := from + rng.Int64N(over/2)
			if until > over {
				break
			}
			if first, last := from, until-j.need; first <= last {
				j.slots = append(j.slots, slot{first, last})
			}
			at = until + 1
		}
	}
	return jobs
}

// keeps reports whether the plan is one: every job once, in a slot, none before
// the one ahead is done; and what it is worth.
func keeps(t *testing.T, jobs []job, plan []placed, over int64) (value float64) {
	t.Helper()
	done, seen := int64(0), map[int]bool{}
	for _, p := range plan {
		in := false
		for _, s := range jobs[p.job].slots {
			in = in || p.begin >= s.first && p.begin <= s.last
		}
		if !in || seen[p.job] || p.begin < done {
			t.Fatalf("%+v at %+v, the beam is free from %d on", jobs[p.job], p, done)
		}
		done, seen[p.job] = p.begin+jobs[p.job].need, true
		value += jobs[p.job].value
	}
	if done > over {
		t.Fatalf("the plan ends at %d", done)
	}
	return value
}

// best tries every order of every subset.
func best(jobs []job, taken []bool, done int64) float64 {
	most := 0.0
	for i := range jobs {
		if taken[i] {
			continue
		}
		begin, ok := jobs[i].next(done)
		if !ok {
			continue
		}
		taken[i] = true
		most = max(most, jobs[i].value+best(jobs, taken, begin+jobs[i].need))
		taken[i] = false
	}
	return most
}

// The heuristic's value is no more than that of the best plan, found by trying
// all, and the bound no less.
func TestFitAgainstEveryOrder(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	cases, exact := 3000, 0
	var got, optimum, above float64
	for range cases {
		over := int64(20 + rng.IntN(2000))
		jobs := randomJobs(rng, 1+rng.IntN(7), over, over/3)
		f := newFitting(jobs, over)
		f.run()
		value := keeps(t, jobs, f.best, over)
		most, limit := best(jobs, make([]bool, len(jobs)), 0), bound(jobs, over)
		if value > most*(1+1e-12) || limit < most {
			t.Fatalf("heuristic %v, best %v, bound %v of %+v", value, most, limit, jobs)
		}
		if value >= most*(1-1e-12) {
			exact++
		}
		got, optimum, above = got+value, optimum+most, above+limit
	}
	t.Logf("of %d small cases %d are best; together %.2f %% are given away, and the bound lies %.1f %% above", cases, exact, 100*(1-got/optimum), 100*(above/optimum-1))
	if got < 0.97*optimum {
		t.Error("the heuristic gives away more than a thirtieth")
	}
}

// Larger cases keep their plan, and come out the same each time.
func TestFitIsTheSameEachTime(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for _, n := range []int{0, 1, 20, 120, 500} {
		const over = 12 * 3600
		jobs := randomJobs(rng, n, over, 3600)
		f, again := newFitting(jobs, over), newFitting(jobs, over)
		f.run()
		again.run()
		value := keeps(t, jobs, f.best, over)
		if !reflect.DeepEqual(f.best, again.best) {
			t.Error("two runs differ")
		}
		limit := bound(jobs, over)
		if limit < value {
			t.Errorf("value %v above the bound %v", value, limit)
		}
		t.Logf("%d jobs: %d placed, worth %.4f of the bound; %d jobs looked at", n, len(f.best), value/max(limit, 1), f.spent)
	}
}

// Less room, or a longer need, never raises the bound.
func TestTheBoundFollows(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	for range 500 {
		over := int64(200 + rng.IntN(5000))
		jobs := randomJobs(rng, 2+rng.IntN(20), over, over/5)
		before := bound(jobs, over)
		i := rng.IntN(len(jobs))
		if n := len(jobs[i].slots); n > 0 {
			jobs[i].slots = jobs[i].slots[:n-1]
		}
		if after := bound(jobs, over); after > before*(1+1e-9) {
			t.Fatalf("%v, then %v", before, after)
		}
	}
}
