package alerts

import (
	"time"

	"beamward/closures"
)

// Observation is what the service sees of itself at an instant: the published
// view, the sources, lists, clock and record, and what its other parts say. The
// zero value is a service that knows of nothing and has no fault.
//
// Observe fills in what a view tells; the service adds the rest.
type Observation struct {
	Stopped bool // no fresh view: the decision loop stands. What views tell stays as it was
	Working bool // people work with a beam, from ready to the end of the night; so it is too while a beam is open

	// From a view.
	Beams       []Beam
	Sources     []Source
	Telescopes  []Telescope
	Posts       []Post
	Authorities []Authority
	Unlocated   int    // aircraft that give no position, where that is an alarm
	Popups      uint64 // aircraft first reported where they could already touch, since the start

	// From the service's other parts.
	Damaged   bool     // the record's chain does not verify
	DiskKnown bool     // DiskFree is known
	DiskFree  float64  // share of the data directory's disk that is free, 0 to 1
	NotReady  []string // what tonight needs and is not ready
	Receivers []Receiver
}

// Beam is what is seen of one beam.
type Beam struct {
	ID        closures.BeamID
	Open      bool
	Codes     closures.Codes // why it is shuttered
	Needs     closures.Codes // causes that wait for a person
	OpenUntil time.Time      // zero: no end is in sight
	ClosesAt  time.Time
	Why       string // the first reason, for people

	AimUnknown    bool // no fresh aim
	AimsDisagree  bool
	ShutterSilent bool     // its optional feedback has stopped
	Lost          []string // aircraft that were lost and keep it shuttered
	ReaderSilent  bool     // nobody reads its permit, as the permit listener sees it
}

// Source is what is seen of one source.
type Source struct {
	ID       closures.Source
	Required bool
	Silent   bool
	Deaf     bool // heard, and does not prove that it receives
	Unsafe   bool // an interlock that says unsafe
	Alarm    bool // a detector that sees an aircraft

	RefusedKnown     bool
	RefusedPerMinute float64
}

// Telescope is what is seen of one neighbour telescope.
type Telescope struct {
	ID     closures.TelescopeID
	Silent bool
}

// Post is what is seen of one watch post that is required.
type Post struct {
	ID      string
	Missing bool
}

// Authority is what is seen of one authority's lists.
type Authority struct {
	ID       closures.AuthorityID
	Required bool
	Covered  time.Time       // until when its lists in force cover the time without a gap; zero: not now
	Waiting  closures.ListID // a list that waits for confirmation; empty: none

	RefusedAt time.Time // when a list was last refused; zero: never
	GoodAt    time.Time // when one was last accepted
	Due       bool      // its deadline is within an hour and nothing was sent
}

// Receiver is what is seen of one receiver of messages.
type Receiver struct {
	Name         string
	FailingSince time.Time // zero: it does not fail
}
