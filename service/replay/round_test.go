package replay

import (
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

func decisionWith(findings ...closures.Finding) *closures.Decision {
	d := &closures.Decision{Reasons: findings}
	for _, f := range findings {
		d.Codes = d.Codes.With(f.Code)
	}
	d.Open = d.Codes == 0
	return d
}

func finding(c closures.Code, v float64, u closures.Unit) closures.Finding {
	return closures.Finding{Code: c, Verdict: closures.Violated, Margin: closures.Margin{Value: v, Unit: u}}
}

// What another build may decide otherwise hangs on margins as good as zero,
// each code on its own.
func TestHangsOn(t *testing.T) {
	at := time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)
	listed := func(from time.Time) closures.Finding {
		return closures.Finding{Code: closures.CodeListedClosure, Source: "orbital-desk", Region: "f-101", Verdict: closures.Violated, Over: span.Span{From: from, Until: from.Add(time.Minute)}}
	}
	coming := func(f closures.Finding) *closures.Decision {
		return &closures.Decision{Open: true, Coming: []closures.Finding{f}}
	}
	open := decisionWith()
	reopening := closures.Finding{Code: closures.CodeReopening, Verdict: closures.Violated}
	hold := closures.Finding{Code: closures.CodeHold, Verdict: closures.Violated}
	for name, c := range map[string]struct {
		recorded, mine *closures.Decision
		least          closures.Margin // the replay's, of the elevation
		want           bool
	}{
		"an aircraft by half a micrometre":      {decisionWith(finding(closures.CodeAircraft, -5e-7, closures.Metre)), open, closures.Margin{}, true},
		"an aircraft by two micrometres":        {decisionWith(finding(closures.CodeAircraft, -2e-6, closures.Metre)), open, closures.Margin{}, false},
		"the replay's aircraft":                 {open, decisionWith(finding(closures.CodeAircraft, -5e-7, closures.Metre)), closures.Margin{}, true},
		"a sighting by half a nanoradian":       {open, decisionWith(finding(closures.CodeSighting, -5e-10, closures.Radian)), closures.Margin{}, true},
		"a sighting by two nanoradians":         {open, decisionWith(finding(closures.CodeSighting, -2e-9, closures.Radian)), closures.Margin{}, false},
		"an elevation by a step of the search":  {open, decisionWith(closures.Finding{Code: closures.CodeElevationLimit}), closures.Margin{Value: -7e-8, Unit: closures.Radian}, true},
		"an elevation by two":                   {open, decisionWith(closures.Finding{Code: closures.CodeElevationLimit}), closures.Margin{Value: -1.5e-7, Unit: closures.Radian}, false},
		"an edge by a millisecond":              {coming(listed(at.Add(time.Millisecond))), decisionWith(listed(at)), closures.Margin{}, true},
		"an edge by three":                      {coming(listed(at.Add(3 * time.Millisecond))), decisionWith(listed(at)), closures.Margin{}, false},
		"what is measured in nothing":           {decisionWith(hold), open, closures.Margin{}, false},
		"what is measured in seconds":           {decisionWith(finding(closures.CodeClock, 0, closures.Second)), open, closures.Margin{}, false},
		"an aircraft, and the latch after it":   {decisionWith(finding(closures.CodeAircraft, -5e-7, closures.Metre), reopening), open, closures.Margin{}, true},
		"an aircraft, and a hold":               {decisionWith(finding(closures.CodeAircraft, -5e-7, closures.Metre), hold), open, closures.Margin{}, false},
		"the latch alone":                       {decisionWith(reopening), open, closures.Margin{}, false},
		"nothing":                               {open, decisionWith(), closures.Margin{}, false},
		"a margin that nobody stated, not zero": {decisionWith(closures.Finding{Code: closures.CodeAircraft, Margin: closures.Margin{Unit: closures.Metre}}), open, closures.Margin{}, false},
	} {
		var sheet closures.Sheet
		sheet.Answers[closures.CodeElevationLimit].Least = c.least
		if got := hangsOn(c.recorded, c.mine, &sheet); (got != nil) != c.want {
			t.Errorf("%s: %+v", name, got)
		}
	}
	if !latched(decisionWith(reopening), open) || latched(decisionWith(hold), open) {
		t.Error("latched")
	}
}
