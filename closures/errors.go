package closures

import "fmt"

// ErrorCode sorts errors by what the asker can do about them. Each has one
// answer at every interface.
type ErrorCode uint8

// The codes.
const (
	Internal ErrorCode = iota // nothing
	Invalid                   // mend the request
	NotFound                  // name something that exists
	Conflict                  // something else stands against it
	Changed                   // it changed meanwhile: look again
	Busy                      // try again later
)

// Error is what was done to what, and the mend.
type Error struct {
	Code    ErrorCode
	Message string
	Mend    string
}

// Error returns the message and the mend.
func (e *Error) Error() string {
	if e.Mend == "" {
		return e.Message
	}
	return e.Message + ": " + e.Mend
}

// Errorf makes an error with its mend.
func Errorf(code ErrorCode, mend, format string, args ...any) *Error {
	return &Error{Code: code, Message: fmt.Sprintf(format, args...), Mend: mend}
}
