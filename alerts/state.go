package alerts

import "slices"

// State is the state of an alarm, after ISA-18.2 and IEC 62682.
type State uint8

// The states. Raised alarms are not acknowledged, acknowledged, or returned to
// normal before anybody acknowledged them. The last three are set aside: nothing
// is told of them, but what causes them is followed all the same.
const (
	Normal State = iota
	Unacknowledged
	Acknowledged
	Returned // to normal, not acknowledged
	Shelved
	Suppressed // by design: a parent cause is told of, or nobody works
	OutOfService
	numStates
)

var stateNames = [numStates]string{"normal", "unacknowledged", "acknowledged", "returned-unacknowledged", "shelved", "suppressed", "out-of-service"}

// String returns the state's word.
func (s State) String() string {
	if s < numStates {
		return stateNames[s]
	}
	return "no-state"
}

// ParseState reads what String writes.
func ParseState(s string) (State, bool) {
	i := slices.Index(stateNames[:], s)
	return State(max(i, 0)), i >= 0
}

// aside reports whether the alarm is set aside.
func (s State) aside() bool { return s == Shelved || s == Suppressed || s == OutOfService }

// Event is what can happen to an alarm.
type Event uint8

// The events: of the process, of people, of the design, of people again.
const (
	Raise Event = iota
	Return
	Acknowledge
	Shelve
	Unshelve // by a person, or since its time is over
	Suppress
	Unsuppress
	Remove // from service
	Restore
	numEvents
)

var eventNames = [numEvents]string{"raise", "return", "acknowledge", "shelve", "unshelve", "suppress", "unsuppress", "remove", "restore"}

// String returns the event's word.
func (e Event) String() string {
	if e < numEvents {
		return eventNames[e]
	}
	return "no-event"
}

// What a transition may be besides a state.
const (
	stay   = numStates + iota // nothing changes
	refuse                    // it makes no sense, and a person is told so
	settle                    // to where the condition and the design say
)

// transitions are all pairs. A set-aside alarm takes no notice of its process
// until it is back.
var transitions = [numStates][numEvents]State{
	//               Raise           Return    Acknowledge   Shelve   Unshelve  Suppress    Unsuppress  Remove        Restore
	Normal:         {Unacknowledged, stay, refuse, Shelved, refuse, Suppressed, stay, OutOfService, refuse},
	Unacknowledged: {stay, Returned, Acknowledged, Shelved, refuse, Suppressed, stay, OutOfService, refuse},
	Acknowledged:   {stay, Normal, stay, Shelved, refuse, Suppressed, stay, OutOfService, refuse},
	Returned:       {Unacknowledged, stay, Normal, Shelved, refuse, Suppressed, stay, OutOfService, refuse},
	Shelved:        {stay, stay, refuse, stay, settle, stay, stay, OutOfService, refuse},
	Suppressed:     {stay, stay, refuse, Shelved, refuse, stay, settle, OutOfService, refuse},
	OutOfService:   {stay, stay, refuse, refuse, refuse, stay, stay, stay, settle},
}

// Next returns the state after an event; ok is false where the event makes no
// sense, and the state stays. An alarm that comes back from being set aside is
// suppressed again while its parent cause is there, else unacknowledged while
// it is active, else normal. Safety alarms are neither shelved nor removed.
func Next(s State, e Event, active, parent, safety bool) (next State, ok bool) {
	if s >= numStates || e >= numEvents || safety && (e == Shelve || e == Remove) {
		return s, false
	}
	switch t := transitions[s][e]; t {
	case stay:
		return s, true
	case refuse:
		return s, false
	case settle:
		switch {
		case parent && e != Unsuppress:
			return Suppressed, true
		case active:
			return Unacknowledged, true
		}
		return Normal, true
	default:
		return t, true
	}
}
