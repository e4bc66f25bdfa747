package replay

import (
	"fmt"
	"strings"

	"beamward/closures"
	"beamward/closures/wire"
)

// tellFact tells what became of a fact.
func (x *explainer) tellFact(out *Explanation) {
	f, err := x.theFact()
	if err != nil {
		out.What = "a fact of kind " + x.entry.Kind
	} else {
		out.What = says(&f)
	}
	if !x.reached || x.from == 0 {
		if x.from > 0 || out.Replayed.Note == "" {
			out.Replayed.Note = "its batch was never applied: the core failed on it, or the service ended before"
		}
		return
	}
	for _, r := range x.state.Refused() {
		if r.Seq == x.entry.Seq && r.Err != nil {
			out.Refused = &RefusedTold{Why: r.Err.Message, Mend: r.Err.Mend}
		}
	}
	now, _ := x.state.Durable()
	out.Did = x.did(&now)
	for i := range x.out {
		d := &x.out[i]
		b := BeamTold{Beam: d.Beam, State: stateWord(d.Open), Entry: x.mine[d.Beam].seq}
		for j := range x.before.decisions {
			if old := &x.before.decisions[j]; old.Beam == d.Beam {
				b.Changed = stepChange(old, d)
			}
		}
		out.Beams = append(out.Beams, b)
	}
}

// theFact is the entry itself, decoded.
func (x *explainer) theFact() (closures.Fact, error) {
	for i := range x.facts {
		if x.facts[i].Seq == x.entry.Seq && x.reached && x.from > 0 {
			return x.facts[i], nil
		}
	}
	return wire.DecodeBody(x.entry.Kind, x.entry.Body, x.shelf.resolver())
}

// stepChange tells what differs between two steps' decisions on a beam; nil
// where state, codes, rules and lists are the same.
func stepChange(old, d *closures.Decision) *ChangeTold {
	if old.Open == d.Open && old.Codes == d.Codes && old.Rules == d.Rules && old.Lists == d.Lists {
		return nil
	}
	return &ChangeTold{
		Since: old.Seq, SinceAt: old.At, Was: stateWord(old.Open), Came: (d.Codes &^ old.Codes).Names(), Gone: (old.Codes &^ d.Codes).Names(),
		Rules: d.Rules != old.Rules, Lists: d.Lists != old.Lists,
	}
}

// did lists what the step changed of what outlives a restart, and of the
// rules.
func (x *explainer) did(now *closures.Durable) []string {
	var out []string
	say := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	old := &x.before.durable
	if x.before.rules != x.state.Rules() && x.before.rules != nil {
		say("rules %s are in force instead of %s", x.state.Rules().Digest, x.before.rules.Digest)
	}
	was := map[string]string{}
	for _, l := range old.Lists {
		was[l.List.String()] = l.Status.String()
	}
	for _, l := range now.Lists {
		name := l.List.String()
		before, known := was[name]
		delete(was, name)
		switch {
		case !known:
			say("list %s is %s", name, listWord(l.Status))
		case before != l.Status.String():
			say("list %s is %s; it was %s", name, listWord(l.Status), before)
		}
	}
	for _, l := range old.Lists {
		if _, left := was[l.List.String()]; left {
			say("list %s is over and leaves the book", l.List)
		}
	}
	holds := map[closures.HoldID]bool{}
	for _, h := range old.Holds {
		holds[h.ID] = true
	}
	for _, h := range now.Holds {
		if !holds[h.ID] {
			say("hold %s holds %s", h.ID, beamsOf(h.Beam))
		}
		delete(holds, h.ID)
	}
	for _, h := range old.Holds {
		if holds[h.ID] {
			say("hold %s holds no longer", h.ID)
		}
	}
	need := map[closures.BeamID]closures.Codes{}
	for _, l := range old.Latches {
		need[l.Beam] = l.Need
	}
	for _, l := range now.Latches {
		if came := l.Need &^ need[l.Beam]; came != 0 {
			say("beam %s waits for a person to re-arm it after %s", l.Beam, strings.Join(came.Names(), ", "))
		}
		if gone := need[l.Beam] &^ l.Need; gone != 0 {
			say("beam %s is re-armed after %s", l.Beam, strings.Join(gone.Names(), ", "))
		}
	}
	if n, m := len(old.Sightings), len(now.Sightings); n != m {
		say("the sightings that count are %d instead of %d", m, n)
	}
	return out
}

func listWord(s closures.ListStatus) string {
	switch s {
	case closures.ListInForce:
		return "in force"
	case closures.ListWaiting:
		return "waiting for confirmation: it closes and opens nothing"
	}
	return s.String()
}
