package plan_test

import (
	"errors"
	"math"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

var dusk = time.Date(2031, 2, 13, 19, 0, 0, 0, time.UTC)

// calm is a site with one list that covers the night and closes nothing, no
// limit of daylight, and neighbours of which nothing is known.
type calm struct {
	rules    *closures.Rules
	foreseen *closures.Foreseen
	over     span.Span
	nights   []*sky.Night
}

func newCalm(t testing.TB) *calm {
	t.Helper()
	r := rules(-31.5, -4)
	r.Beams[0].Limits.SunBelow = 90 * s1.Degree
	c := &calm{rules: r, over: span.Span{From: dusk, Until: dusk.Add(12 * time.Hour)}}
	c.foreseen = &closures.Foreseen{Rules: r, Air: r.Site.Air.Over(r.Site.Position.Height)}
	c.list(t, &closures.ListText{ID: "open", UnlistedOpen: true})
	var err error
	if c.nights, err = plan.Nights(r, c.over); err != nil {
		t.Fatal(err)
	}
	return c
}

// list puts a list in force in the place of the others.
func (c *calm) list(t testing.TB, text *closures.ListText) *closures.List {
	t.Helper()
	text.Authority, text.Issued, text.Digest = "orbital-desk", dusk.Add(-time.Hour), closures.Digest{1}
	if text.Covers.Empty() {
		text.Covers = c.over.Widen(time.Hour, time.Hour)
	}
	l, err := closures.Index(text)
	if err != nil {
		t.Fatal(err)
	}
	c.foreseen.Lists = []closures.Listed{{List: l}}
	return l
}

func (c *calm) planner(t testing.TB) *plan.Planner {
	t.Helper()
	p, err := plan.Prepare(c.foreseen, "north", c.over, c.nights)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// overhead is a fixed direction from the ground, which is always allowed in the
// calm.
func overhead() *closures.Aim {
	return &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(90*s1.Degree, 70*s1.Degree), Motion: closures.Fixed}
}

func one(t testing.TB, p *plan.Planner, a *closures.Aim) plan.Allowed {
	t.Helper()
	var scratch plan.Scratch
	out, err := p.One(a, &scratch)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestCalmIsAllowed(t *testing.T) {
	c := newCalm(t)
	a := one(t, c.planner(t), overhead())
	if !a.Spans.Equal(span.Set{c.over}) || a.Share(c.over) != 1 || len(a.Blocked) != 0 {
		t.Errorf("%+v", a)
	}
	for _, code := range []closures.Code{closures.CodeAircraft, closures.CodeSighting, closures.CodeInterlock, closures.CodeReopening, closures.CodeSourceSilent, closures.CodeFault} {
		if !a.LeftOut.Has(code) {
			t.Errorf("%v is not named as left out", code)
		}
	}
	if a.LeftOut&closures.ForeseeableCodes() != 0 || a.LeftOut|closures.ForeseeableCodes() != closures.AllCodes {
		t.Errorf("left out: %v", a.LeftOut.Names())
	}
}

func TestPlansThatCannotBeMadeAreRefused(t *testing.T) {
	c := newCalm(t)
	for _, o := range []struct {
		name string
		beam closures.BeamID
		over span.Span
		n    []*sky.Night
		code closures.ErrorCode
		text string
	}{
		{"empty", "north", span.Span{From: dusk, Until: dusk}, c.nights, closures.Invalid, "empty"},
		{"backward", "north", span.Span{From: dusk, Until: dusk.Add(-time.Hour)}, c.nights, closures.Invalid, "empty"},
		{"zero", "north", span.Span{}, c.nights, closures.Invalid, "empty"},
		{"too long", "north", span.Span{From: dusk, Until: dusk.Add(15 * 24 * time.Hour)}, c.nights, closures.Invalid, "14 days"},
		{"no such beam", "south", c.over, c.nights, closures.NotFound, "not configured"},
		{"no night", "north", c.over, c.nights[:1], closures.Internal, "not prepared"},
	} {
		_, err := plan.Prepare(c.foreseen, o.beam, o.over, o.n)
		var e *closures.Error
		if !errors.As(err, &e) || e.Code != o.code || e.Mend == "" || !strings.Contains(e.Error(), o.text) {
			t.Errorf("%s: %v", o.name, err)
		}
	}
	p := c.planner(t)
	nan := overhead()
	nan.Direction.X = math.NaN()
	var scratch plan.Scratch
	for _, a := range []*closures.Aim{nil, {}, nan, {Frame: closures.ICRS, Direction: r3.Vector{X: 1}, RateRA: math.Inf(1)}, {Frame: closures.Table}} {
		if out, err := p.One(a, &scratch); err == nil || len(out.Spans) > 0 {
			t.Errorf("%+v: %+v", a, out)
		}
	}
}

// What no list covers is not-covered, and never allowed.
func TestBeyondCoverageIsNotCovered(t *testing.T) {
	c := newCalm(t)
	covers := span.Span{From: dusk.Add(2 * time.Hour), Until: dusk.Add(5 * time.Hour)}
	c.list(t, &closures.ListText{ID: "short", UnlistedOpen: true, Covers: covers})
	a := one(t, c.planner(t), overhead())
	// Lead and tail of the authority, and the margins, narrow it.
	want := covers.Narrow(3*time.Second+200*time.Millisecond, 5*time.Second+900*time.Millisecond)
	if !a.Spans.Equal(span.Set{want}) {
		t.Errorf("allowed %v, want %v", a.Spans, want)
	}
	for _, s := range a.Spans.Complement(c.over) {
		if !slices.ContainsFunc(a.Blocked, func(f closures.Finding) bool { return f.Code == closures.CodeNotCovered && f.Over.Covers(s) }) {
			t.Errorf("%v is not blocked as not covered: %+v", s, a.Blocked)
		}
	}
	c.foreseen.Lists = nil
	if a = one(t, c.planner(t), overhead()); len(a.Spans) != 0 || a.Share(c.over) != 0 {
		t.Errorf("without a list: %v", a.Spans)
	}
}

// An ephemeris is nowhere outside its points.
func TestBeyondAnEphemerisNothingIsAllowed(t *testing.T) {
	c := newCalm(t)
	n := c.nights[0]
	from, until := dusk.Add(2*time.Hour), dusk.Add(4*time.Hour)
	v := n.ICRS(geometry.FromHorizon(90*s1.Degree, 40*s1.Degree), from)
	a := one(t, c.planner(t), &closures.Aim{Frame: closures.Table, Points: []closures.AimPoint{{At: from, Direction: v}, {At: until, Direction: v}}, Motion: closures.Tracking})
	if len(a.Spans) != 1 || a.Spans[0].From.Before(from) || a.Spans[0].Until.After(until) || a.Spans.Total() < 119*time.Minute {
		t.Errorf("%v", a.Spans)
	}
}

// A night without dark time says so, and how dark it gets.
func TestNoDarkTimeIsSaid(t *testing.T) {
	c := newCalm(t)
	c.rules.Beams[0].Limits.SunBelow = -12 * s1.Degree
	p := c.planner(t)
	dark := p.Dark()
	of := func(o closures.Caution) bool { return o.Code == closures.CodeDaylight }
	if len(dark) != 1 || slices.ContainsFunc(one(t, p, overhead()).Cautions, of) {
		t.Errorf("dark %v, %+v", dark, one(t, p, overhead()).Cautions)
	}
	if below := plan.SunBelow(c.nights, c.over, -12*s1.Degree); len(below) != 1 || below[0].From.Sub(dark[0].From).Abs() > 3*time.Second || below[0].Until.Sub(dark[0].Until).Abs() > 3*time.Second {
		t.Errorf("the Sun is below from %v, dark is %v", below, dark)
	}
	c.rules.Site.Position.Lat = -75 * s1.Degree // February: the Sun stays above -12°
	var err error
	if c.nights, err = plan.Nights(c.rules, c.over); err != nil {
		t.Fatal(err)
	}
	p = c.planner(t)
	a := one(t, p, overhead())
	if len(p.Dark()) != 0 || len(a.Spans) != 0 || !slices.ContainsFunc(a.Cautions, of) {
		t.Errorf("dark %v, allowed %v, %+v", p.Dark(), a.Spans, a.Cautions)
	}
}

// A direction as seen through the air is the airless one below it.
func TestRefractedDirections(t *testing.T) {
	c := newCalm(t)
	p := c.planner(t)
	at := func(el s1.Angle, refracted bool) bool {
		return len(one(t, p, &closures.Aim{Frame: closures.Horizon, Direction: geometry.FromHorizon(1, el), Refracted: refracted, Motion: closures.Fixed}).Spans) > 0
	}
	// The limit of 30° is observed; the air lifts by about 1.2 arcmin there, with
	// an error of a quarter for unknown air. Errors of aim and star are 50 arcsec.
	if lift := 1.3 / 60 * s1.Degree; !at(30*s1.Degree+3*lift, true) || at(30*s1.Degree-lift, true) || !at(30*s1.Degree+2*lift, false) || at(30*s1.Degree-2*lift, false) {
		t.Error("limits are not met as seen")
	}
	var lowest [2]s1.Angle
	for i, refracted := range []bool{false, true} {
		for el := 29.9 * s1.Degree; !at(el, refracted); el += 0.0005 * s1.Degree {
			lowest[i] = el
		}
	}
	if d := (lowest[1] - lowest[0]).Degrees() * 60; d < 0.9 || d > 2.2 {
		t.Errorf("as seen %v, airless %v: %.2f arcmin apart", lowest[1], lowest[0], d)
	}
}

// What serves a target of its allowed time.
func TestUse(t *testing.T) {
	at := func(m float64) time.Time { return dusk.Add(time.Duration(m * float64(time.Minute))) }
	allowed := span.Set{{From: at(0), Until: at(10)}, {From: at(20), Until: at(22)}, {From: at(30), Until: at(36)}}
	for _, c := range []struct {
		use  plan.Use
		want span.Set
	}{
		{plan.Use{}, allowed},
		{plan.Use{MinSpan: 5 * time.Minute}, span.Set{allowed[0], allowed[2]}},
		{plan.Use{Reacquire: 3 * time.Minute}, span.Set{{From: at(3), Until: at(10)}, {From: at(33), Until: at(36)}}},
		{plan.Use{Reacquire: 3 * time.Minute, MinSpan: 4 * time.Minute}, span.Set{{From: at(3), Until: at(10)}}},
		{plan.Use{MinSpan: time.Hour}, nil},
	} {
		if got := c.use.Of(allowed); !got.Equal(c.want) {
			t.Errorf("%+v: %v", c.use, got)
		}
	}
	p := plan.Planned{Usable: allowed}
	if p.Longest() != allowed[0] || p.Share(span.Span{From: at(0), Until: at(36)}) != 0.5 || p.Share(span.Span{}) != 0 {
		t.Errorf("%v, %v", p.Longest(), p.Share(span.Span{From: at(0), Until: at(36)}))
	}
}

// Which targets are open now, ranked.
func TestOpenFor(t *testing.T) {
	at := func(m int) time.Time { return dusk.Add(time.Duration(m) * time.Minute) }
	spans := func(from, until int) plan.Allowed {
		return plan.Allowed{Spans: span.Set{{From: at(from), Until: at(until)}}}
	}
	plans := []plan.Planned{
		{Target: plan.Target{Name: "short"}, Allowed: spans(0, 12)},
		{Target: plan.Target{Name: "long"}, Allowed: spans(0, 60)},
		{Target: plan.Target{Name: "later"}, Allowed: spans(11, 60)},
		{Target: plan.Target{Name: "dear", Priority: 5}, Allowed: spans(0, 20)},
		{Target: plan.Target{Name: "slow", Use: plan.Use{Reacquire: 8 * time.Minute}}, Allowed: spans(0, 22)},
		{Target: plan.Target{Name: "picky", Use: plan.Use{MinSpan: 30 * time.Minute}}, Allowed: spans(0, 30)},
		{Target: plan.Target{Name: "none"}},
	}
	names := func(out []plan.Opening) (s []string) {
		for _, o := range out {
			s = append(s, plans[o.Index].Target.Name)
		}
		return s
	}
	if got := names(plan.OpenFor(plans, at(10), 0)); !slices.Equal(got, []string{"dear", "long", "slow", "short"}) {
		t.Errorf("%v", got)
	}
	if got := plan.OpenFor(plans, at(10), 5*time.Minute); !slices.Equal(names(got), []string{"dear", "long"}) || got[1].For != 50*time.Minute || !got[1].Until.Equal(at(60)) {
		t.Errorf("%+v", got)
	}
}

// What a list that came back says of each target.
func TestReconcile(t *testing.T) {
	c := newCalm(t)
	v := r3.Vector{X: 1}
	off := func(deg float64) r3.Vector {
		return geometry.FromEquator(s1.Angle(deg)*s1.Degree, 0)
	}
	star := func(name string, dir r3.Vector) plan.Target {
		return plan.Target{Name: name, Aim: &closures.Aim{Frame: closures.ICRS, Direction: dir, Motion: closures.Tracking}}
	}
	cone := func(id string, dir r3.Vector, radius float64) closures.Region {
		return closures.Region{ID: id, Shape: closures.ICRSCone, Direction: dir, Radius: s1.Angle(radius) * s1.Degree, Throughout: closures.ThroughoutOpen}
	}
	regions := []closures.Region{
		cone("f-1", v, 0.05), cone("f-2", off(10), 0.05), cone("f-3", off(20), 0.05), cone("by-place", off(30), 0.05), cone("wide", off(30), 2), cone("nobody", off(50), 0.05),
		{ID: "dome", Shape: closures.WholeSky, Throughout: closures.ThroughoutOpen},
		cone("two-words-", off(60), 0.05),
	}
	regions[1].Throughout = closures.ThroughoutClosed
	regions[7].Throughout = closures.NotThroughout
	window := span.Span{From: dusk.Add(time.Hour), Until: dusk.Add(2 * time.Hour)}
	l := c.list(t, &closures.ListText{ID: "back", Regions: regions, Windows: []closures.Window{{Region: 7, Open: true, From: window.From.UnixNano(), Until: window.Until.UnixNano()}}})
	targets := []plan.Target{star("f-1", v), star("f-2", off(10)), star("f-3", off(20.1)), star("elsewhere", off(30)), star("gone", off(40)), star("two words!", off(60)),
		{Name: "ground", Aim: overhead()}}
	got, err := plan.Reconcile(c.foreseen, "north", l, targets, c.over, c.nights)
	if err != nil {
		t.Fatal(err)
	}
	want := []struct {
		is     plan.Returned
		region string
	}{{plan.Cleared, "f-1"}, {plan.Refused, "f-2"}, {plan.Moved, "f-3"}, {plan.Cleared, "by-place"}, {plan.Missing, ""}, {plan.Cleared, "two-words-"}, {plan.Missing, ""}}
	for i, w := range want {
		if o := got.Targets[i]; o.Returned != w.is || o.Region != w.region {
			t.Errorf("%s: %v %q, want %v %q", o.Target.Name, o.Returned, o.Region, w.is, w.region)
		}
	}
	if d := got.Targets[2].Apart.Degrees(); math.Abs(d-0.1) > 1e-9 {
		t.Errorf("moved by %v", d)
	}
	if o := got.Targets[5].Open; len(o) != 1 || !window.Covers(o[0]) || window.Length()-o[0].Length() > 15*time.Second {
		t.Errorf("open %v", o)
	}
	if !slices.Equal(got.Extra, []string{"wide", "nobody"}) || got.Over != c.over {
		t.Errorf("%v %v", got.Extra, got.Over)
	}
	if _, err := plan.Reconcile(c.foreseen, "north", l, targets, span.Span{From: dusk.Add(30 * time.Hour), Until: dusk.Add(31 * time.Hour)}, c.nights); err == nil {
		t.Error("a span that the list does not cover")
	}
}

// One planner serves many at once, and each the same.
func TestPlannerIsShared(t *testing.T) {
	task := makeTask(t, sizes{60, 20, 2})
	var want []plan.Allowed
	for _, a := range task.aims {
		want = append(want, one(t, task.planner, a))
	}
	var wg sync.WaitGroup
	for range 4 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			var scratch plan.Scratch
			for i, a := range task.aims {
				got, err := task.planner.One(a, &scratch)
				if err != nil || !got.Spans.Equal(want[i].Spans) || !slices.Equal(got.Blocked, want[i].Blocked) || !slices.Equal(got.Cautions, want[i].Cautions) {
					t.Errorf("target %d differs: %v", i, err)
				}
			}
		}()
	}
	wg.Wait()
}
