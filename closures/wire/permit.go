package wire

import (
	"errors"
	"math"
	"time"

	"beamward/closures"
)

// State is what a permit says of its beam. The zero value is shuttered.
type State uint8

// The states.
const (
	Shuttered State = iota
	Open
)

// String returns the state's word.
func (s State) String() string {
	if s == Open {
		return "open"
	}
	return "shuttered"
}

// MarshalText writes the state's word.
func (s State) MarshalText() ([]byte, error) { return []byte(s.String()), nil }

// UnmarshalText reads the state's word.
func (s *State) UnmarshalText(b []byte) error {
	switch string(b) {
	case "open":
		*s = Open
	case "shuttered":
		*s = Shuttered
	default:
		return errors.New("want open or shuttered")
	}
	return nil
}

// Permit is a decision as a short lease. Its fields are the outside interface:
// times in UTC, no bare units. Only what VerifyPermit returns is to be acted on,
// and that only while Allows says so.
type Permit struct {
	Beam        closures.BeamID `json:"beam"`
	State       State           `json:"state"`
	Seq         uint64          `json:"seq"` // the decision's entry in the record
	BootID      string          `json:"boot_id"`
	IssuedAt    time.Time       `json:"issued_at"`
	ValidUntil  time.Time       `json:"valid_until"`
	LeaseMS     int64           `json:"lease_ms"` // from the sending of the request, for readers without UTC
	Reasons     []Reason        `json:"reasons"`
	Cautions    []Caution       `json:"cautions"`
	ClosesAt    *time.Time      `json:"closes_at"` // nil: no closure in sight
	OpensAt     *time.Time      `json:"opens_at"`  // nil: not known
	Inputs      []Input         `json:"inputs"`
	RulesDigest string          `json:"rules_digest"`
	ListsDigest string          `json:"lists_digest"`
	Simulated   bool            `json:"simulated"`
	Nonce       string          `json:"nonce"`
	Signed      string          `json:"signed"` // a JWS over all the others
}

// Reason is why a beam is shuttered.
type Reason struct {
	Code   string     `json:"code"`
	Source string     `json:"source"`
	From   *time.Time `json:"from"`
	Until  *time.Time `json:"until"`  // nil: no end in sight
	Margin *Margin    `json:"margin"` // nil: not known, or none
	Detail string     `json:"detail"`
	Ref    string     `json:"ref"` // the authority's own reference
}

// Margin is by how much, in deg, m or s: at most 0 when violated.
type Margin struct {
	Value float64 `json:"value"`
	Unit  string  `json:"unit"`
}

// Caution is what was left clear by rule.
type Caution struct {
	Code   string `json:"code"`
	Source string `json:"source"`
	Detail string `json:"detail"`
}

// Input is one thing that the decision rests on.
type Input struct {
	Source string   `json:"source"`
	AgeS   *float64 `json:"age_s"` // nil: never heard
	LimitS float64  `json:"limit_s"`
}

// ReasonOf turns a finding into what leaves the service.
func ReasonOf(f *closures.Finding) Reason {
	return Reason{
		Code: f.Code.String(), Source: string(f.Source), From: Instant(f.Over.From), Until: Instant(f.Over.Until),
		Margin: marginOf(f.Margin), Detail: f.Detail, Ref: f.Ref,
	}
}

// Instant returns an optional time of a permit: nil for what ParseTime would
// refuse, such as the zero instant and one without end.
func Instant(t time.Time) *time.Time {
	t = t.UTC()
	if y := t.Year(); y < FirstYear || y > LastYear {
		return nil
	}
	return &t
}

func marginOf(m closures.Margin) *Margin {
	if math.IsNaN(m.Value) || math.IsInf(m.Value, 0) {
		return nil
	}
	switch m.Unit {
	case closures.Radian:
		return &Margin{m.Value * 180 / math.Pi, "deg"}
	case closures.Metre:
		return &Margin{m.Value, "m"}
	case closures.Second:
		return &Margin{m.Value, "s"}
	}
	return nil
}

// CautionOf turns a caution into what leaves the service.
func CautionOf(c *closures.Caution) Caution {
	return Caution{Code: c.Code.String(), Source: string(c.Source), Detail: c.Detail}
}

// InputOf turns an input into what leaves the service.
func InputOf(in *closures.Input) Input {
	out := Input{Source: string(in.Source), LimitS: in.Limit.Seconds()}
	if in.Age >= 0 {
		age := in.Age.Seconds()
		out.AgeS = &age
	}
	return out
}

// Lease returns LeaseMS as a duration.
func (p *Permit) Lease() time.Duration { return time.Duration(p.LeaseMS) * time.Millisecond }

// Allows reports whether the permit lets the beam be on the sky at an instant
// of the reader's clock: open, not simulated, not yet run out, and issued no
// further ahead than a lease, since a clock so far behind would keep dead
// permits alive. It does not check the signature or the nonce.
func (p *Permit) Allows(now time.Time) bool {
	return p.State == Open && !p.Simulated && now.Before(p.ValidUntil) && !now.Before(p.IssuedAt.Add(-p.Lease()))
}
