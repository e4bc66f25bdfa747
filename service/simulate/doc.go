// Package simulate plays invented nights of Skerry Peak on the parts that the
// daemon is made of, in virtual time.
//
// The engine, the permit issuer and the record are the real ones; the clocks,
// the feeds, the people and the lasers are virtual. One seed is one night: what
// happens, how wrong each instrument is within its stated bounds, and when the
// process is killed, stopped, put to sleep or given another configuration. The
// same seed leaves the same record to the byte, so that a night that went wrong
// can be played again.
//
// # What is true and what is told
//
// A night knows what truly happens: where the light goes, where aircraft are,
// what the interlock is. The feeds tell it as instruments do, late and wrong by
// as much as the configuration states and no more, or they are silent. The
// laser's control reads permits as any reader would, over the signed bytes, by a
// clock that is wrong and with a shutter that takes all of its time.
//
// # The judge
//
// The judge decides nothing that the daemon decides and shares none of its
// checks. It knows the truth and what was acknowledged, has the site's bounds
// as numbers of its own, and looks at each permit that is read and at each
// instant that light is on whether that is what SAFETY.md asks for. What it
// finds is counted as unsafe; there must be none. It borrows one thing, where
// a place among the stars stands overhead, which is held against other programs
// where that is made.
//
// The hardware's own failures are left out: a shutter that sticks is seen by
// shutter-fault and stopped by no permit.
//
// A night has one goroutine and no real time in it.
package simulate
