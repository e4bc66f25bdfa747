package replay

import (
	"encoding/json"
	"math"
	"time"

	"beamward/closures"
)

// Explanation is what one entry of the record was and rested on, or did. As
// JSON it is what the API answers; Words puts it into sentences. Times are
// left out where there are none.
type Explanation struct {
	Seq      uint64          `json:"seq"`
	At       time.Time       `json:"at"`
	Kind     string          `json:"kind"`
	What     string          `json:"what"` // the entry in words
	Body     json.RawMessage `json:"body,omitempty"`
	Run      *Run            `json:"run,omitempty"` // absent: its beginning is not on record
	Step     *StepTold       `json:"step,omitempty"`
	Refused  *RefusedTold    `json:"refused,omitempty"` // a fact that had no effect
	Did      []string        `json:"did,omitempty"`     // what its step changed, for a fact
	Beams    []BeamTold      `json:"beams,omitempty"`
	Replayed ReplayedTold    `json:"replayed"`
}

// StepTold is the step that a decision was made in, or that applied a fact.
type StepTold struct {
	Seq   uint64     `json:"seq"` // of the tick
	At    time.Time  `json:"at"`
	Facts int        `json:"facts"` // without the tick
	First []FactTold `json:"first_facts,omitempty"`
}

// FactTold is one fact in words.
type FactTold struct {
	Seq  uint64 `json:"seq"`
	Kind string `json:"kind"`
	What string `json:"what"`
}

// RefusedTold says why a fact had no effect.
type RefusedTold struct {
	Why  string `json:"why"`
	Mend string `json:"mend,omitempty"`
}

// BeamTold is the decision on one beam and all that it rested on. For a fact
// only the state and what changed are told.
type BeamTold struct {
	Beam      closures.BeamID `json:"beam"`
	State     string          `json:"state"`           // open or shuttered
	Entry     uint64          `json:"entry,omitempty"` // that records the decision; 0: it changed nothing, so it is not on record by itself
	OpenUntil time.Time       `json:"open_until,omitzero"`
	ClosesAt  time.Time       `json:"closes_at,omitzero"`
	OpensAt   time.Time       `json:"opens_at,omitzero"`
	Changed   *ChangeTold     `json:"changed,omitempty"`
	Checks    []CheckTold     `json:"checks,omitempty"` // every one, in the codes' order
	Coming    []FindingTold   `json:"coming,omitempty"`
	Cautions  []CautionTold   `json:"cautions,omitempty"`
	Inputs    []InputTold     `json:"inputs,omitempty"`
	Aim       *AimTold        `json:"aim,omitempty"`
	Lists     []ListTold      `json:"lists,omitempty"` // in force for the beam, or waiting to be
	Holds     []HoldTold      `json:"holds,omitempty"`
	Rules     string          `json:"rules_digest,omitempty"`
	ListsSum  string          `json:"lists_digest,omitempty"`
}

// CheckTold is what one check said.
type CheckTold struct {
	Code     string        `json:"code"`
	Verdict  string        `json:"verdict"`
	Says     string        `json:"says"`
	Margin   *MarginTold   `json:"margin,omitempty"` // the least; absent where the check has none, or it could not be told
	Findings []FindingTold `json:"findings,omitempty"`
}

// MarginTold is a margin, positive when clear.
type MarginTold struct {
	Value float64 `json:"value"`
	Unit  string  `json:"unit"` // rad, m or s
}

// FindingTold is one reason, or one closure to come.
type FindingTold struct {
	Code    string      `json:"code"`
	Source  string      `json:"source,omitempty"`
	Verdict string      `json:"verdict"`
	From    time.Time   `json:"from,omitzero"`
	Until   time.Time   `json:"until,omitzero"`
	Margin  *MarginTold `json:"margin,omitempty"`
	Detail  string      `json:"detail"`
	List    string      `json:"list,omitempty"`
	Region  string      `json:"region,omitempty"`
	Ref     string      `json:"ref,omitempty"`
	RestsOn uint64      `json:"rests_on,omitempty"` // the newest entry of whom it is about
}

// CautionTold is what was left clear by rule.
type CautionTold struct {
	Code   string `json:"code"`
	Source string `json:"source,omitempty"`
	Detail string `json:"detail"`
}

// InputTold is one input and its age.
type InputTold struct {
	Source  string   `json:"source"`
	AgeS    *float64 `json:"age_s"` // null: never heard
	LimitS  float64  `json:"limit_s"`
	RestsOn uint64   `json:"rests_on,omitempty"` // its newest entry
}

// AimTold is where the beam pointed.
type AimTold struct {
	From        string    `json:"from,omitempty"`
	Target      string    `json:"target,omitempty"`
	Motion      string    `json:"motion"`
	Frame       string    `json:"frame"` // as stated
	Said        time.Time `json:"said"`
	Heard       time.Time `json:"heard"`
	RADeg       *float64  `json:"ra_deg"` // ICRS, at the step; null where it cannot be told
	DecDeg      *float64  `json:"dec_deg"`
	AzDeg       *float64  `json:"az_deg"` // airless, at the step
	ElDeg       *float64  `json:"el_deg"`
	ErrorArcsec float64   `json:"error_arcsec"` // a hard bound, without the rules' own
	RestsOn     uint64    `json:"rests_on,omitempty"`
}

// ListTold is one closure list.
type ListTold struct {
	Authority string    `json:"authority"`
	ID        string    `json:"id"`
	Status    string    `json:"status"`
	From      time.Time `json:"covers_from"`
	Until     time.Time `json:"covers_until"`
	Digest    string    `json:"digest"`
	By        string    `json:"by,omitempty"`
	Confirmed string    `json:"confirmed_by,omitempty"`
}

// HoldTold is one hold.
type HoldTold struct {
	ID        string    `json:"id"`
	Beam      string    `json:"beam"`
	Reason    string    `json:"reason"`
	By        string    `json:"by"`
	From      time.Time `json:"from"`
	Until     time.Time `json:"until,omitzero"`
	Authority bool      `json:"authority"`
	Region    bool      `json:"region"` // it holds only part of the sky
}

// ChangeTold is what differs from the decision on record before.
type ChangeTold struct {
	Since     uint64        `json:"since_seq"` // the entry of that decision; 0: there is none
	SinceAt   time.Time     `json:"since,omitzero"`
	Was       string        `json:"was,omitempty"` // open or shuttered
	Came      []string      `json:"came,omitempty"`
	Gone      []string      `json:"gone,omitempty"`
	OpenUntil *UntilChanged `json:"open_until,omitempty"`
	Rules     bool          `json:"rules,omitempty"` // others are in force
	Lists     bool          `json:"lists,omitempty"` // others are in force
}

// UntilChanged is how the end of an opening moved.
type UntilChanged struct {
	From time.Time `json:"from,omitzero"`
	To   time.Time `json:"to,omitzero"`
}

// ReplayedTold says what the explanation was taken from.
type ReplayedTold struct {
	From       uint64 `json:"from_seq"` // the entry from which on the record was replayed; 0: it was not
	Whole      bool   `json:"whole"`    // that begins the run, so that nothing is missing
	Entries    uint64 `json:"entries"`
	OtherBuild bool   `json:"other_build"` // recorded it, which may round otherwise
	Identical  *bool  `json:"identical"`   // the recorded decision is the replay's to the last bit; null: none is on record by itself
	Differs    string `json:"differs,omitempty"`
	Note       string `json:"note,omitempty"`
}

var unitNames = [...]string{closures.Radian: "rad", closures.Metre: "m", closures.Second: "s"}

// margin tells a margin, or nil where there is none that can be told.
func margin(m closures.Margin) *MarginTold {
	if m.Unit == closures.NoUnit || int(m.Unit) >= len(unitNames) || math.IsNaN(m.Value) || math.IsInf(m.Value, 0) {
		return nil
	}
	return &MarginTold{Value: m.Value, Unit: unitNames[m.Unit]}
}

func stateWord(open bool) string {
	if open {
		return "open"
	}
	return "shuttered"
}
