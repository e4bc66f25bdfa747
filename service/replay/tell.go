package replay

import (
	"bytes"
	"cmp"
	"slices"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/sky"
)

// mostTold bounds the facts of a step that are told one by one.
const mostTold = 20

// tell writes down what the play found out.
func (x *explainer) tell(out *Explanation, beam closures.BeamID) {
	if x.begin > 0 {
		out.Run = &x.life
	}
	out.Replayed = ReplayedTold{From: x.from, Whole: x.whole && x.from > 0, Entries: x.read, Note: x.note, OtherBuild: x.begin > 0 && x.life.Build != x.build}
	if x.from > 0 && !x.whole {
		out.Replayed.Note = cmp.Or(x.note, "the run began long before") +
			": what the latch, the shutter's watch and the start remember from before is told from the record alone"
	}
	x.tellStep(out)
	if x.target == 0 {
		x.tellFact(out)
		return
	}
	for _, id := range x.beams(beam) {
		out.Beams = append(out.Beams, x.tellBeam(out, id))
	}
}

// beams are whom the entry is about, in the rules' order.
func (x *explainer) beams(one closures.BeamID) []closures.BeamID {
	if one != "" {
		return []closures.BeamID{one}
	}
	var ids []closures.BeamID
	if x.from > 0 {
		for i := range x.out {
			ids = append(ids, x.out[i].Beam)
		}
		return ids
	}
	for id := range x.mine {
		ids = append(ids, id)
	}
	slices.Sort(ids)
	return ids
}

func (x *explainer) tellStep(out *Explanation) {
	if x.from == 0 || !x.reached {
		return
	}
	s := &StepTold{Seq: x.step.Seq, At: x.step.At, Facts: len(x.facts) - 1}
	for i := range x.facts[:min(len(x.facts)-1, mostTold)] {
		f := &x.facts[i]
		s.First = append(s.First, FactTold{Seq: f.Seq, Kind: kindOf(f), What: says(f)})
	}
	out.Step = s
}

func kindOf(f *closures.Fact) string {
	kind, _, err := wire.EncodeBody(nil, *f)
	if err != nil {
		return ""
	}
	return kind
}

// tellBeam tells one beam's decision. What is on record is the truth; the
// replay adds what the record does not hold.
func (x *explainer) tellBeam(out *Explanation, id closures.BeamID) BeamTold {
	own, any := x.mine[id]
	mine := x.decisionReplayed(id)
	d := mine
	if any {
		d = &own.d
		if mine != nil {
			x.compare(out, &own, mine)
		}
	} else if old, met := x.recorded[id]; met && !x.whole && (mine == nil || mine.Codes != old.d.Codes || mine.Open != old.d.Open) {
		// What did not change is what was recorded last.
		d = &old.d
	}
	if d == nil {
		return BeamTold{Beam: id, State: stateWord(false)}
	}
	b := BeamTold{
		Beam: id, State: stateWord(d.Open), Entry: own.seq, OpenUntil: d.OpenUntil, ClosesAt: d.ClosesAt, OpensAt: d.OpensAt,
		Rules: d.Rules.String(), ListsSum: d.Lists.String(), Changed: x.changed(id, d),
	}
	for i := range d.Coming {
		b.Coming = append(b.Coming, x.finding(&d.Coming[i], id))
	}
	for _, c := range d.Cautions {
		b.Cautions = append(b.Cautions, CautionTold{c.Code.String(), string(c.Source), c.Detail})
	}
	for _, in := range d.Inputs {
		t := InputTold{Source: string(in.Source), LimitS: in.Limit.Seconds(), RestsOn: x.newest.input(in.Source, id)}
		if in.Age >= 0 {
			s := in.Age.Seconds()
			t.AgeS = &s
		}
		b.Inputs = append(b.Inputs, t)
	}
	b.Checks = x.checks(d, mine, id)
	if mine != nil {
		x.tellKnown(&b, d)
	}
	return b
}

func (x *explainer) decisionReplayed(id closures.BeamID) *closures.Decision {
	if x.from == 0 || !x.reached {
		return nil
	}
	return x.decision(id)
}

// compare holds the recorded decision against the replay's.
func (x *explainer) compare(out *Explanation, own *onRecord, mine *closures.Decision) {
	b, err := wire.EncodeDecision(nil, mine)
	same := err == nil && bytes.Equal(b, own.body)
	out.Replayed.Identical = &same
	if same {
		return
	}
	field, was, is := apart(own.body, b)
	d := Difference{Field: field, Recorded: was, Replayed: is}
	out.Replayed.Differs = d.Field + ": recorded " + d.Recorded + ", replayed " + d.Replayed
}

// changed tells what differs from the decision that was on record before.
func (x *explainer) changed(id closures.BeamID, d *closures.Decision) *ChangeTold {
	old, any := x.recorded[id]
	if !any {
		return &ChangeTold{Came: d.Codes.Names()}
	}
	c := &ChangeTold{
		Since: old.seq, SinceAt: old.d.At, Was: stateWord(old.d.Open), Came: (d.Codes &^ old.d.Codes).Names(), Gone: (old.d.Codes &^ d.Codes).Names(),
		Rules: d.Rules != old.d.Rules, Lists: d.Lists != old.d.Lists,
	}
	if d.Open && old.d.Open && !d.OpenUntil.Equal(old.d.OpenUntil) {
		c.OpenUntil = &UntilChanged{old.d.OpenUntil, d.OpenUntil}
	}
	return c
}

func (x *explainer) finding(f *closures.Finding, beam closures.BeamID) FindingTold {
	return FindingTold{
		Code: f.Code.String(), Source: string(f.Source), Verdict: f.Verdict.String(), From: f.Over.From, Until: f.Over.Until, Margin: margin(f.Margin),
		Detail: f.Detail, List: string(f.List), Region: f.Region, Ref: f.Ref, RestsOn: x.newest.of(f, beam),
	}
}

// tellKnown adds what the replayed state knows: the aim, lists and holds.
func (x *explainer) tellKnown(b *BeamTold, d *closures.Decision) {
	known := x.state.Known(d.At)
	for i := range known.Beams {
		if k := &known.Beams[i]; k.Beam == b.Beam && k.AimUsed != nil {
			b.Aim = x.aim(k, d)
		}
	}
	for _, e := range x.state.Book() {
		if (e.Status == closures.ListWaiting || e.Status == closures.ListInForce) && e.List.For(b.Beam) {
			c := e.List.Covers()
			b.Lists = append(b.Lists, ListTold{
				Authority: string(e.List.Authority()), ID: string(e.List.ID()), Status: e.Status.String(), From: c.From, Until: c.Until,
				Digest: e.List.Digest().String(), By: e.By, Confirmed: e.Confirmed,
			})
		}
	}
	for _, h := range x.state.Holds() {
		if h.Beam != closures.EveryBeam && h.Beam != b.Beam {
			continue
		}
		t := HoldTold{ID: string(h.ID), Beam: string(h.Beam), Reason: h.Reason, By: h.By, From: h.Span().From, Authority: h.Authority, Region: h.Region != nil, Until: h.Until}
		b.Holds = append(b.Holds, t)
	}
}

var (
	frameNames  = [...]string{"none", "icrs", "of_date", "horizon", "table"}
	motionNames = [...]string{"not said", "tracking", "slewing", "parked", "fixed"}
)

func nameOf[T ~uint8](names []string, v T) string {
	if int(v) < len(names) {
		return names[v]
	}
	return "unknown"
}

func (x *explainer) aim(k *closures.BeamKnown, d *closures.Decision) *AimTold {
	a := &AimTold{
		From: k.Aim.From, Target: k.Aim.Target, Motion: nameOf(motionNames[:], k.AimUsed.Motion), Said: k.Aim.Said, Heard: k.AimHeard,
		ErrorArcsec: float64(k.AimUsed.Error / geometry.Arcsecond), RestsOn: x.newest[subject{"aim", string(k.Beam), ""}],
	}
	if k.Aim.Aim != nil {
		a.Frame = nameOf(frameNames[:], k.Aim.Aim.Frame)
	}
	var night *sky.Night
	for _, n := range x.state.Nights() {
		if closures.BinOf(n).Contains(d.At) {
			night = n
		}
	}
	put := func(v r3.Vector, ok bool, first, second **float64, split func(r3.Vector) (float64, float64)) {
		if ok {
			p, q := split(v)
			*first, *second = &p, &q
		}
	}
	icrs, _, ok := k.AimUsed.InSky(night, d.At)
	put(icrs, ok, &a.RADeg, &a.DecDeg, func(v r3.Vector) (float64, float64) {
		ra, dec := geometry.ToEquator(v)
		return ra.Degrees(), dec.Degrees()
	})
	local, _, ok := k.AimUsed.At(night, d.At)
	put(local, ok, &a.AzDeg, &a.ElDeg, func(v r3.Vector) (float64, float64) {
		az, el := geometry.ToHorizon(v)
		return az.Degrees(), el.Degrees()
	})
	return a
}
