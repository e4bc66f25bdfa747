package access

// Role is what someone is trusted with. The zero value is nothing.
type Role uint8

// The roles. They are no ladder: a feed speaks and does not listen.
const (
	NoRole  Role = iota
	Read         // a display, an interlock that reads permits
	Feed         // a machine that tells facts
	Operate      // a laser operator
	Admin        // who keeps the installation
)

var roleNames = [...]string{"", "read", "feed", "operate", "admin"}

// String returns the role's word; empty for no role.
func (r Role) String() string {
	if int(r) < len(roleNames) {
		return roleNames[r]
	}
	return ""
}

// ParseRole reads what String writes.
func ParseRole(s string) (Role, bool) {
	for r, name := range roleNames {
		if r > 0 && name == s {
			return Role(r), true
		}
	}
	return NoRole, false
}

// Action is a kind of thing to do.
type Action uint8

// The actions. The zero value is what nobody may do.
const (
	Nothing    Action = iota
	See               // read state, permits, lists, the record
	Shutter           // place a hold: everyone who is signed in can close
	Tell              // send facts, for the sources that one is bound to
	Act               // whatever can open or changes what others see: lists, confirmations, releases, re-arming, targets, notes
	Administer        // reload, tokens, retention
)

// allowed is the whole of who may do what.
var allowed = map[Role]map[Action]bool{
	Read:    {See: true, Shutter: true},
	Feed:    {Shutter: true, Tell: true},
	Operate: {See: true, Shutter: true, Tell: true, Act: true},
	Admin:   {See: true, Shutter: true, Tell: true, Act: true, Administer: true},
}

// May reports whether the role may do a.
func (r Role) May(a Action) bool { return allowed[r][a] }
