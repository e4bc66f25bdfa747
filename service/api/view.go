package api

import (
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
)

// View is what the decision loop last published. It is never changed, and
// neither is anything that it points to.
type View struct {
	At     time.Time     // of the decisions: UTC
	Boot   time.Duration // of the decisions, by the boot clock
	BootID string
	Seq    uint64 // number of the decisions in the record

	Beams []BeamView // in the rules' order

	Rules    *closures.Rules
	Foreseen *closures.Foreseen
	Book     closures.Book
	Holds    []closures.HoldPlaced
	Nights   []*sky.Night
	Known    *closures.Known // for people to look at; nil: nothing
	Record   Condition

	Started   bool
	Stopped   bool
	Simulated bool
}

// BeamView is one beam as published.
type BeamView struct {
	Decision *closures.Decision
	Opening  bool      // clear, and shuttered until the opening is on record
	Since    time.Time // of the present state
}

// Condition is how the record stands.
type Condition struct {
	Durable uint64        // all entries up to here are on disk
	Behind  time.Duration // how long the oldest that is not has waited
	Half    bool
	Full    bool
	Gap     bool
	Failed  bool
	Damaged bool
}

// BehindLimit is from when on the record counts as not keeping up.
const BehindLimit = time.Second

// healthy reports whether nothing is wrong with the record.
func (c Condition) healthy() bool {
	return !c.Half && !c.Full && !c.Gap && !c.Failed && !c.Damaged && c.Behind <= BehindLimit
}

// Update is one published view and why it was sent.
type Update struct {
	View  *View
	Beams []closures.BeamID // whose published state, codes or end of opening changed
	Kept  bool              // lists, holds, latches or sightings changed
}

// Beam returns one beam's view, or nil.
func (v *View) Beam(id closures.BeamID) *BeamView {
	for i := range v.Beams {
		if v.Beams[i].Decision.Beam == id {
			return &v.Beams[i]
		}
	}
	return nil
}

// known returns what is known of a beam, or the zero value.
func (v *View) known(id closures.BeamID) closures.BeamKnown {
	if v.Known != nil {
		for i := range v.Known.Beams {
			if v.Known.Beams[i].Beam == id {
				return v.Known.Beams[i]
			}
		}
	}
	return closures.BeamKnown{Beam: id}
}

// fresh reports whether the view may be believed: decided at most three
// decision intervals ago by both clocks, by a loop that has not stopped. A
// clock that went back makes it false.
func (v *View) fresh(wall time.Time, boot time.Duration) bool {
	limit := 3 * v.Rules.Permit.DecisionInterval
	byWall, byBoot := wall.Sub(v.At), boot-v.Boot
	return !v.Stopped && byWall >= 0 && byWall <= limit && byBoot >= 0 && byBoot <= limit
}

// shown returns the beam as it may be shown: a view that is too old is
// shuttered, whatever it says.
func (v *View) shown(b *BeamView, fresh bool) BeamView {
	if fresh {
		return *b
	}
	d := *b.Decision
	if d.Open {
		d.OpensAt = time.Time{}
	}
	d.Open, d.OpenUntil = false, time.Time{}
	d.Codes = d.Codes.With(closures.CodeFault)
	d.Reasons = append(d.Reasons[:len(d.Reasons):len(d.Reasons)], closures.Finding{
		Code: closures.CodeFault, Verdict: closures.Unknown, Margin: closures.UnknownMargin(), Detail: "the last decision is too old to be believed",
	})
	return BeamView{Decision: &d, Since: b.Since}
}
