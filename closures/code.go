package closures

import "fmt"

// Code names the kind of a reason to be shuttered. The order is the order in
// which reasons are given.
type Code uint8

// The reason codes, the only list.
const (
	CodeListedClosure Code = iota
	CodeNotCovered
	CodeAircraft
	CodeSighting
	CodeDetectorAlarm
	CodeFieldCrossing
	CodeHold
	CodeInterlock
	CodeWatchMissing
	CodeElevationLimit
	CodeDaylight
	CodeAimUnknown
	CodeSlewing
	CodeSourceSilent
	CodeClock
	CodeRecord
	CodeShutterFault
	CodeStarting
	CodeReopening
	CodeRearm
	CodeFault
	NumCodes // how many there are
)

var codeNames = [NumCodes]string{
	"listed-closure", "not-covered", "aircraft", "sighting", "detector-alarm", "field-crossing", "hold", "interlock",
	"watch-missing", "elevation-limit", "daylight", "aim-unknown", "slewing", "source-silent", "clock", "record",
	"shutter-fault", "starting", "reopening", "rearm", "fault",
}

// String returns the code's name as every interface writes it.
func (c Code) String() string {
	if c < NumCodes {
		return codeNames[c]
	}
	return fmt.Sprintf("code-%d", uint8(c))
}

// ParseCode reads what String writes.
func ParseCode(s string) (Code, bool) {
	for c, name := range codeNames {
		if name == s {
			return Code(c), true
		}
	}
	return NumCodes, false
}

// Codes is a set of codes.
type Codes uint32

// With returns s and c.
func (s Codes) With(c Code) Codes { return s | 1<<c }

// Without returns s less c.
func (s Codes) Without(c Code) Codes { return s &^ (1 << c) }

// Has reports whether c is in s.
func (s Codes) Has(c Code) bool { return s&(1<<c) != 0 }

// AllCodes is the set of every code.
const AllCodes Codes = 1<<NumCodes - 1

// Names returns the names in s in the codes' order.
func (s Codes) Names() []string {
	var names []string
	for c := Code(0); c < NumCodes; c++ {
		if s.Has(c) {
			names = append(names, c.String())
		}
	}
	return names
}
