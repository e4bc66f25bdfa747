package alerts

import (
	"slices"
	"time"

	"beamward/closures"
)

// Route says which messages go to one receiver.
type Route struct {
	Receiver string
	AtLeast  Priority          // alarms of this priority and above; NoPriority: no alarms
	Beams    []closures.BeamID // none: all; what is about no beam goes to every route
	From     int               // minutes after local midnight from which on it applies
	Until    int               // and until which; the same as From: at every hour; less: through midnight
	Level    int               // 0: when raised; n: when nobody answered for n times the time to respond
	Changes  bool              // also acknowledgements, returns, what is set aside
	Sounds   bool              // also every 30 s while nobody acknowledges
	Notices  bool              // also notices
}

// MostLevels is the highest level of escalation.
const MostLevels = 5

// Routing is where messages go, by priority, hour and beam. The zero value
// sends nothing: alarms are then only shown.
type Routing struct {
	Zone   *time.Location // of the hours; nil: UTC
	Routes []Route
}

// Validate returns what is wrong with a routing, one error a fault, each with
// its mend. A route of level n without one of level n-1 is refused: nobody
// would be told before.
func (r *Routing) Validate() []error {
	var errs []error
	levels := map[int]bool{}
	for i := range r.Routes {
		o := &r.Routes[i]
		if !closures.ValidName(o.Receiver) {
			errs = append(errs, closures.Errorf(closures.Invalid, "name a receiver: 1 to 64 of A-Z a-z 0-9 . _ -", "route %d: receiver %.64q is no name", i+1, o.Receiver))
		}
		if o.From < 0 || o.From >= 24*60 || o.Until < 0 || o.Until > 24*60 {
			errs = append(errs, closures.Errorf(closures.Invalid, "give hours from 00:00 to 24:00", "route %d: its hours are none of a day", i+1))
		}
		if o.AtLeast > High {
			errs = append(errs, closures.Errorf(closures.Invalid, "use low, medium or high", "route %d: there is no such priority", i+1))
		}
		if o.AtLeast == NoPriority && !o.Notices {
			errs = append(errs, closures.Errorf(closures.Invalid, "give at_least, or notices: true", "route %d: nothing would ever take it", i+1))
		}
		if o.Level < 0 || o.Level > MostLevels {
			errs = append(errs, closures.Errorf(closures.Invalid, "use a level from 0 to 5", "route %d: level %d", i+1, o.Level))
		}
		levels[o.Level] = true
	}
	for i := range r.Routes {
		if l := r.Routes[i].Level; l > 0 && l <= MostLevels && !levels[l-1] {
			errs = append(errs, closures.Errorf(closures.Invalid, "give a route of the level below", "route %d: level %d follows on none", i+1, l))
		}
	}
	return errs
}

// levels is the highest level of any route.
func (r *Routing) levels() int {
	n := 0
	for i := range r.Routes {
		n = max(n, r.Routes[i].Level)
	}
	return n
}

// route gives each message its receivers. In a flood alarms of low priority
// are shown and not sent.
func (r *Routing) route(out *Output, flood bool) {
	for i := range out.Messages {
		m := &out.Messages[i]
		if flood && m.What == Raised && m.Priority == Low {
			continue
		}
		for j := range r.Routes {
			if o := &r.Routes[j]; o.takes(m) && r.open(o, m.At) {
				m.To = append(m.To, o.Receiver)
			}
		}
		// A high alarm that falls into an hour without anybody is everybody's.
		if len(m.To) == 0 && m.What == Raised && m.Priority == High {
			for j := range r.Routes {
				if !(m.Kind == ReceiverUnreachable && m.Subject == r.Routes[j].Receiver) {
					m.To = append(m.To, r.Routes[j].Receiver)
				}
			}
		}
		slices.Sort(m.To)
		m.To = slices.Compact(m.To)
	}
}

// takes reports whether a route is for a message, hours apart.
func (o *Route) takes(m *Message) bool {
	if len(o.Beams) > 0 && len(m.Beams) > 0 && !slices.ContainsFunc(m.Beams, func(b closures.BeamID) bool { return slices.Contains(o.Beams, b) }) {
		return false
	}
	if m.Kind == ReceiverUnreachable && m.Subject == o.Receiver {
		return false // it cannot be told of itself
	}
	switch enough := o.AtLeast != NoPriority && m.Priority >= o.AtLeast; m.What {
	case Notice:
		return o.Notices && o.Level == 0
	case Raised, FloodTold:
		return enough && o.Level == 0
	case Escalated:
		return enough && o.Level == m.Level
	case Reminder:
		return enough && o.Sounds && o.Level <= m.Level
	case CameBack, Acked, SetAside, BackIn:
		return enough && o.Changes && o.Level <= m.Level
	}
	return false
}

// open reports whether a route applies at the hour of an instant.
func (r *Routing) open(o *Route, at time.Time) bool {
	if o.From == o.Until {
		return true
	}
	zone := r.Zone
	if zone == nil {
		zone = time.UTC
	}
	h, min, _ := at.In(zone).Clock()
	now := 60*h + min
	if o.From < o.Until {
		return o.From <= now && now < o.Until
	}
	return now >= o.From || now < o.Until
}
