// Package demo plays one short night of the invented Skerry Peak on the real
// service.
//
// It needs nothing but a folder. There it writes a configuration and closure
// lists, starts the service on a clock that it steps itself, and then is the
// observatory around it: telescopes, an aircraft receiver, interlock, detector,
// spotters, a neighbour, operators, and a laser control that reads permits.
// They speak through the service's own sockets (TCP, HTTP and a watched folder)
// as they would on a mountain. What happens stands in one table, the story; it
// shows every reason for which a beam is shuttered.
//
// The clock moves in steps of a decision interval, and moves on only when the
// service has taken in what was said, has decided, and is not behind with its
// record. So a speed is a ceiling, and a slow machine changes nothing but how
// long the night takes.
//
// Nothing here can open a real shutter: the permits say simulated inside the
// signed bytes and are signed by a key that is thrown away. The demo fails
// unless all reasons were shown, every permit that was read proved itself, and
// the record that is left verifies.
//
// A Run owns the service, the clock and its sockets; it has one goroutine, and
// waits for those that it starts.
package demo
