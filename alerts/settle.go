package alerts

import (
	"slices"
	"time"
)

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
