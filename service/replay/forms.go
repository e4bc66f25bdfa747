package replay

import (
	"encoding/json"
	"errors"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/journal"
)

// The kinds of the engine's own entries, which neither wire nor the journal
// names.
const (
	KindBegun   = "begun"
	KindGranted = "granted"
	KindTallied = "tallied"
	KindEnded   = "ended"
)

// openUntilStep is by how much the end of an opening must move for the engine
// to record the decision anew.
const openUntilStep = 100 * time.Millisecond

// begun is the body of the entry that starts a state anew. What it starts from
// is the entry after it.
type begun struct {
	BootID string `json:"boot_id"`
	At     string `json:"at"`
	Build  string `json:"build"`
	Rules  string `json:"rules"`
	Cause  string `json:"cause"`
}

// granted is the body of the entry that says that an opening was published.
type granted struct {
	Beam    closures.BeamID `json:"beam"`
	Opening uint64          `json:"opening"` // the decision's entry
	Seq     uint64          `json:"seq"`     // of the step that was granted
}

// tallied is the body of the entry that sums all decisions of a minute.
type tallied struct {
	From  uint64 `json:"from"` // the first decision's number
	To    uint64 `json:"to"`
	Count uint64 `json:"count"`
	Sum   string `json:"sum"`
}

// gap is the body of the journal's entry for those that were lost.
type gap struct {
	Count uint64 `json:"count"`
	First uint64 `json:"first"`
	Last  uint64 `json:"last"`
}

// form reads one of the bodies above. What it does not know it refuses: it
// could matter.
func form[T any](e *journal.Entry) (T, error) {
	var b T
	if err := wire.Strict(e.Body, &b); err != nil {
		var none T
		return none, unread(e, err)
	}
	return b, nil
}

// unread says that an entry cannot be understood.
func unread(e *journal.Entry, err error) error {
	return fmt.Errorf("reading entry %d, kind %s: %w", e.Seq, e.Kind, err)
}

func (b *begun) run(e *journal.Entry) (Run, error) {
	r := Run{Seq: e.Seq, BootID: b.BootID, Build: b.Build, Cause: b.Cause}
	var err error
	if r.At, err = wire.ParseTime(b.At); err != nil {
		return Run{}, unread(e, fmt.Errorf("at: %w", err))
	}
	if r.Rules, err = closures.ParseDigest(b.Rules); err != nil {
		return Run{}, unread(e, fmt.Errorf("rules: %w", err))
	}
	if b.BootID == "" {
		return Run{}, unread(e, errors.New("the start has no name"))
	}
	return r, nil
}

// Run is one unbroken life of the state: from the start of the service, or
// from where it had to begin anew, until the next.
type Run struct {
	Seq    uint64          // of the entry that begins it
	BootID string          // the service's start
	At     time.Time       // of the beginning
	Build  string          // what the program said of itself
	Rules  closures.Digest // at the beginning
	Cause  string          // why it began anew; empty at a start
}

// MarshalJSON writes the run with its rules by their name.
func (r Run) MarshalJSON() ([]byte, error) {
	return json.Marshal(struct {
		Seq    uint64 `json:"seq"`
		BootID string `json:"boot_id"`
		At     string `json:"at"`
		Build  string `json:"build"`
		Rules  string `json:"rules_digest"`
		Cause  string `json:"cause,omitempty"`
	}{r.Seq, r.BootID, wire.FormatTime(r.At), r.Build, r.Rules.String(), r.Cause})
}
