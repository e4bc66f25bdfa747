// Package send delivers messages of alarms: one file a receiver, and a Pump
// that takes what waits in the outbox, sends it, and settles it. It owns its
// goroutines and no state that must outlive it.
//
// Each message arrives at least once: it is settled only after the receiver took
// it, and keeps its ID when it is sent again. Of receivers that acknowledge
// nothing (syslog) as much is made sure as the protocol allows.
//
// A receiver is only ever what the configuration names. Connections go to public
// addresses, or to a loopback or private address that is configured as that
// address and not as a name, since a name can be pointed anywhere. Redirects are
// not followed, no proxy of the environment is used, answers are read to a bound
// and thrown away, and every attempt has its time limit. What an error says
// names the host and never the path or a secret.
package send
