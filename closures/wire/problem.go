package wire

import (
	"encoding/json"
	"fmt"
	"strconv"
)

// ProblemType is the media type of a problem document (RFC 9457).
const ProblemType = "application/problem+json"

// Problem is a problem document after RFC 9457: why a request was not done.
type Problem struct {
	Type     string         `json:"type"`   // a URI reference; "about:blank" when the status says it all
	Title    string         `json:"title"`  // the same for every problem of the type
	Status   int            `json:"status"` // of HTTP
	Detail   string         `json:"detail,omitempty"`
	Instance string         `json:"instance,omitempty"`
	Errors   []ProblemEntry `json:"errors,omitempty"` // each thing that is wrong
}

// ProblemEntry is one thing that is wrong with what was sent.
type ProblemEntry struct {
	Line    int    `json:"line,omitempty"`    // of a file or of lines of facts, from 1
	Pointer string `json:"pointer,omitempty"` // JSON pointer within the body
	Field   string `json:"field,omitempty"`   // of a fact, a parameter or a header
	Detail  string `json:"detail"`
	Mend    string `json:"mend,omitempty"`
	Text    string `json:"text,omitempty"` // the line, cut and cleaned
}

const blankProblem = "about:blank"

// Error gives title and detail.
func (p *Problem) Error() string {
	s := p.Title
	if s == "" {
		s = "status " + strconv.Itoa(p.Status)
	}
	if p.Detail != "" {
		s += ": " + p.Detail
	}
	if len(p.Errors) > 0 {
		s += fmt.Sprintf(" (%d errors, the first: %s)", len(p.Errors), p.Errors[0].Detail)
	}
	return s
}

// MarshalJSON writes the document. A type that was not set is "about:blank".
func (p Problem) MarshalJSON() ([]byte, error) {
	type plain Problem
	if p.Type == "" {
		p.Type = blankProblem
	}
	return json.Marshal(plain(p))
}

// ProblemOf makes an entry of an error by this package's parsers, or by others.
func ProblemOf(line int, err error) ProblemEntry {
	switch e := err.(type) {
	case *FactError:
		return ProblemEntry{Line: line, Field: e.Field, Detail: e.Cause, Mend: e.Mend}
	case *StrictError:
		return ProblemEntry{Line: max(line, e.Line), Pointer: e.Pointer, Detail: e.Cause}
	}
	return ProblemEntry{Line: line, Detail: err.Error()}
}

// ParseProblem reads a problem document. As RFC 9457 (section 3.1) wants, a
// member of another type than it should have is as if it were not there, and
// members that are not known are passed over; but it must be JSON by Strict.
func ParseProblem(data []byte) (*Problem, error) {
	var members map[string]json.RawMessage
	if err := Strict(data, &members); err != nil {
		return nil, fmt.Errorf("reading a problem document: %w", err)
	}
	p := &Problem{Type: blankProblem}
	read := func(name string, into any) {
		if raw, ok := members[name]; ok {
			_ = Strict(raw, into) // zero when it is of another type
		}
	}
	read("type", &p.Type)
	read("title", &p.Title)
	read("status", &p.Status)
	read("detail", &p.Detail)
	read("instance", &p.Instance)
	var entries []json.RawMessage
	read("errors", &entries)
	for _, raw := range entries {
		var e ProblemEntry
		if Strict(raw, &e) == nil {
			p.Errors = append(p.Errors, e)
		}
	}
	if p.Type == "" {
		p.Type = blankProblem
	}
	return p, nil
}
