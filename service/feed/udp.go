package feed

import (
	"context"
	"errors"
	"fmt"
	"net"
	"net/netip"

	"beamward/closures/wire"
)

// UDPOptions are what a UDP feed of facts is made of.
type UDPOptions struct {
	Options
	Listen string
}

// UDP takes lines of facts over UDP, one or more a datagram: reports of
// aircraft alone.
type UDP struct {
	*desk
	*socket
}

// ListenUDP binds the address and starts nothing.
func ListenUDP(o UDPOptions) (*UDP, error) {
	d, err := newDesk(o.Options)
	if err != nil {
		return nil, fmt.Errorf("making the UDP feed at %s: %w", o.Listen, err)
	}
	for _, b := range o.Bound {
		if !b.Aircraft {
			return nil, fmt.Errorf("making the UDP feed at %s: %s is no source of aircraft: over UDP a sender proves nothing", o.Listen, b.Name)
		}
	}
	s, err := listenUDP(o.Listen)
	if err != nil {
		return nil, err
	}
	return &UDP{desk: d, socket: s}, nil
}

// Run takes datagrams until ctx ends.
func (u *UDP) Run(ctx context.Context) error {
	s := u.sender("", false)
	s.onlyAircraft = true
	return u.receive(ctx, u.desk, func(data []byte, from netip.AddrPort) error {
		s.from = from.String()
		for _, line := range wire.Lines(data) {
			if err := s.fact(ctx, line); err != nil {
				return err
			}
		}
		return nil
	})
}

// socket is a bound UDP socket.
type socket struct {
	listen string
	c      *net.UDPConn
}

// datagramBuffer is what the kernel may hold; more is lost, as UDP is.
const datagramBuffer = 1 << 20

func listenUDP(listen string) (*socket, error) {
	at, err := net.ResolveUDPAddr("udp", listen)
	if err != nil {
		return nil, fmt.Errorf("making the UDP feed at %s: %w", listen, err)
	}
	c, err := net.ListenUDP("udp", at)
	if err != nil {
		return nil, fmt.Errorf("making the UDP feed: %w: choose another address, or end what listens there", err)
	}
	_ = c.SetReadBuffer(datagramBuffer) // the kernel's own size will do
	return &socket{listen, c}, nil
}

// Addr is the address that was bound.
func (s *socket) Addr() net.Addr { return s.c.LocalAddr() }

// Close gives the address back without Run. After Run it does nothing.
func (s *socket) Close() error {
	if err := s.c.Close(); err != nil && !errors.Is(err, net.ErrClosed) {
		return err
	}
	return nil
}

// receive hands every datagram on until ctx ends.
func (s *socket) receive(ctx context.Context, d *desk, each func([]byte, netip.AddrPort) error) error {
	d.start()
	stop := context.AfterFunc(ctx, func() { _ = s.Close() })
	defer stop()
	defer s.Close()
	d.open.Store(1)
	defer d.open.Store(0)
	d.connections.Add(1)
	buf := make([]byte, 1<<16)
	for {
		n, from, err := s.c.ReadFromUDPAddrPort(buf)
		switch {
		case ctx.Err() != nil:
			return nil
		case errors.Is(err, net.ErrClosed):
			return fmt.Errorf("UDP feed at %s: its socket was closed", s.listen)
		case err != nil:
			d.notice("a datagram cannot be received", "listen", s.listen, "err", err)
			if sleep(ctx, d.options.Clock, acceptPause) != nil {
				return nil
			}
			continue
		}
		if each(buf[:n], netip.AddrPortFrom(from.Addr().Unmap(), from.Port())) != nil {
			return nil // only the end of ctx
		}
	}
}
