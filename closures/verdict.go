package closures

import (
	"math"
	"time"

	"beamward/geometry/encounter"
	"beamward/geometry/span"
)

// Verdict is what a check says. The zero value is the safe one.
type Verdict uint8

// The verdicts.
const (
	Unknown Verdict = iota
	Violated
	Clear
)

// String returns the verdict's word.
func (v Verdict) String() string {
	switch v {
	case Violated:
		return "violated"
	case Clear:
		return "clear"
	}
	return "unknown"
}

// Unit is the unit of a margin.
type Unit uint8

// The units of margins.
const (
	NoUnit Unit = iota
	Radian
	Metre
	Second
)

// Margin says by how much a check was clear: positive when clear, zero or
// negative when violated, NaN when unknown.
type Margin struct {
	Value float64
	Unit  Unit
}

// UnknownMargin is the margin of what could not be told.
func UnknownMargin() Margin { return Margin{Value: math.NaN()} }

// Finding is one reason, or one closure to come: what, where from, and over
// which span of time, already widened outward by the authority's lead and tail.
type Finding struct {
	Code    Code
	Source  Source
	Verdict Verdict
	Over    span.Span
	Margin  Margin
	Detail  string // fixed text only, never input
	List    ListID // of a listed closure; input: only ever shown as text
	Region  string // of a listed closure; likewise
	Ref     string // the authority's or a person's own reference; likewise
}

// Answer is what one check said. Unset it is Unknown, which shutters as a
// fault.
type Answer struct {
	Verdict  Verdict
	Least    Margin
	First, N int // its findings in Sheet.Found
}

// Sheet is the caller's scratch for one decision or one look, used again.
type Sheet struct {
	Answers  [NumCodes]Answer
	Found    []Finding
	Cautions []Caution

	coming  []Finding // of the foreseeable checks, not yet
	hits    []int32
	scratch [6]span.Set
	volumes []encounter.Volume

	passages []passage
}

// Reset empties the sheet and keeps its memory.
func (s *Sheet) Reset() {
	s.Answers = [NumCodes]Answer{}
	s.Found = s.Found[:0]
	s.Cautions = s.Cautions[:0]
}

// begin starts the answer of a check as clear and returns where its findings
// start. Only a check that ran to its end calls finish, so that one that did
// not stays Unknown.
func (s *Sheet) begin() int { return len(s.Found) }

// finish gives the check's answer: clear when it found nothing, otherwise the
// worst of what it found.
func (s *Sheet) finish(c Code, first int, least Margin) {
	a := Answer{Verdict: Clear, Least: least, First: first, N: len(s.Found) - first}
	for i := first; i < len(s.Found); i++ {
		if v := s.Found[i].Verdict; v != Clear && (a.Verdict == Clear || v < a.Verdict) {
			a.Verdict = v
		}
	}
	s.Answers[c] = a
}

func (s *Sheet) add(f Finding) { s.Found = append(s.Found, f) }

// Caution is something the decision leaves clear by rule, said on record and
// in the permit.
type Caution struct {
	Code   Code
	Source Source
	Detail string // fixed text only
}

// Fold returns true only when every verdict is Clear. It is the whole of the
// rule that opens a beam.
func Fold(v *[NumCodes]Verdict) bool {
	for _, one := range v {
		if one != Clear {
			return false
		}
	}
	return true
}

// Decision says whether one beam may be on the sky at one instant, with every
// reason why not. The zero Decision is shuttered.
type Decision struct {
	Seq       uint64
	Beam      BeamID
	At        time.Time
	Open      bool
	OpenUntil time.Time // when it must be shuttered by: the first foreseeable closure less the margin time; zero while none is in sight
	ClosesAt  time.Time // when that closure starts for the authority; zero while none is in sight
	OpensAt   time.Time // while shuttered: when the last present foreseeable closure ends, if all present ones have an end; else zero
	Reasons   []Finding // ordered by code, source, from
	Coming    []Finding // foreseeable closures to come within Foresight, in order of their start
	Cautions  []Caution
	Inputs    []Input
	Codes     Codes // of Reasons
	Rules     Digest
	Lists     Digest
}

// Input is one thing that the decision rests on and its age.
type Input struct {
	Source Source
	Age    time.Duration // the larger of since said and since heard; negative when never heard
	Limit  time.Duration
}
