package replay

import (
	"fmt"
	"strings"
	"time"

	"beamward/closures"
	"beamward/service/journal"
)

// CloseCall is a decision that came out otherwise by another build, because it
// hung on a margin that is as good as zero, or followed from one that did.
type CloseCall struct {
	Seq      uint64          `json:"seq"` // of the entry that shows it
	At       time.Time       `json:"at"`
	Beam     closures.BeamID `json:"beam"`
	Code     string          `json:"code,omitempty"`   // of the margin; empty: it follows from one before
	Margin   *MarginTold     `json:"margin,omitempty"` // in s where an edge in time moved
	Recorded string          `json:"recorded"`         // the state, and the codes
	Replayed string          `json:"replayed"`
}

// Gap is a run of entries that did not fit the record's queue. What followed
// them is not replayed until the next run began.
type Gap struct {
	First uint64 `json:"first_seq"`
	Last  uint64 `json:"last_seq"`
	Count uint64 `json:"count"`
}

// Report is what a replay found.
type Report struct {
	First       uint64       `json:"first_seq"` // of the entries that were read; 0: none
	Last        uint64       `json:"last_seq"`
	From        time.Time    `json:"from,omitzero"` // their instants
	Until       time.Time    `json:"until,omitzero"`
	Entries     uint64       `json:"entries"`
	Runs        []Run        `json:"runs"` // that were replayed
	Facts       uint64       `json:"facts"`
	Steps       uint64       `json:"steps"`
	Decisions   uint64       `json:"decisions"`       // that were made
	Compared    uint64       `json:"compared"`        // of these, with one on record by itself
	Granted     uint64       `json:"granted"`         // openings that the replay gives as well
	Tallies     uint64       `json:"tallies"`         // sums of all decisions that were compared
	Kept        uint64       `json:"kept"`            // entries of what a restart would rest on that were compared
	Unapplied   uint64       `json:"unapplied_facts"` // of batches that no tick ended
	Skipped     uint64       `json:"skipped_entries"` // outside a run that could be replayed
	GapCount    uint64       `json:"gap_count"`
	LostEntries uint64       `json:"lost_entries"`     // in gaps
	Gaps        []Gap        `json:"gaps,omitempty"`   // the first of them
	OtherBuild  uint64       `json:"other_build_runs"` // that another build recorded
	Rounded     uint64       `json:"rounded"`          // entries of these that differ in their last digits and mean the same
	Close       uint64       `json:"close"`            // decisions of these that hung on a margin as good as zero
	Calls       []CloseCall  `json:"close_calls,omitempty"`
	Different   uint64       `json:"different_runs"` // in which something differs
	Differences []Difference `json:"differences,omitempty"`
	Ended       bool         `json:"ended"` // the newest entry is a run's end in good order
}

// Identical reports whether everything that was compared is what was recorded,
// and something was.
func (r *Report) Identical() bool { return r.Different == 0 && r.Steps > 0 }

func (r *Report) lose(e *journal.Entry) error {
	g, err := form[gap](e)
	if err != nil {
		return err
	}
	r.GapCount++
	r.LostEntries += g.Count
	if len(r.Gaps) < mostGaps {
		r.Gaps = append(r.Gaps, Gap{g.First, g.Last, g.Count})
	}
	return nil
}

// Words puts the report into lines of text for a terminal: what was compared,
// then whatever differs. The form is for people and may change.
func (r *Report) Words() string {
	var b strings.Builder
	say := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	switch {
	case r.Entries == 0:
		say("nothing is on record there")
	case r.Steps == 0:
		say("entries %d to %d: no run in them can be replayed", r.First, r.Last)
	case r.Different > 0:
		say("entries %d to %d: the replay differs in %d of %s", r.First, r.Last, r.Different, count(len(r.Runs), "run"))
	default:
		say("entries %d to %d: the replay is identical", r.First, r.Last)
	}
	if r.Steps > 0 {
		say("%s to %s: %s, %d steps, %d decisions made", stamp(r.From), stamp(r.Until), count(len(r.Runs), "run"), r.Steps, r.Decisions)
		say("compared: %d recorded decisions, %d grants, %d tallies of all decisions, %d states that a restart would rest on", r.Compared, r.Granted, r.Tallies, r.Kept)
	}
	if r.Unapplied > 0 {
		say("never applied: %d facts of batches that no tick ended", r.Unapplied)
	}
	if r.GapCount > 0 {
		say("lost: %d entries did not fit the queue, in %d gaps; what followed each was not replayed until the next run", r.LostEntries, r.GapCount)
	}
	if r.Skipped > 0 {
		say("left out: %d entries of no run that could be replayed", r.Skipped)
	}
	if r.OtherBuild > 0 {
		say("another build recorded %d runs: states and codes are compared; %d entries differ in their last digits, %d decisions hung on a margin as good as zero", r.OtherBuild, r.Rounded, r.Close)
	}
	for i := range r.Calls {
		c := &r.Calls[i]
		say("close: entry %d at %s, beam %s: recorded %s, replayed %s%s%s", c.Seq, stamp(c.At), c.Beam, c.Recorded, c.Replayed, after(" (", c.Code, ")"), inWords(c.Margin))
	}
	for i := range r.Differences {
		say("different: %s", r.Differences[i].String())
	}
	return b.String()
}
