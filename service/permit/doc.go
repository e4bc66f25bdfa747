// Package permit turns the newest decision into a short signed lease, and
// serves it on a listener of its own.
//
// # Lease arithmetic
//
// The core says until when a beam may be open: open_until is the start of the
// first foreseeable closure, widened by its lead and by the clock's error, less
// the margin time (shutter_time + consumer_clock_error). A permit is valid
//
//	valid_until = min(decided_at + lease, open_until)
//
// so that a reader that acts on it at the last instant, by a clock wrong by
// consumer_clock_error, with a shutter that takes shutter_time, is dark when
// the closure begins. issued_at is rounded up and valid_until down to the
// millisecond, and lease_ms is exactly what lies between them. A reader without
// UTC counts it from the sending of its request, which is before issued_at; it
// can only stop earlier than one with UTC. A shuttered permit is valid for no
// time.
//
// A permit without a nonce is signed once for a view and ten milliseconds, and
// its issued_at is the end of those, rounded up: it is at most eleven ahead, and
// lease_ms shorter by that. A permit with a nonce is signed for its request.
//
// # Which way it fails
//
// A decision older than three decision intervals by either clock is answered
// as shuttered: with the reason fault where both clocks say so, for then the
// engine has stopped deciding, and with clock where they disagree or the wall
// clock went back, for then nobody can tell. An open decision whose open_until
// has come is answered as shuttered with the closure that comes as the reason.
// What cannot be signed is not answered.
//
// The package does not decide, keeps no state but its cache, and asks for the
// engine through Source.
package permit
