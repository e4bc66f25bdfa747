package plan_test

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry/span"
)

// held is the calm with holds of minutes.
func (c *calm) hold(from, until int) {
	c.foreseen.Holds = append(c.foreseen.Holds, closures.HoldPlaced{
		ID: closures.HoldID(fmt.Sprint("h", len(c.foreseen.Holds))), Beam: closures.EveryBeam, By: "ana", Reason: "test",
		From: dusk.Add(time.Duration(from) * time.Minute), Until: dusk.Add(time.Duration(until) * time.Minute),
	})
}

// Each kind of conflict, and the nearest starts that clear it. The margins take
// 0.9 s before a hold and 0.2 s behind it.
func TestSequenceConflicts(t *testing.T) {
	c := newCalm(t)
	c.hold(60, 70)
	c.hold(74, 90)
	p := c.planner(t)
	const before, behind = 900 * time.Millisecond, 200 * time.Millisecond
	m := func(f float64) time.Time { return dusk.Add(time.Duration(f * float64(time.Minute))) }
	target := func(use plan.Use) plan.Target { return plan.Target{Name: "a", Aim: overhead(), Use: use} }
	entry := func(from, length float64, use plan.Use) plan.Entry {
		return plan.Entry{Target: target(use), Start: m(from), Length: time.Duration(length * float64(time.Minute))}
	}
	none := plan.Use{}
	slow := plan.Use{Reacquire: 2 * time.Minute}
	type want struct {
		why                     string
		earlier, later, delayed time.Time
	}
	for _, o := range []struct {
		name    string
		entries []plan.Entry
		want    []want
	}{
		{"stands", []plan.Entry{entry(10, 20, none), entry(30, 20, none)}, []want{{delayed: m(10)}, {delayed: m(30)}}},
		{"closed within", []plan.Entry{entry(50, 20, none)}, []want{{"closed", m(40).Add(-before), m(90).Add(behind), m(90).Add(behind)}}},
		{"closed twice", []plan.Entry{entry(65, 20, none)}, []want{{"closed closed", m(40).Add(-before), m(90).Add(behind), m(90).Add(behind)}}},
		{"fits between", []plan.Entry{entry(69, 2, none)}, []want{{"closed", m(58).Add(-before), m(70).Add(behind), m(70).Add(behind)}}},
		{"fits between, not acquired", []plan.Entry{entry(71, 2, slow)}, []want{{"closed", m(58).Add(-before), m(92).Add(behind), m(92).Add(behind)}}},
		{"span too short", []plan.Entry{entry(71, 2, plan.Use{MinSpan: 5 * time.Minute})}, []want{{"span-too-short", m(58).Add(-before), m(90).Add(behind), m(90).Add(behind)}}},
		{"from before the plan", []plan.Entry{entry(-5, 10, none)}, []want{{"outside-the-plan", time.Time{}, m(0), m(0)}}},
		{"acquiring before the plan", []plan.Entry{entry(1, 10, slow)}, []want{{"outside-the-plan", time.Time{}, m(2), m(2)}}},
		{"until after the plan", []plan.Entry{entry(715, 10, none)}, []want{{"outside-the-plan", m(710), time.Time{}, time.Time{}}}},
		{"elsewhere", []plan.Entry{entry(2000, 10, none)}, []want{{"outside-the-plan", m(710), time.Time{}, time.Time{}}}},
		{"longer than the night", []plan.Entry{entry(0, 1000, none)}, []want{{"closed closed outside-the-plan", time.Time{}, time.Time{}, time.Time{}}}},
		{"overlap", []plan.Entry{entry(10, 20, none), entry(25, 10, none)}, []want{{delayed: m(10)}, {"overlaps", m(0), m(30), m(30)}}},
		{"no time to acquire", []plan.Entry{entry(10, 20, none), entry(31, 10, slow)}, []want{{delayed: m(10)}, {"overlaps", time.Time{}, m(32), m(32)}}},
		{"moves the rest", []plan.Entry{entry(55, 10, none), entry(95, 5, none)}, []want{{"closed", m(50).Add(-before), m(100), m(90).Add(behind)}, {delayed: m(100).Add(behind)}}},
		{"out of order", []plan.Entry{entry(30, 10, none), entry(10, 10, none)}, []want{{delayed: m(30)}, {"out-of-order", m(10), m(10), m(40)}}},
	} {
		var scratch plan.Scratch
		got, err := p.Sequence(o.entries, &scratch)
		if err != nil {
			t.Fatal(err)
		}
		for i, w := range o.want {
			g := got[i]
			var why []string
			for _, k := range g.Conflicts {
				why = append(why, k.Why.String())
				if k.Why == plan.Closed && (k.Finding.Code != closures.CodeHold || k.Over.Empty() || !k.Finding.Over.Covers(k.Over)) {
					t.Errorf("%s: %+v", o.name, k)
				}
			}
			if strings.Join(why, " ") != w.why || !g.Earlier.Equal(w.earlier) || !g.Later.Equal(w.later) || !g.Delayed.Equal(w.delayed) {
				t.Errorf("%s, entry %d: %v, earlier %v, later %v, delayed %v", o.name, i, why, g.Earlier.Sub(dusk), g.Later.Sub(dusk), g.Delayed.Sub(dusk))
			}
		}
	}
	for name, e := range map[string]plan.Entry{
		"no length": entry(1, 0, none), "a year": entry(1, 600000, none), "no aim": {Start: m(1), Length: time.Minute},
		"use below zero": entry(1, 1, plan.Use{Reacquire: -1}),
	} {
		var scratch plan.Scratch
		if _, err := p.Sequence([]plan.Entry{e}, &scratch); err == nil {
			t.Errorf("%s: not refused", name)
		}
	}
}

func TestChanged(t *testing.T) {
	bad := plan.Checked{Conflicts: []plan.Conflict{{}}}
	if got := plan.Changed([]plan.Checked{bad, {}, bad, {}}, []plan.Checked{bad, bad, {}, {}}); !slices.Equal(got, []int{1, 2}) {
		t.Errorf("%v", got)
	}
}

func TestFitRefuses(t *testing.T) {
	c := newCalm(t)
	p := c.planner(t)
	var scratch plan.Scratch
	for name, o := range map[string]plan.Target{
		"no length": {Name: "a", Aim: overhead()}, "no aim": {Name: "a", Length: time.Minute},
		"priority below zero": {Name: "a", Aim: overhead(), Length: time.Minute, Priority: -1},
		"use":                 {Name: "a", Aim: overhead(), Length: time.Minute, Use: plan.Use{MinSpan: -1}},
	} {
		if _, err := p.Fit([]plan.Target{o}, &scratch); err == nil {
			t.Errorf("%s: not refused", name)
		}
	}
	got, err := p.Fit(nil, &scratch)
	if err != nil || len(got.Placed) > 0 || got.Loss() != 0 {
		t.Errorf("%+v, %v", got, err)
	}
	c.hold(0, 700)
	got, err = c.planner(t).Fit([]plan.Target{{Name: "long", Aim: overhead(), Length: time.Hour}, {Name: "a", Aim: overhead(), Length: 15 * time.Minute}, {Name: "b", Aim: overhead(), Length: 15 * time.Minute, Priority: 2}}, &scratch)
	if err != nil || len(got.Placed) != 1 || got.Placed[0].Index != 2 || len(got.Left) != 2 || got.Left[0].NoRoom || !got.Left[1].NoRoom || got.Left[0].Longest < 19*time.Minute {
		t.Errorf("%+v, %v", got, err)
	}
}

// Whatever a sequence or a fit says can stand is decided second by second: no
// decision for that aim finds anything foreseeable, from the time to acquire
// until the end. BW-018
func TestSequenceAndFitAgainstDecisions(t *testing.T) {
	var seconds, stand, moved, fitted int
	var value, limit float64
	for seed := range 5 {
		rng := rand.New(rand.NewPCG(21, uint64(seed)))
		n := randomNight(t, rng, 14)
		ns, err := plan.Nights(n.rules, n.over)
		if err != nil {
			t.Fatal(err)
		}
		p, err := plan.Prepare(n.state.Foreseen(), "north", n.over, ns)
		if err != nil {
			t.Fatal(err)
		}
		d := n.decider()
		check := func(what string, target *plan.Target, start time.Time, length time.Duration) {
			t.Helper()
			d.point(target.Aim)
			from, until := start.Add(-target.Use.Reacquire), start.Add(length)
			if from.Before(n.over.From) || until.After(n.over.Until) {
				t.Fatalf("%s: %v to %v leaves the plan", what, from, until)
			}
			for at := from; at.Before(until); at = at.Add(time.Second) {
				seconds++
				if d.closed(at) {
					t.Fatalf("%s: decided %v at %v, %v after the start", what, d.decision.Codes.Names(), at, at.Sub(start))
				}
			}
			if last := until.Add(-1); d.closed(last) {
				t.Fatalf("%s: decided %v at its end", what, d.decision.Codes.Names())
			}
		}
		var targets []plan.Target
		var entries []plan.Entry
		at := n.over.From
		for i, a := range n.aims {
			o := plan.Target{
				Name: fmt.Sprint("t", i), Aim: a, Length: time.Duration(1+rng.IntN(15)) * time.Minute, Priority: float64(rng.IntN(4)),
				Use: plan.Use{Reacquire: time.Duration(rng.IntN(60)) * time.Second, MinSpan: time.Duration(rng.IntN(120)) * time.Second},
			}
			targets = append(targets, o)
			at = at.Add(time.Duration(rng.IntN(50)) * time.Minute)
			entries = append(entries, plan.Entry{Target: o, Start: at, Length: o.Length})
		}
		var scratch plan.Scratch
		checked, err := p.Sequence(entries, &scratch)
		if err != nil {
			t.Fatal(err)
		}
		var busy []span.Span
		for i := range checked {
			c := &checked[i]
			e := &c.Entry
			overlaps := slices.ContainsFunc(c.Conflicts, func(k plan.Conflict) bool { return k.Why >= plan.Overlaps })
			if len(c.Conflicts) == 0 {
				stand++
				check("an entry that stands", &e.Target, e.Start, e.Length)
			} else if allowed, err := p.Target(&e.Target, &scratch); err == nil && !overlaps &&
				allowed.Usable.Covers(span.Span{From: e.Start, Until: e.Start.Add(e.Length)}) {
				t.Errorf("entry %d is usable, and in conflict: %+v", i, c.Conflicts)
			}
			for _, start := range []time.Time{c.Earlier, c.Later} {
				if !start.IsZero() {
					moved++
					check("a nearest start", &e.Target, start, e.Length)
				}
			}
			if !c.Earlier.IsZero() && c.Earlier.After(e.Start) || !c.Later.IsZero() && c.Later.Before(e.Start) {
				t.Errorf("entry %d at %v: %v, %v", i, e.Start, c.Earlier, c.Later)
			}
			if !c.Delayed.IsZero() {
				check("a delayed start", &e.Target, c.Delayed, e.Length)
				busy = append(busy, span.Span{From: c.Delayed.Add(-e.Target.Use.Reacquire), Until: c.Delayed.Add(e.Length)})
			}
		}
		if len(span.Make(busy...)) == 0 || span.Make(busy...).Total() != total(busy) {
			t.Error("delayed entries overlap")
		}
		fit, err := p.Fit(targets, &scratch)
		if err != nil {
			t.Fatal(err)
		}
		done := n.over.From
		for _, o := range fit.Placed {
			fitted++
			target := &targets[o.Index]
			if from := o.Start.Add(-target.Use.Reacquire); from.Before(done) {
				t.Errorf("target %d begins at %v, the beam is free at %v", o.Index, from, done)
			}
			done = o.Start.Add(o.Length)
			check("a fitted target", target, o.Start, o.Length)
		}
		if len(fit.Placed)+len(fit.Left) != len(targets) || fit.Bound < fit.Value {
			t.Errorf("%d placed and %d left of %d; %v of %v", len(fit.Placed), len(fit.Left), len(targets), fit.Value, fit.Bound)
		}
		again, _ := p.Fit(targets, &scratch)
		if fmt.Sprint(again.Placed) != fmt.Sprint(fit.Placed) {
			t.Error("two fits differ")
		}
		value, limit = value+fit.Value, limit+fit.Bound
	}
	t.Logf("%d seconds: %d entries stand, %d nearest starts, %d targets fitted, worth %.1f %% of the bound", seconds, stand, moved, fitted, 100*value/limit)
	if stand < 5 || moved < 20 || fitted < 20 {
		t.Error("the scenes leave nothing to test")
	}
}

func total(spans []span.Span) (sum time.Duration) {
	for _, s := range spans {
		sum += s.Length()
	}
	return sum
}
