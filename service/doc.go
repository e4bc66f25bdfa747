// Package service joins the parts of the daemon: the clock, the record, the
// engine, the feeds, the API and the permit listener. It only wires: New opens
// and binds everything that can fail, Run runs it until its context ends,
// Reload puts another configuration in force, Close gives everything back.
//
// The parts know nothing of each other. What one needs of another it declares
// as a small interface, and the adapters that satisfy it are here.
package service
