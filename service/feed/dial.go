package feed

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"time"
)

// How long to wait before an address is called again: doubled each time, and
// spread by the jitter from half to one and a half times that.
const (
	redialFirst = 500 * time.Millisecond
	redialMost  = 30 * time.Second
	dialLimit   = 5 * time.Second
)

func (m *ModeS) pause(failed int) time.Duration {
	spread := 0.5
	if m.options.Jitter != nil {
		if j := m.options.Jitter(); j >= 0 && j < 1 {
			spread = j
		}
	}
	d := redialMost
	if failed < 6 {
		d = min(redialFirst<<failed, redialMost)
	}
	return time.Duration(float64(d) * (0.5 + spread))
}

// redial keeps a connection until ctx ends.
func (m *ModeS) redial(ctx context.Context) error {
	m.start()
	dialer := net.Dialer{Timeout: dialLimit, KeepAliveConfig: net.KeepAliveConfig{Enable: true, Idle: 15 * time.Second, Interval: 5 * time.Second, Count: 3}}
	for failed := 0; ; failed++ {
		c, err := dialer.DialContext(ctx, "tcp", m.options.Dial)
		if err == nil {
			before := m.Counts().Proven
			err = m.connected(ctx, c)
			if m.Counts().Proven > before {
				failed = 0
			}
		}
		if ctx.Err() != nil {
			return nil
		}
		what := printable([]byte(err.Error()), 2*shownBytes)
		m.setTrouble(what)
		m.notice("a receiver is not connected", "dial", m.options.Dial, "what", what)
		if sleep(ctx, m.desk.options.Clock, m.pause(failed)) != nil {
			return nil
		}
	}
}

// readEvery bounds how long a read may wait, so that a process that was
// stopped is told from a receiver that is quiet.
const readEvery = 200 * time.Millisecond

var errStalled = errors.New("frames were not read for too long: what waits is thrown away")

// connected reads one connection to its end.
func (m *ModeS) connected(ctx context.Context, c net.Conn) error {
	defer c.Close()
	stop := context.AfterFunc(ctx, func() { _ = c.Close() })
	defer stop()
	m.connections.Add(1)
	m.open.Store(1)
	defer m.open.Store(0)
	m.setTrouble("")
	if t, ok := c.(*net.TCPConn); ok {
		_ = t.SetReadBuffer(receiveBuffer)
	}
	s := m.frames(c.RemoteAddr().String())
	var lines cutter
	buf := make([]byte, 1<<15)
	last := m.desk.options.Clock.Boot()
	for {
		if err := c.SetReadDeadline(time.Now().Add(readEvery)); err != nil {
			return err
		}
		n, err := c.Read(buf)
		now := m.desk.options.Clock.Boot()
		late := now - last
		last = now
		if n > 0 {
			// What came may have come at any time since the last read.
			if late > m.options.Stall {
				return errStalled
			}
			if err := lines.cut(buf[:n], func(text []byte, long bool) error { return s.take(ctx, text, long) }); err != nil {
				return err
			}
		}
		switch {
		case err == nil, errors.Is(err, os.ErrDeadlineExceeded):
		case errors.Is(err, io.EOF):
			return errors.New("the receiver ended the connection")
		default:
			return fmt.Errorf("read: %w", err)
		}
	}
}
