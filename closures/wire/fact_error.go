package wire

import "strconv"

// FactError says why a line is no fact. Nothing of such a line is used. Its
// texts are plain ASCII and repeat at most 80 bytes of the line.
type FactError struct {
	Field string // such as "icrs.ra_deg"; empty: the line as a whole
	Cause string
	Mend  string
}

// Error gives field, cause and mend on one line.
func (e *FactError) Error() string {
	s := "fact: "
	if e.Field != "" {
		s += e.Field + ": "
	}
	s += e.Cause
	if e.Mend != "" {
		s += "; " + e.Mend
	}
	return s
}

func refuse(f field, cause, mend string) *FactError {
	return &FactError{Field: fieldNames[f], Cause: cause, Mend: mend}
}

func refuseLine(cause, mend string) *FactError { return &FactError{Cause: cause, Mend: mend} }

// at puts the error into an element of an array.
func (e *FactError) at(f field, i int) *FactError {
	inner := ""
	if e.Field != "" {
		inner = "." + e.Field
	}
	e.Field = fieldNames[f] + "[" + strconv.Itoa(i) + "]" + inner
	return e
}

// mendSyntax is the mend for what is no JSON.
const mendSyntax = "send one JSON object a line"
