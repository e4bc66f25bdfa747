package plan

import (
	"cmp"
	"math"
	"slices"
)

// placed is a job and when it begins.
type placed struct {
	job   int
	begin int64
}

// fitting is the search for an order of jobs. An order stands for the plan in
// which each job begins as early as it can behind the one before; every plan
// can be pushed together to one of these.
type fitting struct {
	jobs []job
	over int64

	order []int
	soon  []int64 // when the jobs before an index are done
	late  []int64 // the latest that those from an index on may be let begin
	spent int
	limit int

	best      []placed
	bestValue float64
}

func newFitting(jobs []job, over int64) *fitting { return &fitting{jobs: jobs, over: over} }

// effort bounds the work, in jobs looked at; it is counted rather than timed so
// that the outcome is always the same.
const effort = 40_000_000

func (f *fitting) run() {
	for _, by := range f.orders() {
		f.order, f.limit = f.order[:0], f.spent+effort/4
		f.lay()
		for _, j := range by {
			f.insert(j)
		}
		f.improve(by)
		f.remember()
	}
}

// orders are those in which the jobs are put in.
func (f *fitting) orders() [][]int {
	all := make([]int, 0, len(f.jobs))
	for i := range f.jobs {
		if len(f.jobs[i].slots) > 0 {
			all = append(all, i)
		}
	}
	by := func(less func(a, b *job) int) []int {
		o := slices.Clone(all)
		slices.SortStableFunc(o, func(a, b int) int { return cmp.Or(less(&f.jobs[a], &f.jobs[b]), cmp.Compare(a, b)) })
		return o
	}
	rate := func(j *job) float64 { return j.value / float64(j.need) }
	last := func(j *job) int64 { return j.slots[len(j.slots)-1].last }
	return [][]int{
		by(func(a, b *job) int { return cmp.Compare(b.value, a.value) }),
		by(func(a, b *job) int { return cmp.Compare(rate(b), rate(a)) }),
		by(func(a, b *job) int { return cmp.Or(cmp.Compare(rate(b), rate(a)), cmp.Compare(room(a), room(b))) }),
		by(func(a, b *job) int { return cmp.Compare(last(a), last(b)) }),
	}
}

// room is how long a job's begin may be put off and on.
func room(j *job) int64 {
	var sum int64
	for _, s := range j.slots {
		sum += s.last - s.first + 1
	}
	return sum
}

// lay works out, for the order as it is, how early and how late.
func (f *fitting) lay() {
	n := len(f.order)
	f.soon = slices.Grow(f.soon[:0], n+1)[:n+1]
	f.late = slices.Grow(f.late[:0], n+1)[:n+1]
	f.soon[0], f.late[n] = 0, f.over
	for i, j := range f.order {
		begin, _ := f.jobs[j].next(f.soon[i])
		f.soon[i+1] = begin + f.jobs[j].need
	}
	for i := n - 1; i >= 0; i-- {
		j := &f.jobs[f.order[i]]
		f.late[i], _ = j.last(f.late[i+1] - j.need)
	}
	f.spent += 2 * n
}

// insert puts a job where all others still fit and the beam is idle least
// before it, the earliest of equals.
func (f *fitting) insert(j int) bool {
	at, ok := f.place(j, 0, len(f.order))
	if ok {
		f.order = slices.Insert(f.order, at, j)
		f.lay()
	}
	return ok
}

// place finds the index for insert, from one to another.
func (f *fitting) place(j, from, to int) (at int, ok bool) {
	least := int64(math.MaxInt64)
	o := &f.jobs[j]
	for i := from; i <= to; i++ {
		begin, can := o.next(f.soon[i])
		if !can {
			break // nor behind any later one
		}
		if begin+o.need <= f.late[i] && begin-f.soon[i] < least {
			at, ok, least = i, true, begin-f.soon[i]
		}
	}
	f.spent += to - from + 1
	return at, ok
}

// improve exchanges and moves until neither helps or the effort is spent.
func (f *fitting) improve(by []int) {
	for better := true; better && f.spent < f.limit; {
		better = false
		for _, j := range by {
			if f.spent >= f.limit {
				return
			}
			f.spent += len(f.order)
			if !slices.Contains(f.order, j) && (f.insert(j) || f.exchange(j, by)) {
				better = true
			}
		}
		if !better {
			better = f.tighten(by)
		}
	}
}

// exchange puts a job in for one or two neighbours that are worth less
// together, and puts these in again where there is room.
func (f *fitting) exchange(j int, by []int) bool {
	n := len(f.order)
	for count := 1; count <= 2; count++ {
		for i := 0; i+count <= n; i++ {
			worth := 0.0
			for _, o := range f.order[i : i+count] {
				worth += f.jobs[o].value
			}
			f.spent++
			if !(worth < f.jobs[j].value) {
				continue
			}
			begin, ok := f.jobs[j].next(f.soon[i])
			if !ok || begin+f.jobs[j].need > f.late[i+count] {
				continue
			}
			out := slices.Clone(f.order[i : i+count])
			f.order = slices.Replace(f.order, i, i+count, j)
			f.lay()
			for _, o := range by {
				if slices.Contains(out, o) {
					f.insert(o)
				}
			}
			return true
		}
	}
	return false
}

// tighten moves one placed job so that one that is left out finds room.
func (f *fitting) tighten(by []int) bool {
	var left []int
	for _, j := range by {
		if !slices.Contains(f.order, j) {
			left = append(left, j)
		}
	}
	if len(left) == 0 {
		return false
	}
	before := slices.Clone(f.order)
	for i, moved := range before {
		f.order = slices.Delete(f.order, i, i+1)
		f.lay()
		for _, j := range left {
			if f.spent >= f.limit {
				break
			}
			if at, ok := f.place(j, max(0, i-1), min(len(f.order), i+1)); ok {
				f.order = slices.Insert(f.order, at, j)
				f.lay()
				if f.insert(moved) {
					return true
				}
				f.order = slices.Delete(f.order, at, at+1)
				f.lay()
			}
		}
		f.order = append(f.order[:0], before...)
		f.lay()
	}
	return false
}

// remember keeps the plan if it is the best so far.
func (f *fitting) remember() {
	value := 0.0
	for _, j := range slices.Sorted(slices.Values(f.order)) { // the same sum for the same jobs
		value += f.jobs[j].value
	}
	if !(value > f.bestValue) {
		return
	}
	f.bestValue, f.best = value, f.best[:0]
	for i, j := range f.order {
		begin, _ := f.jobs[j].next(f.soon[i])
		f.best = append(f.best, placed{j, begin})
	}
}
