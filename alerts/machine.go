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

// wentBack is by how much an instant may lie before the last one and still
// count as that one.
const wentBack = time.Minute

// advance sets the instant. A clock that went back by more than wentBack takes
// every instant that is kept with it, so that no alarm, shelf or delay waits for
// the time to come again.
func (m *Machine) advance(at time.Time) {
	at = at.Round(0).UTC()
	if back := at.Sub(m.at); back < -wentBack {
		m.shift(back)
	}
	if at.After(m.at) {
		m.at = at
	}
}

func (m *Machine) shift(d time.Duration) {
	move := func(instants ...*time.Time) {
		for _, t := range instants {
			if !t.IsZero() {
				*t = t.Add(d)
			}
		}
	}
	all := func(instants []time.Time) {
		for i := range instants {
			move(&instants[i])
		}
	}
	move(&m.at)
	for _, a := range m.alarms {
		move(&a.turned, &a.began, &a.since, &a.raised, &a.until, &a.hidden, &a.sound)
		all(a.recent)
	}
	for i := range m.notices {
		move(&m.notices[i].told, &m.notices[i].ended)
	}
	all(m.popups.times)
	all(m.flood.times)
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

// parentOf returns what hides an alarm now: a parent cause that is told of, or
// that nobody works.
func (m *Machine) parentOf(a *alarm) (parent Kind, hidden bool) {
	if !a.row.Always && !m.working {
		return "", true
	}
	for _, p := range m.alarms {
		if slices.Contains(a.row.Parents, p.key.Kind) && (p.raw || p.active) && p.state != OutOfService && (p.row.Always || m.working) &&
			(p.row.Scope != a.row.Scope || p.key.Subject == a.key.Subject) {
			return p.key.Kind, true
		}
	}
	return "", false
}

// settle brings one alarm to where its condition, its parents and its time on
// the shelf say.
func (m *Machine) settle(a *alarm, out *Output) {
	parent, hidden := m.parentOf(a)
	if hidden {
		a.hidden = m.at
	}
	if a.state == Shelved && !m.at.Before(a.until) {
		m.event(a, Unshelve, "", hidden, out)
	}
	switch {
	case hidden && (a.raw || a.active) && !a.state.aside():
		m.event(a, Suppress, "", true, out)
	case a.state == Suppressed && m.shows(a, parent, hidden):
		m.event(a, Unsuppress, "", hidden, out)
	}
	if a.state == Suppressed && hidden {
		a.parent = parent
	}
	switch {
	case a.active && (a.state == Normal || a.state == Returned):
		m.event(a, Raise, "", hidden, out)
	case !a.active && (a.state == Unacknowledged || a.state == Acknowledged):
		m.event(a, Return, "", hidden, out)
	}
}

// shows reports whether a suppressed alarm need not be suppressed any more: its
// parent is gone, or its own cause, for long enough that neither coming and
// going makes it chatter. While nobody works there is nothing to wait for.
func (m *Machine) shows(a *alarm, parent Kind, hidden bool) bool {
	off := a.off(m.at)
	if hidden {
		return !a.raw && !a.active && (parent == "" || m.at.Sub(a.turned) >= off)
	}
	return m.at.Sub(a.hidden) >= off
}

// event makes a transition and tells of it.
func (m *Machine) event(a *alarm, e Event, by string, parent bool, out *Output) bool {
	next, ok := Next(a.state, e, a.active, parent, a.row.Safety)
	if !ok {
		return false
	}
	from := a.state
	if next == from {
		return true
	}
	a.state, a.since = next, m.at
	if next != Suppressed {
		a.parent = ""
	}
	if from == Shelved {
		a.until = time.Time{}
	}
	if from == Shelved || from == OutOfService {
		a.by, a.reason = "", ""
	}
	if by != "" {
		a.by = by
	}
	if next == Unacknowledged {
		a.raised, a.count, a.level, a.sound, a.by = m.at, a.count+1, 0, m.at, ""
		a.recent = append(a.recent, m.at)
		for len(a.recent) > 0 && (m.at.Sub(a.recent[0]) > calm || len(a.recent) > 16) {
			a.recent = a.recent[1:]
		}
		m.flood.raised(m.at)
		out.Sound = append(out.Sound, a.key)
	}
	c := Change{Alarm: a.view(), From: from, Event: e, By: by, At: m.at}
	out.Changes = append(out.Changes, c)
	// Of what was never raised nobody needs to hear that it is hidden, nor of
	// what was hidden that it is over.
	if !(e == Suppress && from == Normal) && !(e == Unsuppress && next == Normal) {
		out.Messages = append(out.Messages, m.message(&c))
	}
	return true
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
