// Package access knows who is asking and what they may do.
//
// With tokens or client certificates everyone signs in by name, and the name
// stands on record beside what they did. Without either the service answers
// the loopback interface only, to one nameless operator, and what asks for a
// second person cannot be done.
//
// Tokens have 256 random bits, are shown once, and are kept as their SHA-256
// in a file that only the service's user can read. A request carries one in
// the header Authorization: Bearer, never in its URL, which ends up in logs
// and histories. The file is read again at least twice a second while anyone
// asks, so that a revocation holds within a second; a file that cannot be
// read, is open to others, or has one line that is not as this package writes
// it, lets nobody in.
//
// Every failure is on the closed side: the zero Person and the zero Role may
// do nothing, two certificates' rules that fit one certificate fit nobody, and
// a request that shows a credential is refused when that credential is wrong,
// whatever else it shows.
//
// A Guard is safe for concurrent use and starts no goroutine.
package access
