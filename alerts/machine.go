package alerts

import (
	"slices"
	"time"
)

// Machine holds the alarms of one service. It has one owner.
type Machine struct {
	routing Routing
	at      time.Time
	seq     uint64 // of messages
	alarms  []*alarm
	working bool
	wasOpen bool // a beam was open at the last step
	fresh   bool // restored, and no step yet
	popups  popups
	flood   flood
	notices []noticed
}

type popups struct {
	known bool
	count uint64
	times []time.Time
}

// New returns a machine without alarms.
func New(r Routing) *Machine { return &Machine{routing: r} }

// SetRouting puts another routing in force from the next message on.
func (m *Machine) SetRouting(r Routing) { m.routing = r }

// Change is one transition of one alarm.
type Change struct {
	Alarm Alarm // after it
	From  State
	Event Event
	By    string // a person's name; empty for the service
	At    time.Time
}

// Output is what came of a step or a command.
type Output struct {
	Changes  []Change
	Messages []Message // with the receivers of each; some have none
	Sound    []Key     // alarms that sound now: raised, and every 30 s while nobody acknowledges
}

// resound is how often an alarm sounds that nobody acknowledges.
const resound = 30 * time.Second

// Step takes in an observation at an instant.
func (m *Machine) Step(at time.Time, o *Observation) Output {
	m.advance(at)
	var out Output
	open := false
	for i := range o.Beams {
		open = open || o.Beams[i].Open
	}
	if !o.Stopped {
		m.working = o.Working || open
	}
	m.follow(o)
	for _, a := range m.alarms {
		a.filter(m.at)
	}
	for _, a := range m.alarms {
		m.settle(a, &out)
	}
	if !o.Stopped {
		m.wasOpen = open
	}
	m.remind(&out)
	m.flooded(&out)
	m.notice(o, &out)
	m.alarms = slices.DeleteFunc(m.alarms, func(a *alarm) bool { return a.idle(m.at) })
	m.routing.route(&out, m.flood.on)
	return out
}

// follow takes up which causes are there. What only views tell stays while
// there are none.
func (m *Machine) follow(o *Observation) {
	found := m.causes(o)
	slices.SortStableFunc(found, func(a, b condition) int { return byRank(a.key, b.key) })
	next := 0
	for i, c := range found {
		if i > 0 && found[i-1].key == c.key {
			continue
		}
		a := m.keep(c.key)
		if !a.raw {
			a.turn(true, m.at)
		}
		a.detail, a.beams = c.detail, c.beams
	}
	for _, a := range m.alarms {
		for next < len(found) && byRank(found[next].key, a.key) < 0 {
			next++
		}
		there := next < len(found) && found[next].key == a.key
		if a.raw && !there && !(o.Stopped && a.row.Seen) {
			a.turn(false, m.at)
		}
		if m.fresh && a.raw && !a.active {
			a.turned, a.began = m.at, m.at // it may only have been interrupted by the restart
		}
	}
	m.fresh = false
}

// remind sounds again what nobody acknowledges, and calls the next people when
// the time to respond is over.
func (m *Machine) remind(out *Output) {
	last := m.routing.levels()
	for _, a := range m.alarms {
		if a.state != Unacknowledged {
			continue
		}
		if m.at.Sub(a.sound) >= resound {
			a.sound = m.at
			out.Sound = append(out.Sound, a.key)
			out.Messages = append(out.Messages, m.about(a, Reminder))
		}
		for level := min(int(m.at.Sub(a.raised)/a.row.Respond), last); a.level < level; {
			a.level++
			out.Messages = append(out.Messages, m.about(a, Escalated))
		}
	}
	slices.SortFunc(out.Sound, byRank)
}

// Alarms returns every alarm that is not normal, and those that were raised a
// short while ago, the first to be seen to first: by its place in the table,
// then by subject.
func (m *Machine) Alarms() []Alarm {
	out := make([]Alarm, len(m.alarms))
	for i, a := range m.alarms {
		out[i] = a.view()
	}
	return out
}

// Flood reports whether more alarms came than people can follow: more than ten
// in ten minutes, until there are fewer than five.
func (m *Machine) Flood() bool { return m.flood.on }

// Standing returns the alarms that are raised, acknowledged or not, for
// receivers that must be told again and again what stands.
func (m *Machine) Standing() []Alarm {
	var out []Alarm
	for _, a := range m.alarms {
		if a.state == Unacknowledged || a.state == Acknowledged {
			out = append(out, a.view())
		}
	}
	return out
}
