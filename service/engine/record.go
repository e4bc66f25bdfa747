package engine

import (
	"context"
	"time"

	"beamward/closures"
)

// Record is the journal as the engine sees it. No method but Flush may wait
// for the store.
type Record interface {
	// Append queues entries whose numbers rise. Either all of them are queued
	// or none will be on record, which the error says; the engine then shutters
	// every beam until Condition shows no gap.
	Append(entries []Entry) error
	// Condition tells how the record stands, without any input or output.
	Condition() Condition
	// Notify has a value sent on c, without waiting for room, whenever Durable
	// rises or the record's health changes.
	Notify(c chan<- struct{}) (stop func())
	// Flush returns when everything queued is durable. It is called once, at
	// the end of Run.
	Flush(ctx context.Context) error
}

// Condition is how the record stands. Durable counts an entry that was lost as
// durable once its gap is.
type Condition struct {
	Durable uint64        // all entries up to here are on disk
	Behind  time.Duration // how long the oldest entry that is not has waited
	Half    bool          // the queue is over half full
	Full    bool          // only the reserve is left: intake refuses
	Gap     bool          // entries were lost and their count is not durable yet
	Failed  bool          // the store errs
	Damaged bool          // the chain does not verify
}

// behindLimit is how long an entry may wait for the store before the record
// counts as behind (the core closes beyond it).
const behindLimit = time.Second

// troubled are the parts of a condition whose change is told at once.
func (c Condition) troubled() [6]bool {
	return [...]bool{c.Behind > behindLimit, c.Half, c.Full, c.Gap, c.Failed, c.Damaged}
}

// Entry is one line of the record. Urgent asks for the store at once; it is
// not part of the line.
type Entry struct {
	Seq    uint64
	At     time.Time
	What   What
	Urgent bool
}

// What is the content of an entry. The set is sealed: Begun, Admitted,
// Decided, Granted, Tallied, Kept, Ended.
type What interface{ what() }

// Begun starts a state anew from rules and from the Kept entry that follows
// it: at the start, and after a fault that cost the last one. A batch before
// it that no tick ended was never applied.
type Begun struct {
	Boot  closures.Boot
	Build string // what the program says of its build
	Rules *closures.Rules
	Cause string // fixed text; empty at the start
}

// Admitted is one fact. A closures.Tick ends its batch: its instant is that of
// the step, and its number that of the decisions which followed.
type Admitted struct{ Fact closures.Fact }

// Decided is a decision that changed state, codes or, by more than
// OpenUntilStep, the end of an opening.
type Decided struct{ Decision closures.Decision }

// Granted says that an opening was on record and was published from here on.
type Granted struct {
	Beam    closures.BeamID
	Opening uint64 // the number of its Decided entry
	Seq     uint64 // of the decision that was granted
}

// Tallied sums all decisions of about a minute, changed or not.
type Tallied struct {
	From, To uint64 // numbers of the first and last decision
	Count    uint64
	Sum      closures.Digest // SHA-256 over wire.AppendDecision of each
}

// Kept is all that a restart needs, as of this entry.
type Kept struct{ Durable closures.Durable }

// Ended says that the engine stopped in good order.
type Ended struct{}

func (Begun) what()    {}
func (Admitted) what() {}
func (Decided) what()  {}
func (Granted) what()  {}
func (Tallied) what()  {}
func (Kept) what()     {}
func (Ended) what()    {}

// OpenUntilStep is by how much the end of an opening must move to be recorded
// and told: less is the edge search's own width.
const OpenUntilStep = 100 * time.Millisecond
