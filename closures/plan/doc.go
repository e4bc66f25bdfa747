// Package plan says which times tonight each target can have: the allowed and
// the blocked spans of an aim under everything that can be foreseen, found by
// the same checks that decide each second.
//
// A plan leaves out what cannot be foreseen: the live checks, and the time the
// latch waits before it opens again. It names what it left out. Its closures
// hold those of a decision on the same facts: inside an allowed span a decision
// for that aim finds nothing foreseeable against it, while edges found by a
// search may lie up to a few tenths of a second inward.
//
// A Planner is immutable and safe for concurrent use; each caller brings its
// own Scratch. The package is pure.
package plan
