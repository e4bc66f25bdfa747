package alerts

import "time"

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
