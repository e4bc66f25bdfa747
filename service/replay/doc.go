// Package replay goes through a record again: it builds the state as the
// engine had it, gives it the same facts in the same batches at the same
// instants, and sees what it decides.
//
// Replay holds that against what was recorded. Explain tells what one entry
// rested on, or did. States hands out the state step by step, for reports.
//
// # What a record must hold for that
//
// A run begins with an entry of kind begun, which names the rules, and the
// entry of kind durable after it: the state is made from these two. Then come
// facts; a tick ends a batch, its instant is the step's and its number the
// decisions'. A batch that no tick ends was never applied, because the core
// failed on it or the service ended. Decisions that changed follow their tick.
// Where entries were lost, nothing can be said until the next run begins.
//
// # How exact it is
//
// By the same build, a replay is identical to the last bit: decisions with
// their margins, the tallies of all decisions between them, and what a restart
// would have rested on. Another build may round otherwise, so that there only
// states and codes are held against the record, and those may differ only where
// a margin is as good as zero; each such place is listed.
//
// What was pruned cannot be replayed, and is refused rather than passed over.
//
// # What it does not do
//
// It reads no clock, starts no goroutine and writes nothing. It decides
// nothing by itself: the decisions are the core's. Memory is bounded by a page of
// the record's blocks, the state and the lists in force.
package replay
