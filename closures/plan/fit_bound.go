package plan

import (
	"cmp"
	"slices"
)

// bound returns a value that no plan of the jobs exceeds.
//
// Time is cut into bins. A job may be taken in pieces, in each bin no more than
// what its slots leave room for there; a bin holds no more than its length. Each
// job is worth the same for every moment, so taking as much as possible of the
// dearest, then of the next, is best: what can be taken together is a
// polymatroid (J. Edmonds, Submodular functions, matroids, and certain
// polyhedra, 1970). As much as possible is a flow from jobs to bins, found by
// augmenting paths. Bins from which no path leads to room stay full for good
// and are set aside.
func bound(jobs []job, over int64) float64 {
	if over <= 0 {
		return 0
	}
	f := newFlow(jobs, over)
	order := make([]int, len(jobs))
	for i := range order {
		order[i] = i
	}
	worth := func(i int) float64 { return jobs[i].value / float64(jobs[i].need) }
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(worth(b), worth(a)) })
	total := 0.0
	for _, j := range order {
		if jobs[j].need <= 0 {
			continue
		}
		total += jobs[j].value * min(1, float64(f.push(j, jobs[j].need))/float64(jobs[j].need))
	}
	return total * (1 + 1e-12) // rounding
}

// mostBins is how finely time is cut.
const mostBins = 720

type flow struct {
	bins int
	may  [][]int64 // by job and bin: what the job may still take there
	has  [][]int64 // by bin and job: what it has taken
	free []int64   // of each bin
	full []bool    // set aside
	from []int32   // on the path: the job that leads to a bin
	via  []int32   // and the bin that leads to a job, -1 for the one that pushes
	work int
}

// mostWork bounds the steps of all searches; jobs behind that are taken to fit
// whole, which only loosens the bound.
const mostWork = 400_000_000

func newFlow(jobs []job, over int64) *flow {
	bins := int(min(mostBins, over))
	f := &flow{bins: bins, may: make([][]int64, len(jobs)), has: make([][]int64, bins), free: make([]int64, bins), full: make([]bool, bins), from: make([]int32, bins), via: make([]int32, len(jobs))}
	edge := func(i int) int64 { return over/int64(bins)*int64(i) + over%int64(bins)*int64(i)/int64(bins) }
	for b := range bins {
		f.free[b] = edge(b+1) - edge(b)
		f.has[b] = make([]int64, len(jobs))
	}
	for j := range jobs {
		f.may[j] = make([]int64, bins)
		b := 0
		for _, s := range jobs[j].slots {
			lo, hi := s.first, s.last+jobs[j].need
			for b > 0 && edge(b) > lo {
				b--
			}
			for ; b < bins && edge(b) < hi; b++ {
				f.may[j][b] += max(0, min(hi, edge(b+1))-max(lo, edge(b)))
			}
		}
		for b := range f.may[j] {
			f.may[j][b] = min(f.may[j][b], edge(b+1)-edge(b))
		}
	}
	return f
}

// push takes as much as possible of a job, at most need, and returns how much.
func (f *flow) push(j int, need int64) int64 {
	if f.work > mostWork {
		return need
	}
	var got int64
	for got < need {
		b := f.path(j)
		if b < 0 {
			break
		}
		got += f.augment(b, need-got)
	}
	return got
}

// path searches for a bin with room, breadth first. Without one, all bins that
// it reached are full for good.
func (f *flow) path(j int) int {
	for b := range f.from {
		f.from[b] = -1
	}
	for i := range f.via {
		f.via[i] = -2
	}
	f.via[j] = -1
	queue := []int{j}
	for len(queue) > 0 {
		k := queue[0]
		queue = queue[1:]
		f.work += f.bins
		for b, room := range f.may[k] {
			if room == 0 || f.full[b] || f.from[b] >= 0 {
				continue
			}
			f.from[b] = int32(k)
			if f.free[b] > 0 {
				return b
			}
			f.work += len(f.via)
			for o, taken := range f.has[b] {
				if taken > 0 && f.via[o] == -2 {
					f.via[o] = int32(b)
					queue = append(queue, o)
				}
			}
		}
	}
	for b, k := range f.from {
		if k >= 0 {
			f.full[b] = true
		}
	}
	return -1
}

// augment sends what the path to a bin lets through, at most some, and returns
// how much.
func (f *flow) augment(to int, some int64) int64 {
	some = min(some, f.free[to])
	for b := to; b >= 0; {
		k := f.from[b]
		some = min(some, f.may[k][b])
		if b = int(f.via[k]); b >= 0 {
			some = min(some, f.has[b][k])
		}
	}
	f.free[to] -= some
	for b := to; b >= 0; {
		k := f.from[b]
		f.may[k][b] -= some
		f.has[b][k] += some
		if b = int(f.via[k]); b >= 0 {
			f.may[k][b] += some
			f.has[b][k] -= some
		}
	}
	return some
}
