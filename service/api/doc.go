// Package api answers programs and people over HTTP: what each beam may do and
// why, closure lists, holds, facts, plans, the record and a stream of changes.
//
// It reads the view that the decision loop published and gives it facts. It
// decides nothing: whatever concerns safety is the core's, and a request ends
// in a fact or in an answer made of a view. No route opens a beam.
//
// # Which way it fails
//
// A view older than three decision intervals, by either clock, is shown
// shuttered. A hold is placed whatever else is wrong with the request around
// it: its own budget of requests, no need of a key, no precondition. It is
// answered with success only once it is on record. What opens (a release, a
// confirmation, a re-arming) is refused on any doubt.
//
// # What comes in
//
// Bodies are read by the strict readers of closures/wire and closures/listfile
// within a bound of bytes and of time. Query parameters that a route does not
// know, or that come twice, are refused; numbers and times follow the one
// grammar of wire. Every refusal is a problem document (RFC 9457) whose texts
// repeat input only cut and escaped.
//
// # Who owns what
//
// An API is safe for concurrent use. Run owns the stream's ring of events; one
// that does not run answers the stream with 503 and everything else. Nothing
// here starts a goroutine but a plan, which waits for those it started. Lists
// and plans share a few slots, so that they cannot take the machine from the
// decision loop.
package api
