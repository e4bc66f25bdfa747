package plan

import (
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// Placement is one target with its place in a fitted plan.
type Placement struct {
	Index  int // among the targets that were given
	Start  time.Time
	Length time.Duration
}

// Unplaced is a target that a fitted plan leaves out.
type Unplaced struct {
	Index   int
	Longest time.Duration // its longest allowed span; not NoRoom: shorter than it needs
	NoRoom  bool          // it would fit alone, but found no room beside the others
}

// Fitted is an order and starts for targets.
//
// Value is what is placed, each target's priority times its length in seconds.
// Bound is a value that no plan exceeds, so Loss is no less than what the
// heuristic gave away.
type Fitted struct {
	Placed   []Placement // in order of time
	Left     []Unplaced  // in the order given
	Value    float64
	Bound    float64
	Cautions []closures.Caution // of all targets, each once
}

// Loss returns which part of the bound the plan does not reach: the heuristic's
// loss and the bound's slack together.
func (f *Fitted) Loss() float64 {
	if !(f.Bound > 0) {
		return 0
	}
	return max(0, 1-f.Value/f.Bound)
}

// MaxFit is how many targets can be fitted together.
const MaxFit = 2000

// Fit chooses an order and starts for targets with lengths and priorities, so
// that under all that is foreseeable each has the beam without a break for its
// length, after its time to acquire in the same allowed span. A priority that is
// not said counts as 1; every target needs a length.
//
// The heuristic: targets are put in one after another, each where it leaves the
// beam idle least and no one else gives way out of the plan; in four orders (by
// value, by value for the time taken, by priority, and by who can wait least),
// the best of which is improved by exchanging what is placed for what is worth
// more, and by moving what is placed to make room, until neither helps. It is
// the same each time.
//
// The bound: the time is cut into bins, targets may be taken in pieces, and in
// each bin a target may take what is allowed for it there in spans that would
// hold it whole. The best of that is found exactly, as a flow.
//
// The error is a *closures.Error.
func (p *Planner) Fit(targets []Target, scratch *Scratch) (Fitted, error) {
	if len(targets) > MaxFit {
		return Fitted{}, closures.Errorf(closures.Invalid, "fit fewer at a time", "fit: there are more than %d targets", MaxFit)
	}
	out := Fitted{}
	jobs := make([]job, len(targets))
	longest := make([]time.Duration, len(targets))
	seen := map[closures.Caution]bool{}
	for i := range targets {
		t := &targets[i]
		if !(t.Length > 0 && t.Length <= MaxLength) {
			return Fitted{}, closures.Errorf(closures.Invalid, "give length_s over 0", "fit: target %.64q does not say for how long it wants the beam", t.Name)
		}
		if !(t.Priority >= 0 && t.Priority <= maxPriority) {
			return Fitted{}, closures.Errorf(closures.Invalid, "give a priority from 0 to 1,000,000", "fit: the priority of target %.64q is out of bounds", t.Name)
		}
		planned, err := p.Target(t, scratch)
		if err != nil {
			return Fitted{}, err
		}
		for _, c := range planned.Cautions {
			if !seen[c] {
				seen[c] = true
				out.Cautions = append(out.Cautions, c)
			}
		}
		longest[i] = planned.Spans.Longest().Length()
		jobs[i] = p.job(t, planned.Spans)
	}
	f := newFitting(jobs, int64(p.over.Length()))
	f.run()
	placed := make([]bool, len(jobs))
	for _, b := range f.best {
		placed[b.job] = true
		t := &targets[b.job]
		out.Placed = append(out.Placed, Placement{Index: b.job, Start: p.over.From.Add(time.Duration(b.begin)).Add(t.Use.Reacquire), Length: t.Length})
		out.Value += jobs[b.job].value
	}
	for i := range jobs {
		if !placed[i] {
			out.Left = append(out.Left, Unplaced{Index: i, Longest: longest[i], NoRoom: len(jobs[i].slots) > 0})
		}
	}
	out.Bound = max(out.Value, bound(jobs, int64(p.over.Length())))
	return out, nil
}

// job is a target to be fitted. Times count in nanoseconds from the plan's
// start.
type job struct {
	need  int64 // the time that it takes, acquisition included
	value float64
	slots []slot // in order of time, none empty
}

// slot is when a job may begin and be whole in one allowed span: both ends
// included.
type slot struct{ first, last int64 }

func (p *Planner) job(t *Target, allowed span.Set) job {
	j := job{need: int64(t.Length + t.Use.Reacquire), value: t.weight() * t.Length.Seconds()}
	for _, s := range t.Use.holding(allowed) {
		first, last := int64(s.From.Sub(p.over.From)), int64(s.Until.Sub(p.over.From))-j.need
		if first <= last {
			j.slots = append(j.slots, slot{first, last})
		}
	}
	return j
}

// next returns the first instant not before from at which the job may begin.
func (j *job) next(from int64) (int64, bool) {
	lo, hi := 0, len(j.slots)
	for lo < hi {
		mid := (lo + hi) / 2
		if j.slots[mid].last < from {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	if lo == len(j.slots) {
		return 0, false
	}
	return max(from, j.slots[lo].first), true
}

// last returns the last instant not after until at which the job may begin.
func (j *job) last(until int64) (int64, bool) {
	lo, hi := 0, len(j.slots)
	for lo < hi {
		mid := (lo + hi) / 2
		if j.slots[mid].first <= until {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	if lo == 0 {
		return 0, false
	}
	return min(until, j.slots[lo-1].last), true
}
