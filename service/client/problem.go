package client

import (
	"io"
	"net/http"
	"strconv"
	"strings"
	"time"

	"beamward/closures/wire"
)

// Problem is why the service did not do what it was asked.
type Problem struct {
	wire.Problem
	RetryAfter time.Duration // 0: trying again changes nothing
	Allow      string        // of a 405: the methods that there are
	Body       []byte        // the document as it came, for members of its own
}

// Mend returns what to do about it; empty where the service did not say.
func (p *Problem) Mend() string {
	for _, e := range p.Errors {
		if e.Mend != "" {
			return e.Mend
		}
	}
	return ""
}

// Error gives title, detail, the first thing that is wrong where it says more,
// and the first mend.
func (p *Problem) Error() string {
	s := p.Title
	if p.Detail != "" {
		s += ": " + p.Detail
	}
	if len(p.Errors) > 0 && p.Errors[0].Detail != p.Detail && !strings.HasSuffix(p.Detail, p.Errors[0].Detail) {
		s += ": " + where(&p.Errors[0]) + p.Errors[0].Detail
	}
	if m := p.Mend(); m != "" {
		s += ": " + m
	}
	return s
}

// where says in what a thing is wrong.
func where(e *wire.ProblemEntry) string {
	switch {
	case e.Line > 0:
		return "line " + strconv.Itoa(e.Line) + ": "
	case e.Pointer != "":
		return e.Pointer + ": "
	case e.Field != "":
		return e.Field + ": "
	}
	return ""
}

// Temporary reports whether the same request may do later.
func (p *Problem) Temporary() bool {
	return p.Status == http.StatusTooManyRequests || p.Status == http.StatusServiceUnavailable
}

const maxProblem = 4 << 20

// problemOf reads an answer that is no success. What is no problem document
// becomes one with the status alone.
func problemOf(r *http.Response) *Problem {
	p := &Problem{Allow: r.Header.Get("Allow")}
	if seconds, err := strconv.ParseUint(r.Header.Get("Retry-After"), 10, 31); err == nil {
		p.RetryAfter = time.Duration(seconds) * time.Second
	}
	if data, err := io.ReadAll(io.LimitReader(r.Body, maxProblem)); err == nil {
		if doc, err := wire.ParseProblem(data); err == nil {
			p.Problem, p.Body = *doc, data
		}
	}
	// The status line is what counts; a proxy may have written another body.
	p.Status = r.StatusCode
	if p.Title == "" {
		p.Title = http.StatusText(r.StatusCode)
	}
	return p
}
