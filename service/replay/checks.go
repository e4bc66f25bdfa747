package replay

import (
	"fmt"
	"math"

	"beamward/closures"
)

// clearWords say what each check found when it found nothing.
var clearWords = [closures.NumCodes]string{
	closures.CodeListedClosure:  "every list in force leaves the aim open",
	closures.CodeNotCovered:     "lists in force cover the time for every required authority",
	closures.CodeAircraft:       "no aircraft can be in the keep-out before a permit given then is over",
	closures.CodeSighting:       "nothing that a spotter saw can be near the aim",
	closures.CodeDetectorAlarm:  "no detector raises the alarm",
	closures.CodeFieldCrossing:  "the beam keeps out of the neighbours' fields",
	closures.CodeHold:           "nobody holds the beam",
	closures.CodeInterlock:      "every required interlock says that it is safe",
	closures.CodeWatchMissing:   "every required post is staffed",
	closures.CodeElevationLimit: "the elevation is within the beam's limits",
	closures.CodeDaylight:       "the Sun is below the beam's limit",
	closures.CodeAimUnknown:     "the aim is known, fresh, and not contradicted",
	closures.CodeSlewing:        "the telescope does not slew",
	closures.CodeSourceSilent:   "every required source is heard and receives",
	closures.CodeClock:          "the clock is right",
	closures.CodeRecord:         "the record keeps up",
	closures.CodeShutterFault:   "the shutter does what it is told",
	closures.CodeStarting:       "everything required was heard since the start",
	closures.CodeReopening:      "the time after the last closure is over",
	closures.CodeRearm:          "no cause waits for a person",
	closures.CodeFault:          "the service found no fault in itself",
}

// remembered are the checks that rest on what happened longer ago than a
// beginning amid a run knows.
const remembered closures.Codes = 1<<closures.CodeShutterFault | 1<<closures.CodeStarting | 1<<closures.CodeReopening | 1<<closures.CodeRearm

// checks tells every check: its verdict from the decision, its least margin
// from the replay where that comes to the same verdict.
func (x *explainer) checks(d, mine *closures.Decision, id closures.BeamID) []CheckTold {
	var sheet closures.Sheet
	if mine != nil {
		var scratch closures.Decision
		x.state.Decide(id, d.At, &sheet, &scratch)
	}
	out := make([]CheckTold, 0, closures.NumCodes)
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		t := CheckTold{Code: c.String(), Verdict: closures.Clear.String()}
		verdict := closures.Clear
		for i := range d.Reasons {
			f := &d.Reasons[i]
			if f.Code != c {
				continue
			}
			t.Findings = append(t.Findings, x.finding(f, id))
			if verdict == closures.Clear || f.Verdict < verdict {
				verdict = f.Verdict
			}
		}
		if verdict == closures.Clear && d.Codes.Has(c) {
			verdict = closures.Unknown
		}
		t.Verdict = verdict.String()
		if mine != nil && sheet.Answers[c].Verdict == verdict && (x.whole || !remembered.Has(c)) {
			t.Margin = margin(sheet.Answers[c].Least)
			if t.Margin != nil && verdict == closures.Clear && t.Margin.Value < 0 {
				t.Margin = nil // of a condition that does not count by itself
			}
		}
		t.Says = checkSays(c, verdict, &t, mine != nil && math.IsInf(sheet.Answers[c].Least.Value, 1))
		out = append(out, t)
	}
	return out
}

// checkSays puts one check into words. none says that there was nothing that
// it could have measured.
func checkSays(c closures.Code, v closures.Verdict, t *CheckTold, none bool) string {
	switch {
	case v != closures.Clear && len(t.Findings) == 0:
		return "it gave no answer"
	case v != closures.Clear && len(t.Findings) == 1:
		return t.Findings[0].Detail
	case v != closures.Clear:
		return fmt.Sprintf("%s, and %d more", t.Findings[0].Detail, len(t.Findings)-1)
	case none && c == closures.CodeAircraft:
		return "no aircraft is near enough to be asked about"
	case none && c == closures.CodeFieldCrossing:
		return "no neighbour's pointing matters"
	}
	return clearWords[c]
}
