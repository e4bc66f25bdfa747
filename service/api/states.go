package api

import (
	"math"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry/span"
)

// beamState is one beam now.
type beamState struct {
	Beam        closures.BeamID `json:"beam"`
	State       wire.State      `json:"state" doc:"open or shuttered"`
	Seq         uint64          `json:"seq" doc:"number of the decision in the record"`
	DecidedAt   time.Time       `json:"decided_at"`
	Since       time.Time       `json:"since" doc:"of the present state"`
	Opening     bool            `json:"opening" doc:"clear, and shuttered until the opening is on record"`
	Reasons     []wire.Reason   `json:"reasons" doc:"why it is shuttered; complete and ordered"`
	Cautions    []wire.Caution  `json:"cautions"`
	OpenUntil   *time.Time      `json:"open_until" doc:"when it must be shuttered by"`
	ClosesAt    *time.Time      `json:"closes_at" doc:"start of the first closure in sight"`
	OpensAt     *time.Time      `json:"opens_at"`
	Coming      []wire.Reason   `json:"coming" doc:"closures that can be foreseen for the present aim, in order of their start"`
	Inputs      []wire.Input    `json:"inputs"`
	Rearm       []string        `json:"rearm" doc:"causes after which a person must re-arm"`
	Target      string          `json:"target" doc:"what the newest aim calls it; empty: not said"`
	Shutter     string          `json:"shutter" doc:"open, closed, moving or unknown"`
	Emitting    *bool           `json:"emitting" doc:"null: not heard"`
	RulesDigest string          `json:"rules_digest"`
	ListsDigest string          `json:"lists_digest"`
	Simulated   bool            `json:"simulated"`
}

// stateOf makes the document of a beam as it may be shown.
func stateOf(v *View, b *BeamView, fresh bool) beamState {
	s := v.shown(b, fresh)
	d := s.Decision
	k := v.known(d.Beam)
	out := beamState{
		Beam: d.Beam, Seq: d.Seq, DecidedAt: d.At.UTC(), Since: s.Since.UTC(), Opening: s.Opening && fresh,
		Reasons: reasonsOf(d.Reasons), Cautions: []wire.Caution{}, OpenUntil: wire.Instant(d.OpenUntil), ClosesAt: wire.Instant(d.ClosesAt),
		OpensAt: wire.Instant(d.OpensAt), Coming: reasonsOf(d.Coming), Inputs: []wire.Input{}, Rearm: orNone(k.Need.Names()),
		Target: k.Aim.Target, Shutter: shutterWord(k.Shutter.Position), RulesDigest: d.Rules.String(), ListsDigest: d.Lists.String(), Simulated: v.Simulated,
	}
	if d.Open {
		out.State = wire.Open
	}
	for i := range d.Cautions {
		out.Cautions = append(out.Cautions, wire.CautionOf(&d.Cautions[i]))
	}
	for i := range d.Inputs {
		out.Inputs = append(out.Inputs, wire.InputOf(&d.Inputs[i]))
	}
	if !k.LaserHeard.IsZero() {
		out.Emitting = &k.Laser.Emitting
	}
	return out
}

func reasonsOf(found []closures.Finding) []wire.Reason {
	out := make([]wire.Reason, len(found))
	for i := range found {
		out[i] = wire.ReasonOf(&found[i])
	}
	return out
}

func orNone(names []string) []string {
	if names == nil {
		return []string{}
	}
	return names
}

func shutterWord(p closures.ShutterPosition) string {
	switch p {
	case closures.ShutterOpen:
		return "open"
	case closures.ShutterMoving:
		return "moving"
	case closures.ShutterClosed:
		return "closed"
	}
	return "unknown"
}

// viewDoc is everything that a display shows at once.
type viewDoc struct {
	At        time.Time    `json:"at"`
	BootID    string       `json:"boot_id"`
	Seq       uint64       `json:"seq"`
	Fresh     bool         `json:"fresh" doc:"false: the view is too old to be believed, and shown shuttered"`
	Simulated bool         `json:"simulated"`
	Site      string       `json:"site"`
	Beams     []beamState  `json:"beams"`
	Holds     []holdDoc    `json:"holds" doc:"at most 100"`
	HoldTotal int          `json:"hold_total"`
	Lists     []ListHead   `json:"lists" doc:"those in force or waiting, at most 100"`
	ListTotal int          `json:"list_total"`
	Sources   []sourceDoc  `json:"sources"`
	Record    conditionDoc `json:"record"`
	Aircraft  int          `json:"aircraft" doc:"how many are known"`
}

type conditionDoc struct {
	Healthy bool    `json:"healthy"`
	Durable uint64  `json:"durable" doc:"every entry up to here is on disk"`
	BehindS float64 `json:"behind_s"`
}

// The view stays small enough to be sent ten times a second.
const (
	listsInView = 100
	holdsInView = 100
)

func viewOf(v *View, fresh bool) viewDoc {
	out := viewDoc{
		At: v.At.UTC(), BootID: v.BootID, Seq: v.Seq, Fresh: fresh, Simulated: v.Simulated, Site: v.Rules.Site.Name,
		Beams: []beamState{}, Holds: []holdDoc{}, Lists: []ListHead{}, Sources: sourcesOf(v),
		Record: conditionDoc{Healthy: v.Record.healthy(), Durable: v.Record.Durable, BehindS: v.Record.Behind.Seconds()},
	}
	for i := range v.Beams {
		out.Beams = append(out.Beams, stateOf(v, &v.Beams[i], fresh))
	}
	out.HoldTotal = len(v.Holds)
	for i := range v.Holds[:min(len(v.Holds), holdsInView)] {
		out.Holds = append(out.Holds, holdOf(&v.Holds[i], v.At))
	}
	for i := range v.Book {
		e := &v.Book[i]
		if e.Status != closures.ListInForce && e.Status != closures.ListWaiting {
			continue
		}
		if out.ListTotal++; len(out.Lists) < listsInView {
			out.Lists = append(out.Lists, headOf(v, e))
		}
	}
	if v.Known != nil {
		out.Aircraft = len(v.Known.Aircraft)
	}
	return out
}

// spanDoc is a span of time, half open.
type spanDoc struct {
	From  time.Time `json:"from"`
	Until time.Time `json:"until"`
}

func spansOf(set span.Set) []spanDoc {
	out := make([]spanDoc, len(set))
	for i, s := range set {
		out[i] = spanDoc{s.From.UTC(), s.Until.UTC()}
	}
	return out
}

// finite returns a number for JSON, which knows neither NaN nor infinities.
func finite(v float64) *float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return nil
	}
	return &v
}

// ageOf is the larger of the ages since an instant was said and since it was
// heard, in seconds; nil where nothing was.
func ageOf(now, said, heard time.Time) *float64 {
	if heard.IsZero() {
		return nil
	}
	age := max(now.Sub(said), now.Sub(heard), 0).Seconds()
	return &age
}
