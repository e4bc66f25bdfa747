// Package closures holds every reason for which a laser beam must be
// shuttered, and the decision that follows from them.
//
// Facts go in, decisions come out: a State applies numbered facts, settles its
// latches and decides each beam at an instant called at. The package is pure.
// It reads no clock, does no input or output, starts no goroutine and takes no
// lock, so the same facts give the same decisions, to the bit.
//
// The safe direction rules every line. The zero Decision is shuttered, the
// zero Verdict is Unknown, and a beam is open only when every check has said
// Clear. Unknown, stale, not-a-number and missing all shutter.
//
// Checks come in two kinds. A foreseeable check answers over a span of time
// for an aim, so that the plan of a night and the decision of this second come
// from the same code. A live check answers for now.
//
// A State has one owner, which alone calls Step. Decide only reads. What
// Foreseen returns is never changed afterwards and may be shared.
package closures
