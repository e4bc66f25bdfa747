// Package plan says which times tonight each target can have: the allowed and
// the blocked spans of an aim under everything that can be foreseen, found by
// the same checks that decide each second.
//
// A plan leaves out what cannot be foreseen: the live checks, and the time the
// latch waits before it opens again. It names what it left out. Its closures
// hold those of a decision on the same facts: inside an allowed span a decision
// for that aim finds nothing foreseeable against it, while edges found by a
// search may lie up to a few tenths of a second inward. A beam below the horizon
// is closed by its elevation; that it would cross a field besides is not said.
//
// ReadTargets reads tables of targets. A Planner answers for one beam over one
// span: One for an aim, Target for a target, Sequence for an ordered plan, Fit
// for targets whose order is open. A Timetable puts neighbours' coming aims into
// what is foreseen, Reconcile compares what was submitted with the list that
// came back, and OpenFor ranks what is open now.
//
// A Planner is immutable and safe for concurrent use; each caller brings its
// own Scratch. The package is pure, and the same questions have the same
// answers. It fails closed: what it cannot tell is not allowed.
package plan
