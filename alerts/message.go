package alerts

import (
	"slices"
	"strconv"
	"strings"
	"time"

	"beamward/closures"
)

// What says what a message tells.
type What uint8

// What messages tell. The zero value is nothing.
const (
	NoWhat What = iota
	Raised
	CameBack // the condition is gone; the alarm may still want an acknowledgement
	Acked
	SetAside // shelved, suppressed or taken out of service
	BackIn   // no longer set aside, and normal
	Escalated
	Reminder
	FloodTold
	Notice
)

var whats = [...]string{"nothing", "raised", "returned", "acknowledged", "set-aside", "back", "escalated", "reminder", "flood", "notice"}

// String returns what is told as one word.
func (w What) String() string {
	if int(w) < len(whats) {
		return whats[w]
	}
	return "nothing"
}

// ParseWhat reads what String writes.
func ParseWhat(s string) (What, bool) {
	i := slices.Index(whats[:], s)
	return What(max(i, 0)), i >= 0
}

// Message is what is sent to people. Its texts are clean: one line each, no
// control or direction characters, whatever came in.
type Message struct {
	ID       string // unique; the same each time it is sent
	At       time.Time
	What     What
	Kind     Kind // the alarm's, or the notice's
	Subject  string
	Beams    []closures.BeamID
	Priority Priority
	State    State     // of the alarm, after it
	Since    time.Time // when the alarm was last raised
	Level    int       // of escalation
	By       string    // the person whose doing it is
	Title    string    // one line
	Detail   string
	Effect   string // what follows from it
	Do       string // what to do
	Within   time.Duration
	Expires  time.Time // it is of no use afterwards; zero: always of use
	To       []string  // receivers, in order
}

func (m *Machine) id() string {
	m.seq++
	return strconv.FormatInt(m.at.UnixNano(), 36) + "-" + strconv.FormatUint(m.seq, 10)
}

// message tells of a transition.
func (m *Machine) message(c *Change) Message {
	what := Raised
	switch to := c.Alarm.State; {
	case to.aside():
		what = SetAside
	case to == Acknowledged, to == Normal && c.Event == Acknowledge:
		what = Acked
	case to == Returned, to == Normal && c.From == Acknowledged:
		what = CameBack
	case to == Normal:
		what = BackIn
	}
	o := m.about(m.find(c.Alarm.Key), what)
	o.By = clean(c.By, mostName)
	return o
}

// about makes a message about an alarm as it stands.
func (m *Machine) about(a *alarm, what What) Message {
	r := a.row
	o := Message{
		ID: m.id(), At: m.at, What: what, Kind: r.Kind, Subject: a.key.Subject, Beams: slices.Clone(a.beams), Priority: r.Priority, State: a.state,
		Since: a.raised, Level: a.level, Detail: a.detail, Effect: r.Consequence, Do: r.Do, Within: r.Respond,
	}
	o.Title = strings.ToUpper(r.Priority.String()) + " " + string(r.Kind) + about(a.key.Subject) + ": " + titles(what, a.state) + r.Cause
	if what == Reminder {
		o.Expires = m.at.Add(resound)
	}
	return o
}

func about(subject string) string {
	if subject == "" {
		return ""
	}
	return " " + subject
}

func titles(what What, s State) string {
	switch what {
	case Raised:
		return ""
	case Escalated:
		return "nobody has answered: "
	case Reminder:
		return "still unacknowledged: "
	case CameBack, BackIn:
		return "is over: "
	case Acked:
		return "acknowledged: "
	}
	return s.String() + ": "
}

// words makes a message that is about no alarm.
func (m *Machine) words(what What, p Priority, title, detail string) Message {
	return Message{ID: m.id(), At: m.at, What: what, Priority: p, Title: title, Detail: detail}
}
