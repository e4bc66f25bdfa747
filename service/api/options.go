package api

import (
	"context"
	"errors"
	"net/http"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/access"
)

// Engine is the decision loop as the API sees it.
type Engine interface {
	// View returns what was last published; never nil, never changed.
	View() *View
	// Offer takes a fact in without waiting; superseded says that it took the
	// place of one that waited. The error is a *closures.Error.
	Offer(from closures.Source, body closures.Body) (superseded bool, err error)
	// SubmitDurable returns when the fact is applied, published and on record.
	// The error is the core's refusal, a *closures.Error, or that of ctx, after
	// which the fact may be in force.
	SubmitDurable(ctx context.Context, from closures.Source, body closures.Body) error
	// Watch returns a function that waits for the next update; more is false
	// when ctx ended, the watcher was cut off for leaving buffer updates
	// unread, or the engine ended. The first update is the whole view.
	Watch(buffer int) (next func(ctx context.Context) (u Update, more bool), cancel func())
}

// Clock reads the service's two clocks.
type Clock interface {
	Read() (wall time.Time, boot time.Duration)
}

// Permits issues signed permits.
type Permits interface {
	// Permit returns a permit as JSON. The beam is configured and the nonce
	// valid; the error is a *closures.Error.
	Permit(beam closures.BeamID, nonce string) ([]byte, error)
	// Key returns the public key as a JSON Web Key.
	Key() []byte
}

// Record reads what is durable.
type Record interface {
	// Read returns up to q.Limit entries that match, in order of their numbers.
	Read(ctx context.Context, q RecordQuery) ([]RecordEntry, error)
}

// RecordQuery says which entries to read.
type RecordQuery struct {
	After, Before uint64    // numbers, not included; Before 0: to the end
	Since, Until  time.Time // [Since, Until); zero: without bound
	Kinds         []string  // none: every kind
	NewestFirst   bool
	Limit         int
}

// RecordEntry is one entry of the record. Body is JSON.
type RecordEntry struct {
	Seq  uint64
	At   time.Time
	Kind string
	Body []byte
}

// Options are what an API is made from. Engine, Clock and Guard are needed.
type Options struct {
	Engine  Engine
	Clock   Clock
	Guard   *access.Guard
	Permits Permits // nil: the permit routes answer 503
	Record  Record  // nil: the record's route answers 503

	// Layouts read lists that are not in a native format, by name.
	Layouts map[string]*listfile.Layout

	// Nights prepares the sky over a span, for plans; nil: plan.Nights.
	Nights  func(r *closures.Rules, over span.Span) ([]*sky.Night, error)
	Metrics http.Handler // nil: there is no /metrics
	Version string       // of the program, for /openapi.json and /healthz
	Limits  Limits       // zero fields: DefaultLimits

	// Report is told of what went wrong inside, whose text no client sees. It
	// must not block.
	Report func(error)
}

// Limits bounds what clients may take. DefaultLimits are the service's; tests
// make them small.
type Limits struct {
	Body     int64         // bytes of a JSON body
	List     int64         // bytes of a closure list
	Facts    int64         // bytes of a body of facts
	Targets  int64         // bytes of a table of targets
	BodyTime time.Duration // for a JSON body to arrive
	LongTime time.Duration // for lists, facts and tables to arrive
	Durable  time.Duration // to wait for the record
	Answer   time.Duration // for an answer to be taken, but for streams
	Stall    time.Duration // for one write of a stream or a long answer to be taken

	Requests  Rate // of one client, all but the next three
	Writes    Rate // what acts, and plans
	Feeds     Rate // bodies of facts
	Holds     Rate // placing holds
	Streams   int  // at a time
	Mine      int  // streams of one client at a time
	Heavy     int  // lists read and plans made at a time
	HeavyWait time.Duration

	Ring      int           // changes kept for streams that resume
	Heartbeat time.Duration // of a stream with nothing to tell
	Remember  time.Duration // answers kept for an Idempotency-Key
}

// Rate is a budget of requests: Burst at once, and PerSecond in the long run.
type Rate struct {
	PerSecond float64
	Burst     int
}

// DefaultLimits returns the limits of the service.
func DefaultLimits() Limits {
	return Limits{
		Body: 64 << 10, List: 256 << 20, Facts: 64 << 20, Targets: 64 << 20,
		BodyTime: 10 * time.Second, LongTime: 60 * time.Second, Durable: 10 * time.Second, Answer: 30 * time.Second, Stall: 5 * time.Second,
		Requests: Rate{100, 200}, Writes: Rate{10, 50}, Feeds: Rate{1000, 2000}, Holds: Rate{10, 50},
		Streams: 64, Mine: 8, Heavy: 2, HeavyWait: 5 * time.Second,
		Ring: 10_000, Heartbeat: 10 * time.Second, Remember: 24 * time.Hour,
	}
}

func orElse[T comparable](v *T, def T) {
	var zero T
	if *v == zero {
		*v = def
	}
}

// filled returns the limits with defaults for what is zero: no limit is ever
// left out.
func (l Limits) filled() Limits {
	d := DefaultLimits()
	orElse(&l.Body, d.Body)
	orElse(&l.List, d.List)
	orElse(&l.Facts, d.Facts)
	orElse(&l.Targets, d.Targets)
	orElse(&l.BodyTime, d.BodyTime)
	orElse(&l.LongTime, d.LongTime)
	orElse(&l.Durable, d.Durable)
	orElse(&l.Answer, d.Answer)
	orElse(&l.Stall, d.Stall)
	orElse(&l.Requests, d.Requests)
	orElse(&l.Writes, d.Writes)
	orElse(&l.Feeds, d.Feeds)
	orElse(&l.Holds, d.Holds)
	orElse(&l.Streams, d.Streams)
	orElse(&l.Mine, d.Mine)
	orElse(&l.Heavy, d.Heavy)
	orElse(&l.HeavyWait, d.HeavyWait)
	orElse(&l.Ring, d.Ring)
	orElse(&l.Heartbeat, d.Heartbeat)
	orElse(&l.Remember, d.Remember)
	return l
}

func (o *Options) check() error {
	switch {
	case o.Engine == nil:
		return errors.New("making the api: no engine is given")
	case o.Clock == nil:
		return errors.New("making the api: no clock is given")
	case o.Guard == nil:
		return errors.New("making the api: no guard is given")
	}
	return nil
}
