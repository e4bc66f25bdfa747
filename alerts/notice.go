package alerts

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"beamward/closures"
)

// The kinds of notices.
const (
	BeamOpen      Kind = "beam-open"
	BeamShuttered Kind = "beam-shuttered"
	ClosesSoon    Kind = "closes-soon"
)

// noticed is what people were last told of one beam.
type noticed struct {
	beam  closures.BeamID
	known bool
	open  bool // as told
	told  time.Time
	until time.Time // the end that the steps below count to
	steps int       // how many of soon were told
	ended time.Time // when an end was last told
}

// soon are the times before the end of an opening at which it is told.
var soon = [...]time.Duration{5 * time.Minute, time.Minute, 10 * time.Second}

const (
	noticeEvery = 10 * time.Second // least time between two words on a beam's state
	noticeLasts = 5 * time.Minute  // for how long a notice is of use
	sameEnd     = 10 * time.Second // an end that moves later by less is the same
)

// notice tells of openings, shutterings and ends that are near. A beam that
// flaps is told of once in noticeEvery, as it is then.
func (m *Machine) notice(o *Observation, out *Output) {
	if o.Stopped {
		return
	}
	for i := range o.Beams {
		b := &o.Beams[i]
		n := m.noticed(b.ID)
		switch {
		case !n.known:
			n.known, n.open = true, b.Open
		case b.Open != n.open && m.at.Sub(n.told) >= noticeEvery:
			n.open, n.told = b.Open, m.at
			kind, title := BeamOpen, "Beam "+string(b.ID)+" is open."
			if !b.Open {
				kind, title = BeamShuttered, "Beam "+string(b.ID)+" is shuttered: "+strings.Join(b.Codes.Names(), ", ")+"."
			}
			m.tell(kind, b, title, b.Why, out)
		}
		m.ends(n, b, out)
	}
	m.notices = slices.DeleteFunc(m.notices, func(n noticed) bool {
		return !slices.ContainsFunc(o.Beams, func(b Beam) bool { return b.ID == n.beam })
	})
}

// ends tells that an opening ends soon, each step once for one end.
func (m *Machine) ends(n *noticed, b *Beam, out *Output) {
	if !b.Open || b.OpenUntil.IsZero() {
		n.until, n.steps = time.Time{}, 0
		return
	}
	switch later := b.OpenUntil.Sub(n.until); {
	case n.until.IsZero(), later > sameEnd:
		n.until, n.steps = b.OpenUntil, 0
	case later < 0:
		n.until = b.OpenUntil
	}
	left := b.OpenUntil.Sub(m.at)
	due := 0
	for due < len(soon) && left <= soon[due] {
		due++
	}
	if due > n.steps && left > 0 && (n.steps > 0 || m.at.Sub(n.ended) >= noticeEvery) {
		n.steps, n.ended = due, m.at
		m.tell(ClosesSoon, b, fmt.Sprintf("Beam %s closes in %v.", b.ID, left.Round(time.Second)), "", out)
		out.Messages[len(out.Messages)-1].Expires = b.OpenUntil
	}
}

func (m *Machine) tell(k Kind, b *Beam, title, detail string, out *Output) {
	o := m.words(Notice, NoPriority, clean(title, mostDetail), clean(detail, mostDetail))
	o.Kind, o.Subject, o.Beams, o.Expires = k, clean(string(b.ID), mostName), []closures.BeamID{b.ID}, m.at.Add(noticeLasts)
	out.Messages = append(out.Messages, o)
}

func (m *Machine) noticed(id closures.BeamID) *noticed {
	for i := range m.notices {
		if m.notices[i].beam == id {
			return &m.notices[i]
		}
	}
	m.notices = append(m.notices, noticed{beam: id})
	return &m.notices[len(m.notices)-1]
}
