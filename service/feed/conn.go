package feed

import (
	"context"
	"crypto/tls"
	"errors"
	"io"
	"net"
	"net/netip"
	"time"

	"beamward/closures/wire"
)

// stillEvery is how often a connection's person is asked about again.
const stillEvery = 500 * time.Millisecond

// receiveBuffer is what the kernel may hold for one connection: a sender that
// is not read feels it soon.
const receiveBuffer = 256 << 10

// serve reads one connection to its end.
func (t *TCP) serve(ctx context.Context, raw *net.TCPConn) {
	_ = raw.SetReadBuffer(receiveBuffer) // the kernel's own size will do
	var c net.Conn = raw
	if t.options.TLS != nil {
		c = tls.Server(raw, t.options.TLS)
	}
	// Closing the socket ends a read at once; TLS's own close would wait for
	// the peer.
	stop := context.AfterFunc(ctx, func() { _ = raw.Close() })
	defer stop()
	defer raw.Close()
	from := raw.RemoteAddr().String()
	lines := newLineReader(c)
	_ = c.SetDeadline(time.Now().Add(t.options.Handshake)) // a closed connection says so when read
	who, err := t.admit(ctx, c, lines)
	if err != nil {
		if ctx.Err() == nil {
			t.turnedAway.Add(1)
			t.notice("a connection is turned away", "from", from, "cause", printable([]byte(err.Error()), 4*shownBytes))
		}
		return
	}
	s := t.sender(from, true)
	if who != nil {
		s.may = who.MaySpeakFor
	}
	if err := t.read(ctx, c, lines, s, who); err != nil && ctx.Err() == nil {
		t.notice("a connection ended", "from", from, "lines", s.n, "cause", printable([]byte(err.Error()), 4*shownBytes))
	}
}

// admit asks a connection who it is. Nil and no error: nobody is asked.
func (t *TCP) admit(ctx context.Context, c net.Conn, lines *lineReader) (Speaker, error) {
	from := addressOf(c)
	if secure, ok := c.(*tls.Conn); ok {
		if err := secure.HandshakeContext(ctx); err != nil {
			return nil, err
		}
		if t.options.Admits == AdmitCertificate {
			return certain(t.options.Access.Certificate(from, secure.ConnectionState()))
		}
	}
	if t.options.Admits == AdmitAnyone {
		return nil, nil
	}
	line, err := lines.next()
	if err != nil {
		return nil, err
	}
	var first struct {
		Token *string `json:"token"`
	}
	if len(line) > shortLine || wire.Strict(line, &first) != nil || first.Token == nil {
		return nil, errors.New(`the first line is not {"token":"..."}`)
	}
	return certain(t.options.Access.Token(from, *first.Token))
}

// shortLine is more than a line with a token takes.
const shortLine = 512

// certain turns nobody without an error into an error.
func certain(who Speaker, err error) (Speaker, error) {
	if err == nil && who == nil {
		err = errors.New("it stands for nobody here")
	}
	return who, err
}

var errRevoked = errors.New("its token or certificate holds no longer")

func (t *TCP) read(ctx context.Context, c net.Conn, lines *lineReader, s *sender, who Speaker) error {
	asked := t.options.Clock.Boot()
	for {
		// Each line has its time, however it trickles in.
		if err := c.SetDeadline(time.Now().Add(t.options.Idle)); err != nil {
			return err
		}
		line, err := lines.next()
		switch {
		case errors.Is(err, errLong):
			s.tooLong(line)
			continue
		case errors.Is(err, io.EOF):
			// A fact is one JSON object, which shows whether it is whole.
			return s.fact(ctx, line)
		case err != nil:
			return err
		}
		if now := t.options.Clock.Boot(); who != nil && now-asked >= stillEvery {
			if !who.Still() {
				return errRevoked
			}
			asked = now
		}
		if err := s.fact(ctx, line); err != nil {
			return err
		}
	}
}

func addressOf(c net.Conn) netip.Addr {
	if a, ok := c.RemoteAddr().(*net.TCPAddr); ok {
		return a.AddrPort().Addr().Unmap()
	}
	return netip.Addr{}
}
