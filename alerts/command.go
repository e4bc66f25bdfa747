package alerts

import (
	"time"

	"beamward/closures"
)

// MostShelved is the longest time for which an alarm may be shelved.
const MostShelved = 8 * time.Hour

// Acknowledge takes a person's word that the alarm is seen to.
func (m *Machine) Acknowledge(at time.Time, k Key, by string) (Output, *closures.Error) {
	a := m.find(k)
	if a == nil || a.state == Normal {
		return Output{}, closures.Errorf(closures.NotFound, "see which alarms stand", "alarm %.64q: it is not raised", string(k.Kind)+about(k.Subject))
	}
	return m.command(at, a, Acknowledge, by, "acknowledge it when it is back")
}

// Shelve sets an alarm aside for a time that is over by itself.
func (m *Machine) Shelve(at time.Time, k Key, by, reason string, lasts time.Duration) (Output, *closures.Error) {
	if !(lasts > 0 && lasts <= MostShelved) {
		return Output{}, closures.Errorf(closures.Invalid, "give a time up to 8h", "alarm %.64q: shelving for %v", string(k.Kind), lasts)
	}
	a, err := m.subject(at, k)
	if err != nil {
		return Output{}, err
	}
	out, err := m.command(at, a, Shelve, by, "a safety alarm is not shelved, nor what is out of service")
	if err == nil {
		a.until, a.reason, a.by = m.at.Add(lasts), clean(reason, mostDetail), clean(by, mostName)
		m.amend(&out, a)
	}
	return out, err
}

// Unshelve takes an alarm off the shelf.
func (m *Machine) Unshelve(at time.Time, k Key, by string) (Output, *closures.Error) {
	return m.existing(at, k, Unshelve, by, "it is not shelved")
}

// Remove takes an alarm out of service until it is restored, for a reason that
// is kept.
func (m *Machine) Remove(at time.Time, k Key, by, reason string) (Output, *closures.Error) {
	if reason == "" {
		return Output{}, closures.Errorf(closures.Invalid, "give the reason", "alarm %.64q: it is not taken out of service for nothing", string(k.Kind))
	}
	a, err := m.subject(at, k)
	if err != nil {
		return Output{}, err
	}
	out, err := m.command(at, a, Remove, by, "a safety alarm stays in service")
	if err == nil {
		a.reason, a.by = clean(reason, mostDetail), clean(by, mostName)
		m.amend(&out, a)
	}
	return out, err
}

// Restore puts an alarm back into service.
func (m *Machine) Restore(at time.Time, k Key, by string) (Output, *closures.Error) {
	return m.existing(at, k, Restore, by, "it is in service")
}

func (m *Machine) existing(at time.Time, k Key, e Event, by, mend string) (Output, *closures.Error) {
	a := m.find(k)
	if a == nil {
		return Output{}, closures.Errorf(closures.NotFound, "see which alarms stand", "alarm %.64q: not known", string(k.Kind)+about(k.Subject))
	}
	return m.command(at, a, e, by, mend)
}

// subject returns what is kept of an alarm of the table, also of one that was
// never raised.
func (m *Machine) subject(at time.Time, k Key) (*alarm, *closures.Error) {
	r, ok := RowOf(k.Kind)
	if !ok || (r.Scope == OfSite) != (k.Subject == "") || k.Subject != clean(k.Subject, mostName) {
		return nil, closures.Errorf(closures.NotFound, "name an alarm of the table, and what it is about", "alarm %.64q: there is none", string(k.Kind)+about(k.Subject))
	}
	m.advance(at)
	return m.keep(k), nil
}

// command makes a person's transition.
func (m *Machine) command(at time.Time, a *alarm, e Event, by, mend string) (Output, *closures.Error) {
	if by == "" {
		return Output{}, closures.Errorf(closures.Invalid, "say who", "alarm %s%s: no name was given", a.key.Kind, about(a.key.Subject))
	}
	m.advance(at)
	_, hidden := m.parentOf(a)
	var out Output
	if !m.event(a, e, clean(by, mostName), hidden, &out) {
		return Output{}, closures.Errorf(closures.Conflict, mend, "alarm %s%s: it is %s, which %s does not fit", a.key.Kind, about(a.key.Subject), a.state, e)
	}
	m.routing.route(&out, m.flood.on)
	return out, nil
}

// amend brings what a command told up to what it then set.
func (m *Machine) amend(out *Output, a *alarm) {
	for i := range out.Changes {
		if out.Changes[i].Alarm.Key == a.key {
			out.Changes[i].Alarm = a.view()
		}
	}
}
