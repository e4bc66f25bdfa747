package closures

import (
	"testing"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// What a table does not reach is unknown, however long a step the search takes
// beside it: for the beam's own aim, and for a neighbour's. BW-018
func TestBeyondATableNothingIsKnown(t *testing.T) {
	r := busyRules()
	r.Neighbours = []NeighbourRules{{ID: "t", Offset: geometry.FromHorizon(1, 0).Mul(100), Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: time.Hour}}
	night, err := sky.Prepare(r.Site.Position, evening, r.Site.UT1)
	if err != nil {
		t.Fatal(err)
	}
	table := func(az, el float64, from, until time.Time) *Aim {
		v := night.ICRS(geometry.FromHorizon(s1.Angle(az)*s1.Degree, s1.Angle(el)*s1.Degree), evening)
		return &Aim{Frame: Table, Points: []AimPoint{{from, v}, {until, v}}, Motion: Tracking}
	}
	long := span.Span{From: evening, Until: evening.Add(3 * time.Hour)}
	from, until := evening.Add(30*time.Minute), evening.Add(90*time.Minute)
	for _, c := range []struct {
		name  string
		ours  *Aim
		their *Aim
		code  Code
	}{
		{"the beam's elevation", table(180, 60, from, until), table(0, 60, long.From, long.Until), CodeElevationLimit},
		{"the beam's crossing", table(180, 60, from, until), table(0, 60, long.From, long.Until), CodeFieldCrossing},
		{"the neighbour's crossing", table(180, 60, long.From, long.Until), table(0, 60, from, until), CodeFieldCrossing},
	} {
		for _, now := range []time.Time{{}, evening} { // a plan, and a decision
			f := &Foreseen{Rules: r, Air: r.Site.Air.Over(r.Site.Position.Height), Pointings: []Pointing{{Telescope: "t", Aim: c.their, Heard: evening, Seen: AimSeen{Said: evening}}}}
			q := Question{Beam: &r.Beams[0], Aim: c.ours, Over: long, Nights: []*sky.Night{night}, Edge: EdgePlan, Now: now}
			var sh Sheet
			f.Look(&q, &sh)
			var shut span.Set
			for a := sh.Answers[c.code]; len(shut) < a.N; {
				shut = append(shut, sh.Found[a.First+len(shut)].Over)
			}
			shut = span.Tidy(shut)
			if !shut.Covers(span.Span{From: long.From, Until: from}) || !shut.Covers(span.Span{From: until.Add(1), Until: long.Until}) {
				t.Errorf("%s: closed %v, known from %v until %v", c.name, shut, from, until)
			}
			if shut.Contains(from.Add(30 * time.Minute)) {
				t.Errorf("%s: closed in the midst of what is known: %v", c.name, shut)
			}
			for _, o := range sh.Found {
				if o.Code == CodeDaylight {
					t.Errorf("%s: the Sun is taken for the table", c.name)
				}
			}
		}
	}
}

// A table whose points are all the same is where they are, and while they are:
// not in whatever region is asked about. BW-018
func TestATableThatStandsStill(t *testing.T) {
	r := busyRules()
	r.Neighbours = nil
	night, err := sky.Prepare(r.Site.Position, evening, r.Site.UT1)
	if err != nil {
		t.Fatal(err)
	}
	here := night.ICRS(geometry.FromHorizon(1, 1), evening)
	there := night.ICRS(geometry.FromHorizon(2, 1), evening)
	over := span.Span{From: evening, Until: evening.Add(time.Hour)}
	known := span.Span{From: evening.Add(10 * time.Minute), Until: evening.Add(50 * time.Minute)}
	q := Question{Beam: &r.Beams[0], Aim: &Aim{Frame: Table, Points: []AimPoint{{known.From, here}, {known.Until, here}}}, Over: over, Nights: []*sky.Night{night}, Edge: EdgeDecide}
	f := &Foreseen{Rules: r}
	for _, c := range []struct {
		at   Region
		in   bool
		name string
	}{
		{Region{Shape: ICRSCone, Direction: here, Radius: s1.Degree}, true, "its own cone"},
		{Region{Shape: ICRSCone, Direction: there, Radius: s1.Degree}, false, "another cone"},
		{Region{Shape: TrackCone, Points: []AimPoint{{over.From, here}, {over.Until, here}}, Radius: s1.Degree}, true, "its own track"},
		{Region{Shape: TrackCone, Points: []AimPoint{{over.From, there}, {over.Until, there}}, Radius: s1.Degree}, false, "another track"},
	} {
		might, must := q.Within(f, &c.at)
		if middle := known.From.Add(time.Minute); might.Contains(middle) != c.in || must.Contains(middle) != c.in {
			t.Errorf("%s: might %v, must %v", c.name, might, must)
		}
		for _, at := range []time.Time{over.From, known.From.Add(-1), known.Until.Add(2), over.Until.Add(-1)} {
			if !might.Contains(at) || must.Contains(at) {
				t.Errorf("%s, where nothing is known: might %v, must %v", c.name, might, must)
			}
		}
	}
}
