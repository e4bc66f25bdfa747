// Package client speaks to a running beamward over HTTP, for the command line,
// for demonstrations, and for programs in Go.
//
// A refusal is a *Problem, which carries the status and what to do about it.
//
// # Permits
//
// Permit asks with a fresh nonce, verifies the signature, and checks that the
// answer is about the beam and the request that it was asked for and is not
// older than one that was seen before. What it returns is a Lease, whose Open
// says whether the beam may be on the sky at an instant: only while the permit
// is open, not simulated, not past its end by the wall clock, and its lease,
// counted from the sending of the request, has not run out either. With any
// error there is no lease, and the beam has to be shuttered.
//
// The key is the one given in Options, or the one that the service showed
// first: over a connection that can be tampered with, give it.
//
// A Client is safe for concurrent use and starts no goroutine of its own.
package client
