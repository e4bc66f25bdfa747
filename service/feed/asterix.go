package feed

import (
	"context"
	"fmt"
	"net/netip"
	"sync"

	"beamward/closures"
	"beamward/service/feed/asterix"
)

// AsterixOptions are what an ASTERIX feed is made of.
type AsterixOptions struct {
	Intake  Intake
	Clock   Clock
	Notice  Notice // nil: nobody is told
	Decoder asterix.Options
	Listen  string
}

// Asterix takes ASTERIX category 021 over UDP. Its Stats count a datagram as a
// line.
type Asterix struct {
	*desk
	*socket
	source closures.Source

	mu      sync.Mutex // of what follows
	decoder *asterix.Decoder
}

// ListenAsterix binds the address and starts nothing.
func ListenAsterix(o AsterixOptions) (*Asterix, error) {
	source := o.Decoder.Source
	d, err := newDesk(Options{Bound: []Bound{{Name: source, Aircraft: true}}, Intake: o.Intake, Clock: o.Clock, Notice: o.Notice})
	var decoder *asterix.Decoder
	if err == nil {
		decoder, err = asterix.NewDecoder(o.Decoder)
	}
	if err != nil {
		return nil, fmt.Errorf("making the ASTERIX feed at %s: %w", o.Listen, err)
	}
	s, err := listenUDP(o.Listen)
	if err != nil {
		return nil, err
	}
	return &Asterix{desk: d, socket: s, source: source, decoder: decoder}, nil
}

// Counts returns what became of the datagrams so far.
func (a *Asterix) Counts() asterix.Counts {
	a.mu.Lock()
	defer a.mu.Unlock()
	return a.decoder.Counts()
}

// Callsigns returns the identifications heard, by the reports' aircraft.
func (a *Asterix) Callsigns() map[string]string {
	a.mu.Lock()
	defer a.mu.Unlock()
	return a.decoder.Callsigns()
}

// Run takes datagrams until ctx ends.
func (a *Asterix) Run(ctx context.Context) error {
	s := a.sender("", false)
	var seen []closures.AircraftSeen
	return a.receive(ctx, a.desk, func(data []byte, from netip.AddrPort) error {
		s.n++
		s.from = from.String()
		at := s.now()
		s.line(len(data), at)
		a.mu.Lock()
		var err error
		seen, err = a.decoder.Datagram(data, at, seen[:0])
		a.mu.Unlock()
		if err != nil {
			s.refuseLine(at, err.Error(), nil)
		}
		for i := range seen {
			if err := s.hand(ctx, a.source, seen[i], nil); err != nil {
				return err
			}
		}
		return ctx.Err()
	})
}
