package feed

import (
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"net"
	"net/netip"
	"sync"
	"time"

	"beamward/closures"
)

// Admission is what a connection must show before its lines are read.
type Admission uint8

// The ways in. The zero value asks for the most.
const (
	AdmitCertificate Admission = iota // a client certificate that stands for somebody
	AdmitToken                        // a first line {"token":"…"}
	AdmitAnyone                       // nothing: whoever reaches the address
)

// Speaker is who sent a token or a certificate.
type Speaker interface {
	MaySpeakFor(closures.Source) bool
	// Still reports whether they would still be let in. It is asked about
	// every half second while lines come.
	Still() bool
}

// Access knows people.
type Access interface {
	Token(from netip.Addr, token string) (Speaker, error)
	Certificate(from netip.Addr, state tls.ConnectionState) (Speaker, error)
}

// TCPOptions are what a TCP feed is made of. Limits that are zero stand for
// their defaults.
type TCPOptions struct {
	Options
	Listen string
	Admits Admission
	Access Access      // unless AdmitAnyone
	TLS    *tls.Config // nil: in the clear

	Most      int           // connections at once: 64
	Idle      time.Duration // how long a line may take to come: 5 minutes
	Handshake time.Duration // how long a connection may take to show who it is: 10 s
}

// TCP takes lines of facts over TCP.
type TCP struct {
	*desk
	options  TCPOptions
	listener *net.TCPListener
}

// ListenTCP binds the address and starts nothing.
func ListenTCP(o TCPOptions) (*TCP, error) {
	d, err := newDesk(o.Options)
	if err != nil {
		return nil, fmt.Errorf("making the TCP feed at %s: %w", o.Listen, err)
	}
	switch {
	case o.Admits != AdmitAnyone && o.Access == nil:
		return nil, fmt.Errorf("making the TCP feed at %s: nobody is known who could be let in", o.Listen)
	case o.Admits == AdmitCertificate && (o.TLS == nil || o.TLS.ClientCAs == nil):
		return nil, fmt.Errorf("making the TCP feed at %s: certificates need TLS and an authority of clients' certificates", o.Listen)
	}
	if o.TLS != nil {
		o.TLS = o.TLS.Clone()
		o.TLS.ClientAuth = tls.NoClientCert
		if o.Admits == AdmitCertificate {
			o.TLS.ClientAuth = tls.RequireAndVerifyClientCert
		}
	}
	if o.Most <= 0 {
		o.Most = 64
	}
	if o.Idle <= 0 {
		o.Idle = 5 * time.Minute
	}
	if o.Handshake <= 0 {
		o.Handshake = 10 * time.Second
	}
	at, err := net.ResolveTCPAddr("tcp", o.Listen)
	if err != nil {
		return nil, fmt.Errorf("making the TCP feed at %s: %w", o.Listen, err)
	}
	if o.Admits == AdmitAnyone && !at.IP.IsLoopback() {
		return nil, fmt.Errorf("making the TCP feed at %s: off the loopback interface anyone could speak here: admit by token or certificate", o.Listen)
	}
	l, err := net.ListenTCP("tcp", at)
	if err != nil {
		return nil, fmt.Errorf("making the TCP feed: %w: choose another address, or end what listens there", err)
	}
	return &TCP{desk: d, options: o, listener: l}, nil
}

// Addr is the address that was bound.
func (t *TCP) Addr() net.Addr { return t.listener.Addr() }

// Close gives the address back without Run. After Run it does nothing.
func (t *TCP) Close() error {
	if err := t.listener.Close(); err != nil && !errors.Is(err, net.ErrClosed) {
		return err
	}
	return nil
}

// acceptPause is how long a listener waits after an error, such as too many
// open files.
const acceptPause = 100 * time.Millisecond

// Run lets connections in until ctx ends, then closes them all.
func (t *TCP) Run(ctx context.Context) error {
	t.start()
	ctx, cancel := context.WithCancel(ctx)
	var all sync.WaitGroup
	defer all.Wait()
	defer cancel()
	stop := context.AfterFunc(ctx, func() { _ = t.Close() })
	defer stop()
	defer t.Close()
	for {
		c, err := t.listener.AcceptTCP()
		switch {
		case ctx.Err() != nil:
			if err == nil {
				_ = c.Close()
			}
			return nil
		case errors.Is(err, net.ErrClosed):
			return fmt.Errorf("TCP feed at %s: its listener was closed", t.options.Listen)
		case err != nil:
			t.setTrouble("no connection can be accepted")
			t.notice("a connection cannot be accepted", "listen", t.options.Listen, "err", err)
			if sleep(ctx, t.options.Clock, acceptPause) != nil {
				return nil
			}
			continue
		}
		t.setTrouble("")
		if t.open.Add(1) > int64(t.options.Most) {
			t.open.Add(-1)
			t.turnedAway.Add(1)
			t.notice("a connection is turned away: there are too many", "from", c.RemoteAddr(), "most", t.options.Most)
			_ = c.Close()
			continue
		}
		t.connections.Add(1)
		all.Go(func() {
			defer t.open.Add(-1)
			t.serve(ctx, c)
		})
	}
}
