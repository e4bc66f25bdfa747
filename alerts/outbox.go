package alerts

import (
	"hash/fnv"
	"slices"
	"time"
)

// Status says where a delivery stands.
type Status uint8

// The statuses. The zero value waits, so that nothing is lost by being unset.
const (
	Waiting Status = iota
	Delivered
	Dead    // given up: for a person to look at
	Expired // of no use any more
)

var statuses = [...]string{"waiting", "delivered", "dead", "expired"}

// String returns the status's word.
func (s Status) String() string {
	if int(s) < len(statuses) {
		return statuses[s]
	}
	return "waiting"
}

// ParseStatus reads what String writes.
func ParseStatus(s string) (Status, bool) {
	i := slices.Index(statuses[:], s)
	return Status(max(i, 0)), i >= 0
}

// Delivery is one message on its way to one receiver.
type Delivery struct {
	ID       string // the message's and the receiver's: unique
	Receiver string
	Message  Message
	Added    time.Time
	Next     time.Time // not before
	Attempts int
	Status   Status
	Why      string // why the last attempt failed; clean
}

// Outbox is where deliveries wait, kept by the service so that they outlive it.
// It is safe for concurrent use.
//
// A message is put in together with the machine's snapshot, before it is sent,
// and settled after: so each arrives at least once, and a receiver knows one
// that comes twice by its ID.
type Outbox interface {
	// Add puts deliveries in, durably. One that is there already stays as it is.
	Add([]Delivery) error
	// Due returns deliveries of a receiver that wait and whose time has come,
	// the oldest first.
	Due(receiver string, at time.Time, limit int) ([]Delivery, error)
	// Settle puts a delivery back as it now stands.
	Settle(Delivery) error
	// Dead returns what was given up, the newest first.
	Dead(limit int) ([]Delivery, error)
}

// Bounds of deliveries.
const (
	FirstRetry  = 5 * time.Second  // after a failure, doubling to
	SlowRetry   = 10 * time.Minute // at most
	GiveUp      = 24 * time.Hour   // after it was added
	MostWaiting = 1000             // for one receiver
)

// Deliveries makes a delivery of each message for each of its receivers.
func Deliveries(messages []Message, at time.Time) []Delivery {
	var out []Delivery
	for i := range messages {
		for _, to := range messages[i].To {
			out = append(out, Delivery{ID: messages[i].ID + "." + to, Receiver: to, Message: messages[i], Added: at, Next: at})
		}
	}
	return out
}

// Stale reports whether the message is of no use any more at an instant.
func (d *Delivery) Stale(at time.Time) bool {
	return !d.Message.Expires.IsZero() && !at.Before(d.Message.Expires)
}

// Sent returns the delivery as delivered.
func (d Delivery) Sent() Delivery {
	d.Attempts, d.Status, d.Why = d.Attempts+1, Delivered, ""
	return d
}

// Failed returns the delivery after an attempt that failed: to be tried again
// later and later, or given up, at once where the receiver refused it for good.
func (d Delivery) Failed(at time.Time, why string, final bool) Delivery {
	d.Attempts, d.Why = d.Attempts+1, clean(why, mostDetail)
	d.Next = at.Add(backoff(d.ID, d.Attempts))
	if final || d.Next.Sub(d.Added) > GiveUp {
		d.Status = Dead
	}
	return d
}

// Again returns a delivery that was given up as one to be tried at once.
func (d Delivery) Again(at time.Time) Delivery {
	d.Attempts, d.Status, d.Added, d.Next = 0, Waiting, at, at
	return d
}

// backoff is how long to wait after so many failures: doubling, each delivery
// up to a quarter later than the last so that they do not come all at once.
func backoff(id string, failures int) time.Duration {
	wait := SlowRetry
	if failures < 8 {
		wait = min(FirstRetry<<max(failures-1, 0), SlowRetry)
	}
	h := fnv.New32a()
	_, _ = h.Write([]byte(id))
	return wait + wait/4*time.Duration(h.Sum32()%256)/256
}

// Overflow returns which of a receiver's waiting deliveries, given the oldest
// first, must go when there are more than MostWaiting: notices and reminders
// first, then what is over, then the oldest.
func Overflow(waiting []Delivery) []Delivery {
	over := len(waiting) - MostWaiting
	if over <= 0 {
		return nil
	}
	rank := func(d *Delivery) int {
		switch d.Message.What {
		case Notice, Reminder:
			return 0
		case CameBack, Acked, SetAside, BackIn, FloodTold:
			return 1
		}
		return 2
	}
	order := slices.Clone(waiting)
	slices.SortStableFunc(order, func(a, b Delivery) int { return rank(&a) - rank(&b) })
	for i := range order[:over] {
		order[i].Status, order[i].Why = Dead, "too many messages wait for the receiver"
	}
	return order[:over]
}
