package alerts

import (
	"reflect"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

func list(t *testing.T, id closures.ListID, from, until time.Duration) *closures.List {
	t.Helper()
	l, err := closures.Index(&closures.ListText{
		ID: id, Authority: "desk", Issued: evening, Covers: span.Span{From: evening.Add(from), Until: evening.Add(until)}, UnlistedOpen: true, Digest: closures.Digest{1},
	})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func TestObserve(t *testing.T) {
	old, now := evening.Add(-time.Minute), evening
	rules := &closures.Rules{
		Beams:       []closures.BeamRules{{ID: "north", FeedbackStale: 5 * time.Second}, {ID: "south", FeedbackStale: 5 * time.Second, FeedbackRequired: true}},
		Sources:     []closures.SourceRules{{ID: "rx-1", Kind: closures.AircraftSource, StaleAfter: 10 * time.Second}},
		Neighbours:  []closures.NeighbourRules{{ID: "ridge-1", StaleAfter: time.Second}, {ID: "ridge-2", StaleAfter: time.Hour}, {ID: "ridge-3", Yields: closures.YieldsTheirs}, {ID: "ridge-4", StaleAfter: time.Hour}},
		Watches:     []closures.WatchRules{{Post: "east-lot", Required: true}, {Post: "west-lot", Required: true}, {Post: "roof"}},
		Authorities: []closures.AuthorityRules{{ID: "desk", Required: true}, {ID: "air-desk"}},
		Aircraft:    closures.AircraftRules{Unlocated: closures.UnlocatedAlarm},
	}
	decisions := []*closures.Decision{
		{Beam: "north", Codes: codes(closures.CodeAircraft, closures.CodeAimUnknown, closures.CodeWatchMissing), Reasons: []closures.Finding{
			{Code: closures.CodeAircraft, Source: "rx-1", Ref: "4b1803", Detail: "an aircraft was lost"},
			{Code: closures.CodeAircraft, Source: "rx-1", Ref: "4b1804"},
			{Code: closures.CodeWatchMissing, Source: "east-lot"},
			{Code: closures.CodeAimUnknown, Verdict: closures.Violated},
		}},
		{Beam: "south", Open: true, OpenUntil: evening.Add(time.Hour), ClosesAt: evening.Add(time.Hour + time.Second)},
	}
	known := &closures.Known{
		Popups: 3,
		Beams: []closures.BeamKnown{
			{Beam: "north", ShutterHeard: old, Need: codes(closures.CodeClock)},
			{Beam: "south", ShutterHeard: old},
		},
		Sources: []closures.SourceKnown{
			{Source: "rx-1", Kind: closures.AircraftSource, Required: true},
			{Source: "catwalk", Kind: closures.InterlockSource, Receives: true, Interlock: closures.InterlockSeen{Said: now}},
			{Source: "roof-door", Kind: closures.InterlockSource, Receives: true},
			{Source: "thermal-1", Kind: closures.DetectorSource, Silent: true},
		},
		Detectors: []closures.DetectorSeen{{Source: "thermal-1", State: closures.DetectorAlarm}},
		Aircraft: []closures.AircraftKnown{
			{Aircraft: "4b1803", Source: "rx-1", Heard: old, Located: true}, {Aircraft: "4b1804", Source: "rx-1", Heard: now, Located: true}, {Aircraft: "4b1805", Source: "rx-1", Heard: now},
		},
	}
	aim := &closures.Aim{}
	foreseen := &closures.Foreseen{
		Pointings: []closures.Pointing{{Telescope: "ridge-1", Aim: aim, Seen: closures.AimSeen{Said: now}, Heard: old}, {Telescope: "ridge-2", Aim: aim, Seen: closures.AimSeen{Said: now}, Heard: now}},
		Lists: []closures.Listed{
			{List: list(t, "b", time.Hour, 3*time.Hour)}, {List: list(t, "a", -time.Hour, time.Hour)}, {List: list(t, "c", 4*time.Hour, 5*time.Hour)}, {List: list(t, "w", 0, 9*time.Hour), Waiting: true},
		},
	}
	got := Observe(rules, decisions, known, foreseen, now)
	want := Observation{
		Popups: 3, Unlocated: 1,
		Beams: []Beam{
			{ID: "north", Codes: decisions[0].Codes, Needs: codes(closures.CodeClock), Why: "an aircraft was lost", AimsDisagree: true, ShutterSilent: true, Lost: []string{"4b1803"}},
			{ID: "south", Open: true, OpenUntil: evening.Add(time.Hour), ClosesAt: evening.Add(time.Hour + time.Second)},
		},
		Sources:     []Source{{ID: "rx-1", Required: true, Deaf: true}, {ID: "catwalk", Unsafe: true}, {ID: "roof-door"}, {ID: "thermal-1", Silent: true, Alarm: true}},
		Telescopes:  []Telescope{{ID: "ridge-1", Silent: true}, {ID: "ridge-2"}, {ID: "ridge-4", Silent: true}},
		Posts:       []Post{{ID: "east-lot", Missing: true}, {ID: "west-lot"}},
		Authorities: []Authority{{ID: "desk", Required: true, Covered: evening.Add(3 * time.Hour), Waiting: "w"}, {ID: "air-desk"}},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got\n%+v\nwant\n%+v", got, want)
	}
	for _, o := range []Observation{Observe(nil, nil, known, foreseen, now), Observe(rules, nil, nil, foreseen, now), Observe(rules, nil, known, nil, now), Observe(rules, []*closures.Decision{nil}, known, foreseen, now)} {
		if !o.Stopped {
			t.Error("a view with nothing in it is not called stopped")
		}
	}
}
