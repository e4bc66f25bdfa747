package clock

import (
	"context"
	"time"
)

// Reading is one instant by both clocks.
type Reading struct {
	Wall  time.Time     // UTC, without a monotonic part: start wall time plus boot-time progress, slewed at most by SlewRate
	Boot  time.Duration // CLOCK_BOOTTIME: since the machine booted, counting suspend
	State State         // assessed at most AssessEvery before Boot
}

// State is what the clock knows about its own trustworthiness. The zero State
// vouches for nothing.
type State struct {
	Assessed time.Duration // boot time at which this was found out

	// Step is the kernel's wall clock less this clock, signed, once it has
	// passed the step limit: the largest in magnitude since the last Reanchor,
	// zero while the limit was never passed.
	Step time.Duration
	// Offset is the same difference now, of any size.
	Offset time.Duration
	// Suspended is how long the machine was suspended since the start or the
	// last Reanchor: the growth of boot time over monotonic time.
	Suspended time.Duration

	Known        bool          // the kernel told about its discipline (adjtimex)
	Synchronised bool          // Known, and the kernel calls itself synchronised (STA_UNSYNC is not set)
	MaxError     time.Duration // the kernel's bound on its error; meaningless unless Known
	Leap         bool          // the kernel will step by a leap second at the end of this UTC day

	// Fault is set when time itself could not be read; the reading is then the
	// last good one. Note says why the discipline is not known. Both are fixed
	// text for operators.
	Fault string
	Note  string
}

// Clock tells the time and wakes its callers. Implementations are safe for
// concurrent use. Timers run on monotonic time, which stands still in a
// suspend: whoever must know how late a timer fired asks Boot.
type Clock interface {
	// Now gives both clocks and the newest assessment.
	Now() Reading
	// Wall and Boot are the parts of Now; Read is both together.
	Wall() time.Time
	Boot() time.Duration
	Read() (wall time.Time, boot time.Duration)
	// State assesses the clock anew.
	State() State
	// Reanchor takes the kernel's wall time as this clock's and forgets the
	// step and the suspend reported so far. It is the acknowledgement of a
	// report; the wall time may jump, either way.
	Reanchor() Reading

	// Tick sends on the channel every d until stop is called. The channel holds
	// one; ticks that find it full are dropped. It panics unless d > 0.
	Tick(d time.Duration) (c <-chan struct{}, stop func())
	// Timer sends once on the channel after d, unless stopped before. Stop
	// says whether it came in time.
	Timer(d time.Duration) (c <-chan struct{}, stop func() bool)
	// AfterFunc calls f after d on a goroutine of the clock, unless stopped
	// before. f must not block.
	AfterFunc(d time.Duration, f func()) (stop func() bool)
}

// Sleep waits for d by the clock c, or until ctx ends, whose error it then
// returns.
func Sleep(ctx context.Context, c Clock, d time.Duration) error {
	if d <= 0 {
		return ctx.Err()
	}
	fired, stop := c.Timer(d)
	defer stop()
	select {
	case <-fired:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}
