package alerts

import (
	"cmp"
	"slices"
	"time"

	"beamward/closures"
)

// Alarm is one alarm as people see it.
type Alarm struct {
	Key
	Row       Row
	State     State
	Active    bool      // its condition is there, filters counted
	Since     time.Time // of the state
	Raised    time.Time // when it was last raised; zero: never
	Count     int       // how often it was raised
	Detail    string
	Beams     []closures.BeamID
	By        string    // who acknowledged, shelved or removed it
	Reason    string    // why it was shelved or removed
	Until     time.Time // when shelving ends
	Parent    Kind      // what suppresses it; empty with Suppressed: nobody works
	Escalated int       // how often nobody answered in time
}

// alarm is what the machine keeps of one alarm.
type alarm struct {
	key    Key
	row    *Row
	state  State
	raw    bool      // its cause is there
	turned time.Time // when raw last changed
	began  time.Time // when it came, short breaks apart
	active bool      // raw, after its delays
	since  time.Time
	raised time.Time
	count  int
	recent []time.Time // raises within calm
	detail string
	beams  []closures.BeamID
	by     string
	reason string
	until  time.Time
	parent Kind
	hidden time.Time // when it last had to be suppressed
	level  int
	sound  time.Time // when it last sounded
}

// How long the raises of an alarm make it slower to return, and at most how
// slow.
const (
	calm    = 30 * time.Minute
	slowest = 15 * time.Minute
)

// off is how long the cause must be gone. Each raise within calm doubles it, so
// that a cause that comes and goes is one long alarm and not many.
func (a *alarm) off(at time.Time) time.Duration {
	d := a.row.Off
	for i := range a.recent {
		if i > 0 && at.Sub(a.recent[i]) <= calm {
			d = min(2*d, max(slowest, a.row.Off))
		}
	}
	return d
}

// filter settles whether the alarm is active.
func (a *alarm) filter(at time.Time) {
	switch {
	case a.raw && at.Sub(a.began) >= a.row.On:
		a.active = true
	case !a.raw && (a.state.aside() || at.Sub(a.turned) >= a.off(at)):
		a.active = false
	}
}

// turn takes up that the cause came or went. A break of up to half the delay
// does not begin the delay anew: what comes and goes all the time is there.
func (a *alarm) turn(raw bool, at time.Time) {
	if raw && (a.began.IsZero() || at.Sub(a.turned) > a.row.On/2) {
		a.began = at
	}
	a.raw, a.turned = raw, at
}

// idle reports whether nothing of the alarm need be kept.
func (a *alarm) idle(at time.Time) bool {
	return a.state == Normal && !a.raw && !a.active && at.Sub(a.turned) > a.row.On && (len(a.recent) == 0 || at.Sub(a.recent[len(a.recent)-1]) > calm)
}

func (a *alarm) view() Alarm {
	return Alarm{
		Key: a.key, Row: *a.row, State: a.state, Active: a.active, Since: a.since, Raised: a.raised, Count: a.count, Detail: a.detail,
		Beams: slices.Clone(a.beams), By: a.by, Reason: a.reason, Until: a.until, Parent: a.parent, Escalated: a.level,
	}
}

// byRank orders alarms as they are told: by their place in the table, then by
// subject.
func byRank(a, b Key) int {
	return cmp.Or(cmp.Compare(rank(a.Kind), rank(b.Kind)), cmp.Compare(a.Subject, b.Subject))
}

// find returns what is kept of an alarm, or nil.
func (m *Machine) find(k Key) *alarm {
	i, ok := slices.BinarySearchFunc(m.alarms, k, func(a *alarm, k Key) int { return byRank(a.key, k) })
	if !ok {
		return nil
	}
	return m.alarms[i]
}

// keep returns what is kept of an alarm of the table, made where there is
// nothing yet.
func (m *Machine) keep(k Key) *alarm {
	i, ok := slices.BinarySearchFunc(m.alarms, k, func(a *alarm, k Key) int { return byRank(a.key, k) })
	if !ok {
		m.alarms = slices.Insert(m.alarms, i, &alarm{key: k, row: &rows[rank(k.Kind)], since: m.at, turned: m.at})
	}
	return m.alarms[i]
}
