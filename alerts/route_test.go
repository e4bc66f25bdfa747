package alerts

import (
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

func TestRouting(t *testing.T) {
	zone := time.FixedZone("here", 2*3600)
	r := Routing{Zone: zone, Routes: []Route{
		{Receiver: "always", AtLeast: High},
		{Receiver: "by-day", AtLeast: Low, From: 8 * 60, Until: 18 * 60},
		{Receiver: "by-night", AtLeast: Medium, From: 18 * 60, Until: 8 * 60, Changes: true},
		{Receiver: "of-south", AtLeast: Low, Beams: []closures.BeamID{"south"}},
		{Receiver: "told", Notices: true},
		{Receiver: "second", AtLeast: Low, Level: 1, Changes: true},
	}}
	if errs := r.Validate(); len(errs) > 0 {
		t.Fatal(errs)
	}
	at := func(hour, minute int) time.Time { return time.Date(2031, 2, 14, hour, minute, 0, 0, zone) }
	for _, c := range []struct {
		name string
		m    Message
		to   string
	}{
		{"high by day", Message{At: at(12, 0), What: Raised, Priority: High, Beams: []closures.BeamID{"north"}}, "always by-day"},
		{"high by night", Message{At: at(2, 0), What: Raised, Priority: High, Beams: []closures.BeamID{"north", "south"}}, "always by-night of-south"},
		{"low by night about no beam", Message{At: at(2, 0), What: Raised, Priority: Low}, "of-south"},
		{"the first minute of the day", Message{At: at(8, 0), What: Raised, Priority: Low, Beams: []closures.BeamID{"north"}}, "by-day"},
		{"the last minute of the night", Message{At: at(7, 59), What: Raised, Priority: Medium, Beams: []closures.BeamID{"north"}}, "by-night"},
		{"returned", Message{At: at(2, 0), What: CameBack, Priority: High, Beams: []closures.BeamID{"north"}}, "by-night"},
		{"returned after escalation", Message{At: at(2, 0), What: CameBack, Priority: High, Level: 1, Beams: []closures.BeamID{"north"}}, "by-night second"},
		{"escalated", Message{At: at(2, 0), What: Escalated, Priority: High, Level: 1, Beams: []closures.BeamID{"north"}}, "second"},
		{"a notice", Message{At: at(2, 0), What: Notice, Beams: []closures.BeamID{"north"}}, "told"},
		{"a reminder", Message{At: at(2, 0), What: Reminder, Priority: High}, ""},
		{"nothing", Message{At: at(12, 0), Priority: High}, ""},
	} {
		out := Output{Messages: []Message{c.m}}
		r.route(&out, false)
		if got := strings.Join(out.Messages[0].To, " "); got != c.to {
			t.Errorf("%s: %q, want %q", c.name, got, c.to)
		}
	}
	// A high alarm into an hour without anybody is everybody's, but not that of
	// a receiver to itself.
	r = Routing{Routes: []Route{{Receiver: "a", AtLeast: Low, From: 1, Until: 2}, {Receiver: "b", AtLeast: Low, From: 1, Until: 2}}}
	out := Output{Messages: []Message{{At: evening, What: Raised, Priority: High}, {At: evening, What: Raised, Priority: Medium}}}
	r.route(&out, false)
	if !slices.Equal(out.Messages[0].To, []string{"a", "b"}) || len(out.Messages[1].To) != 0 {
		t.Errorf("to %v and %v", out.Messages[0].To, out.Messages[1].To)
	}
	r = everyone()
	r.Routes = append(r.Routes, Route{Receiver: "mail", AtLeast: Low})
	out = Output{Messages: []Message{{At: evening, What: Raised, Priority: Medium, Kind: ReceiverUnreachable, Subject: "mail"}}}
	r.route(&out, false)
	if !slices.Equal(out.Messages[0].To, []string{"desk"}) {
		t.Errorf("an unreachable receiver is told by %v", out.Messages[0].To)
	}
}

func TestRoutingRefusals(t *testing.T) {
	good := Route{Receiver: "desk", AtLeast: Low}
	for name, change := range map[string]func(*Route){
		"no name":        func(r *Route) { r.Receiver = "a b" },
		"no hour":        func(r *Route) { r.From = 1440 },
		"a negative one": func(r *Route) { r.Until = -1 },
		"nothing":        func(r *Route) { r.AtLeast = NoPriority },
		"no priority":    func(r *Route) { r.AtLeast = 9 },
		"a level alone":  func(r *Route) { r.Level = 1 },
		"a high level":   func(r *Route) { r.Level = 6 },
	} {
		o := good
		change(&o)
		if errs := (&Routing{Routes: []Route{o}}).Validate(); len(errs) == 0 {
			t.Errorf("%s: taken", name)
		}
	}
	if errs := (&Routing{}).Validate(); len(errs) > 0 {
		t.Error(errs)
	}
}

func TestClean(t *testing.T) {
	for in, want := range map[string]string{
		"plain":              "plain",
		"two\r\nlines\tand":  "two  lines and",
		"a\u202eb\u2066c":    "abc",
		"a\x00b\x1b[31mc":    "a b [31mc",
		"\xff\xfe":           "\ufffd\ufffd",
		"\u2028x\u2029":      " x ",
		"soft\u00adhyphen":   "softhyphen",
		"0123456789abcdefgh": "0123456789…",
		"\ufeffbom":          "bom",
		"été 中":              "été 中",
		"\U000e0041tag":      "tag",
		"\ue000private":      "private",
	} {
		most := 20
		if strings.HasPrefix(in, "0123") {
			most = 10
		}
		if got := clean(in, most); got != want {
			t.Errorf("%q: %q, want %q", in, got, want)
		}
	}
}
