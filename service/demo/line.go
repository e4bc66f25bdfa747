package demo

import (
	"context"
	"fmt"
	"net"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// line is a connection to a feed over TCP.
type line struct {
	addr string
	c    net.Conn // nil: not connected
	out  []byte
}

func (l *line) connect(ctx context.Context) error {
	if l.c != nil {
		return nil
	}
	d := net.Dialer{Timeout: patience}
	c, err := d.DialContext(ctx, "tcp", l.addr)
	if err != nil {
		return fmt.Errorf("connecting to the feed at %s: %w", l.addr, err)
	}
	l.c = c
	return nil
}

func (l *line) hangUp() error {
	if l.c == nil {
		return nil
	}
	err := l.c.Close()
	l.c, l.out = nil, nil
	return err
}

// put adds a fact to what is sent next.
func (l *line) put(b closures.Body) error {
	out, err := wire.AppendFact(l.out, b)
	if err != nil {
		return err
	}
	l.out = append(out, '\n')
	return nil
}

func (l *line) send() error {
	if l.c == nil || len(l.out) == 0 {
		return nil
	}
	if err := l.c.SetWriteDeadline(time.Now().Add(patience)); err != nil {
		return err
	}
	_, err := l.c.Write(l.out)
	l.out = l.out[:0]
	if err != nil {
		return fmt.Errorf("sending facts to %s: %w", l.addr, err)
	}
	return nil
}

// ndjson writes facts one a line, as they are posted.
func ndjson(bodies []closures.Body) ([]byte, error) {
	var out []byte
	var err error
	for _, b := range bodies {
		if out, err = wire.AppendFact(out, b); err != nil {
			return nil, err
		}
		out = append(out, '\n')
	}
	return out, nil
}
