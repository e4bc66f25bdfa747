// Package engine is the one owner of the decision. Facts come in from many
// goroutines; one goroutine numbers them, gives them to closures.State in
// batches, publishes what follows and puts everything on record.
//
// # Order of duties
//
// A turn is one batch. In this order it
//
//  1. reads the clock and the record's condition and makes facts of them,
//  2. takes the pending facts, numbers them, and steps the state,
//  3. publishes the view, in which a beam that closes is shuttered already,
//  4. queues the entries for the record,
//  5. answers who waits for a fact, and tells who watches,
//  6. strokes the watchdog.
//
// A beam that opens is published as shuttered, with the reason record, until
// the entry of its opening is durable; then the next turn decides again and
// grants it only if it is still clear. Nothing here waits for the store or for
// the network: what is not ready yet is looked at in a later turn.
//
// # What waits where, and what happens when it is full
//
// The newest aim, aircraft report and sign of life of each source and subject
// waits alone: a newer one takes its place and is counted. Everything else is
// never superseded and goes first, people's words before devices'; where a
// device contradicts its last word, each has a turn of its own. Each lane
// is bounded and refuses with closures.Busy when full. While the record has
// room for nothing but the engine's own entries, all intake is refused but
// what can only close. A watcher that does not keep up is cut off.
//
// # Which way it fails
//
// Before the first turn, after a panic, after a stop and while an entry is
// lost, every beam is published as shuttered (by starting, fault, starting and
// record). After one panic the state is built anew from what was durable, so
// that everything must be heard afresh; a second one in a row ends Run with an
// error, still shuttered. It is built anew as well where the clock went back,
// since an age cannot be told then, where entries of the record were lost, and
// where the site's place changed. A published view that grows old is for its
// reader to refuse; it carries both clocks for that.
//
// A View is never changed. The Engine's exported methods are safe for
// concurrent use; a Stepper has one owner, which takes the place of Run.
package engine
