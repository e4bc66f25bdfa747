package plan_test

import (
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry/span"
)

// What is said of neighbours: that one is not known, that its present aim is
// taken, that it is idle.
func TestNeighboursAreSpokenOf(t *testing.T) {
	c := newCalm(t)
	said := func(id closures.Source) string {
		var all []string
		for _, o := range one(t, c.planner(t), overhead()).Cautions {
			if o.Code == closures.CodeFieldCrossing && o.Source == id {
				all = append(all, o.Detail)
			}
		}
		return strings.Join(all, "; ")
	}
	if got := said("ridge-2"); got != "the neighbour's pointing is not known, so the plan leaves it out" {
		t.Errorf("unknown: %q", got)
	}
	star := &closures.Aim{Frame: closures.ICRS, Direction: c.nights[0].ICRS(overhead().Direction, dusk), Reference: dusk, Motion: closures.Tracking}
	c.foreseen.Pointings = []closures.Pointing{{Telescope: "ridge-2", Aim: star, Heard: dusk}}
	if got := said("ridge-2"); got != "the plan takes the neighbour's present aim for the time to come" {
		t.Errorf("present: %q", got)
	}
	if got := said("far-dome"); !strings.Contains(got, "not known") {
		t.Errorf("the other: %q", got)
	}
	c.rules.Neighbours[0].OnlyExposing = true
	c.foreseen.Pointings[0].Seen.Exposing = closures.No
	if got := said("ridge-2"); got != "the neighbour is not exposing now, so the plan leaves it out" {
		t.Errorf("idle: %q", got)
	}
	c.foreseen.Pointings[0].Aim = nil
	if got := said("ridge-2"); !strings.Contains(got, "not known") {
		t.Errorf("heard without an aim: %q", got)
	}
	c.rules.Neighbours[0].Yields = closures.YieldsTheirs
	if got := said("ridge-2"); got != "" {
		t.Errorf("who yields: %q", got)
	}
}

// A timetable takes the place of the present aim while it speaks, and of nothing
// else.
func TestTimetable(t *testing.T) {
	c := newCalm(t)
	ours := overhead()
	// The beam's own direction lies in the middle of the neighbour's field.
	into := &closures.Aim{Frame: closures.Horizon, Direction: ours.Direction, Motion: closures.Fixed}
	away := &closures.Aim{Frame: closures.Horizon, Direction: ours.Direction.Mul(-1).Add(ours.Direction.Ortho()).Normalize(), Motion: closures.Fixed}
	away.Direction.Z = -away.Direction.Z
	c.foreseen.Pointings = []closures.Pointing{{Telescope: "ridge-2", Aim: into, Heard: dusk}}
	hour := func(h float64) time.Time { return dusk.Add(time.Duration(h * float64(time.Hour))) }
	allowed := func(slip time.Duration, list ...plan.Appointment) plan.Allowed {
		f, err := plan.Timetable{Appointments: list, Slip: slip}.Apply(c.foreseen, "north", c.over, c.nights)
		if err != nil {
			t.Fatal(err)
		}
		p, err := plan.Prepare(f, "north", c.over, c.nights)
		if err != nil {
			t.Fatal(err)
		}
		return one(t, p, ours)
	}
	at := func(from, until float64, a *closures.Aim) plan.Appointment {
		return plan.Appointment{Telescope: "ridge-2", Over: span.Span{From: hour(from), Until: hour(until)}, Aim: a}
	}
	near := func(got span.Set, want ...float64) bool {
		if len(got)*2 != len(want) {
			return false
		}
		for i, s := range got {
			if d := s.From.Sub(hour(want[2*i])); d < 0 || d > 3*time.Second {
				return false
			}
			if d := hour(want[2*i+1]).Sub(s.Until); d < 0 || d > 3*time.Second {
				return false
			}
		}
		return true
	}
	if a := allowed(0); len(a.Spans) != 0 {
		t.Errorf("present aim: %v", a.Spans)
	}
	if a := allowed(0, at(2, 4, away)); !near(a.Spans, 2, 4) {
		t.Errorf("away from 2 to 4: %v", a.Spans)
	}
	if a := allowed(10*time.Minute, at(2, 4, away)); !near(a.Spans, 2+1./6, 4-1./6) {
		t.Errorf("with a slip: %v", a.Spans)
	}
	if a := allowed(0, at(0, 12, away), at(5, 6, into)); !near(a.Spans, 0, 5, 6, 12) {
		t.Errorf("into from 5 to 6: %v", a.Spans)
	}
	whole := allowed(0, at(-1, 13, away))
	if !near(whole.Spans, 0, 12) || slices.ContainsFunc(whole.Cautions, func(o closures.Caution) bool { return o.Source == "ridge-2" }) {
		t.Errorf("away all night: %v %v", whole.Spans, whole.Cautions)
	}
	part := allowed(0, at(2, 4, away))
	if !slices.ContainsFunc(part.Cautions, func(o closures.Caution) bool {
		return o.Source == "ridge-2" && strings.Contains(o.Detail, "present aim")
	}) {
		t.Errorf("away for a part: %v", part.Cautions)
	}
	for name, list := range map[string]plan.Timetable{
		"no such telescope": {Appointments: []plan.Appointment{{Telescope: "x", Over: c.over, Aim: into}}},
		"empty":             {Appointments: []plan.Appointment{at(3, 3, into)}},
		"no aim":            {Appointments: []plan.Appointment{at(3, 4, nil)}},
		"wide field":        {Appointments: []plan.Appointment{{Telescope: "ridge-2", Over: c.over, Aim: into, Field: 100 * s1.Degree}}},
		"slip":              {Slip: -1},
	} {
		if _, err := list.Apply(c.foreseen, "north", c.over, c.nights); err == nil {
			t.Errorf("%s: not refused", name)
		}
	}
}

// Inside what a plan with a timetable allows, a decision that hears the aims as
// the timetable has them, each change up to the slip sooner or later, finds
// nothing foreseeable. BW-018
func TestPlanWithATimetableAgreesWithDecisions(t *testing.T) {
	var asked, open, blocked int
	for seed := range 4 {
		rng := rand.New(rand.NewPCG(11, uint64(seed)))
		n := randomNight(t, rng, 12)
		ns, err := plan.Nights(n.rules, n.over)
		if err != nil {
			t.Fatal(err)
		}
		table := plan.Timetable{Slip: time.Duration(rng.IntN(3)) * 20 * time.Second}
		present := n.state.Foreseen().Pointings
		type change struct {
			at  time.Time
			aim closures.AimSeen
		}
		var changes []change
		for _, p := range present {
			for at := n.over.From.Add(time.Duration(rng.IntN(3600)) * time.Second); at.Before(n.over.Until); {
				until := at.Add(time.Duration(10+rng.IntN(90)) * time.Minute)
				star := near(rng, toward(n.aims[rng.IntN(len(n.aims))], ns[0], n.over.From), 2*s1.Degree)
				a := plan.Appointment{Telescope: p.Telescope, Over: span.Span{From: at, Until: until}, Aim: &closures.Aim{Frame: closures.ICRS, Direction: star, Reference: n.over.From, Motion: closures.Tracking}, Field: 0.5 * s1.Degree}
				table.Appointments = append(table.Appointments, a)
				early := time.Duration((2*rng.Float64() - 1) * float64(table.Slip))
				changes = append(changes, change{at.Add(early), closures.AimSeen{Telescope: p.Telescope, Aim: a.Aim, Field: a.Field, Exposing: closures.Yes}})
				at = until
				if rng.IntN(2) == 0 { // a gap, in which the present aim is taken
					changes = append(changes, change{until, closures.AimSeen{Telescope: p.Telescope, Aim: p.Aim, Exposing: closures.Yes}})
					at = until.Add(time.Duration(5+rng.IntN(20)) * time.Minute)
				}
			}
		}
		slices.SortStableFunc(changes, func(a, b change) int { return a.at.Compare(b.at) })
		f, err := table.Apply(n.state.Foreseen(), "north", n.over, ns)
		if err != nil {
			t.Fatal(err)
		}
		p, err := plan.Prepare(f, "north", n.over, ns)
		if err != nil {
			t.Fatal(err)
		}
		d := n.decider()
		var scratch plan.Scratch
		allowed := make([]plan.Allowed, len(n.aims))
		for i, a := range n.aims {
			if allowed[i], err = p.One(a, &scratch); err != nil {
				t.Fatal(err)
			}
			for _, b := range allowed[i].Blocked {
				if b.Code == closures.CodeFieldCrossing {
					blocked++
				}
			}
		}
		for k, c := range changes {
			c.aim.Said = d.said()
			d.hear(c.aim)
			until := n.over.Until
			if k+1 < len(changes) {
				until = changes[k+1].at
			}
			for i, a := range n.aims {
				d.point(a)
				look := []time.Time{c.at, until.Add(-1)}
				for _, s := range allowed[i].Spans {
					look = append(look, s.From, s.Until.Add(-1))
				}
				for range 10 {
					look = append(look, c.at.Add(time.Duration(rng.Int64N(int64(max(until.Sub(c.at), 1))))))
				}
				for _, at := range look {
					if at.Before(c.at) || !at.Before(until) || !n.over.Contains(at) {
						continue
					}
					asked++
					if allowed[i].Spans.Contains(at) {
						open++
						if d.closed(at) {
							t.Fatalf("%v: allowed, but decided %v; %v after a change, %v before the next", at, d.decision.Codes.Names(), at.Sub(c.at), until.Sub(at))
						}
					}
				}
			}
		}
	}
	t.Logf("%d instants, %d of them allowed; %d crossings", asked, open, blocked)
	if open < 1000 || blocked < 20 {
		t.Error("the scenes leave nothing to test")
	}
}
