// Package feed brings facts in from outside: lines of facts over TCP and UDP
// and from followed files, Mode S frames, ASTERIX category 021, and closure
// lists from watched folders.
//
// Each way in is one value. Its constructor does everything that can fail and
// binds its listener; Run works until its context ends, then has given
// everything back and returns nil; Stats may be asked at any time. Nobody
// needs to close a listener whose Run was called; Close gives back one whose
// Run never was.
//
// # What a feed may say
//
// A feed is bound to names: sources, beams, neighbours, posts. A line that
// speaks for another name is refused. Where a listener admits by token or by
// client certificate, a connection may speak only for what both it and its
// person are bound to. Over UDP nothing but reports of aircraft is taken, since
// a sender proves nothing there.
//
// # What happens when intake is full
//
// TCP and files stop reading and try the same fact again, so that the sender
// feels it and nothing is lost. UDP drops the fact and counts it.
//
// # Which way it fails
//
// A feed never makes a fact up and never repeats one on its own, so that what
// fails falls silent, which closes. A bad line is refused whole, counted, kept
// for people to see, and costs nothing else: the connection lives. A sender of
// only bad lines is as silent as none. After each new connection, file or
// start, the first fact of an aircraft source is preceded by the word that
// reception starts again, so that its warm-up does too.
//
// A value's exported methods are safe for concurrent use; Run is called once.
package feed
