// Package alerts tells people what they must act on. It turns what the service
// observes into alarms and notices, and these into messages for receivers.
//
// An alarm asks a person to do something within a time. Which alarms there are,
// what each means and what to do is one table (Rows). The states and their
// transitions are those of ISA-18.2 and IEC 62682. A closure that is routine,
// and one that is near, is a notice: it has no state and asks for nothing.
//
// A Machine is pure: observations and people's commands go in, changes and
// messages come out, at an instant called at. It reads no clock, starts no
// goroutine, and does no input or output. It has one owner. What it must
// remember over a restart is its Snapshot; the service keeps that, and the
// messages that are not delivered yet (Outbox). Package send delivers them.
//
// Nothing here can touch a permit: the package gives out texts alone. It fails
// toward telling: an unknown is a condition, a high alarm that no route takes goes
// to every receiver, and what may have been delivered is sent again.
//
// What comes from outside (names, references, reasons) is only ever text: it is
// cleaned of control and direction characters and cut before it goes into a
// message.
package alerts
