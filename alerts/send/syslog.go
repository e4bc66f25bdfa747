package send

import (
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"strconv"
	"strings"
	"time"
	"unicode/utf8"

	"beamward/alerts"
)

// SyslogOptions are what a syslog receiver is made from. Network and Address
// are needed.
type SyslogOptions struct {
	Network string // udp (RFC 5426), tcp (RFC 6587, octet counting) or tls (RFC 5425)
	Address string // host:port
	Host    string // of the messages; empty: this machine's name
	Timeout time.Duration
	TLS     *tls.Config
}

// Syslog sends messages after RFC 5424, facility local0. The protocol
// acknowledges nothing: by tcp and tls a message counts as taken when the
// connection was closed in order after it, by udp when it left.
type Syslog struct {
	network, address, host string
	timeout                time.Duration
	dialer                 *net.Dialer
	trust                  *tls.Config
}

// mostDatagram is the size that receivers of RFC 5426 should take.
const mostDatagram = 2048

// NewSyslog makes the receiver, or says what is wrong with its options.
func NewSyslog(o SyslogOptions) (*Syslog, error) {
	host, err := address(o.Address)
	if err != nil {
		return nil, fmt.Errorf("syslog: %w", err)
	}
	if o.Network != "udp" && o.Network != "tcp" && o.Network != "tls" {
		return nil, fmt.Errorf("syslog: network %.16q: use udp, tcp or tls", o.Network)
	}
	if o.Timeout <= 0 {
		o.Timeout = Timeout
	}
	dialer, err := guarded(host, o.Timeout)
	if err != nil {
		return nil, fmt.Errorf("syslog: %w", err)
	}
	if o.Host == "" {
		o.Host, _ = os.Hostname() // unknown is "-"
	}
	trust := &tls.Config{MinVersion: tls.VersionTLS12}
	if o.TLS != nil {
		trust = o.TLS.Clone()
	}
	if trust.ServerName == "" {
		trust.ServerName = host
	}
	return &Syslog{network: o.Network, address: o.Address, host: field(o.Host, 255), timeout: o.Timeout, dialer: dialer, trust: trust}, nil
}

// Severities of RFC 5424.
const (
	facility   = 16 // local0
	alertNow   = 1
	critical   = 2
	warning    = 4
	noteworthy = 5
	inform     = 6
)

func severity(m *alerts.Message) int {
	standing := m.State == alerts.Unacknowledged || m.State == alerts.Acknowledged
	switch {
	case !standing || m.What == alerts.Acked:
		return inform
	case m.Kind == alerts.ShutterFault:
		return alertNow
	case m.Priority == alerts.High:
		return critical
	case m.Priority == alerts.Medium:
		return warning
	case m.Priority == alerts.Low:
		return noteworthy
	}
	return inform
}

// field makes text fit for a field of the header: printable ASCII, without
// spaces, of bounded length, "-" for nothing.
func field(s string, most int) string {
	s = strings.Map(func(r rune) rune {
		if r > ' ' && r <= '~' {
			return r
		}
		return '_'
	}, s)
	if s == "" {
		return "-"
	}
	return s[:min(len(s), most)]
}

// line writes a message after RFC 5424. The number of the structured data's
// name is the one that is reserved for documentation (RFC 5612).
func (s *Syslog) line(m *alerts.Message) []byte {
	kind := string(m.Kind)
	if kind == "" {
		kind = m.What.String()
	}
	var b strings.Builder
	fmt.Fprintf(&b, "<%d>1 %s %s beamward - %s [beamward@32473", facility*8+severity(m), m.At.UTC().Format("2006-01-02T15:04:05.000000Z"), s.host, field(kind, 32))
	escape := strings.NewReplacer(`\`, `\\`, `"`, `\"`, `]`, `\]`)
	for _, p := range [][2]string{{"id", m.ID}, {"what", m.What.String()}, {"subject", m.Subject}, {"priority", m.Priority.String()}, {"state", m.State.String()}, {"by", m.By}} {
		if p[1] != "" {
			b.WriteString(" " + p[0] + `="` + escape.Replace(p[1]) + `"`)
		}
	}
	b.WriteString("] \ufeff" + m.Title)
	for _, text := range []string{m.Detail, m.Do} {
		if text != "" {
			b.WriteString(" " + text)
		}
	}
	return []byte(b.String())
}

// Send sends one message.
func (s *Syslog) Send(ctx context.Context, m *alerts.Message) error {
	line := s.line(m)
	ctx, cancel := context.WithTimeout(ctx, s.timeout)
	defer cancel()
	network := s.network
	if network == "tls" {
		network = "tcp"
	}
	c, err := s.dialer.DialContext(ctx, network, s.address)
	if err != nil {
		return fmt.Errorf("sending to syslog: %w", err)
	}
	defer func() { _ = c.Close() }()
	deadline, _ := ctx.Deadline()
	if err := c.SetDeadline(deadline); err != nil {
		return fmt.Errorf("sending to syslog: %w", err)
	}
	if s.network == "udp" {
		for len(line) > mostDatagram || !utf8.Valid(line) {
			line = line[:min(len(line)-1, mostDatagram)]
		}
		_, err = c.Write(line)
	} else {
		err = s.stream(ctx, c, line)
	}
	if err != nil {
		return fmt.Errorf("sending to syslog: %w", err)
	}
	return nil
}

// quiet is how long a receiver that does not close is waited for.
const quiet = time.Second

// stream sends a line with its length before it, says that no more comes, and
// waits for the other side to close. One that resets the connection did not
// take it; one that only stays silent is believed.
func (s *Syslog) stream(ctx context.Context, c net.Conn, line []byte) error {
	if s.network == "tls" {
		t := tls.Client(c, s.trust)
		if err := t.HandshakeContext(ctx); err != nil {
			return err
		}
		c = t
	}
	if _, err := c.Write(append([]byte(strconv.Itoa(len(line))+" "), line...)); err != nil {
		return err
	}
	half, ok := c.(interface{ CloseWrite() error })
	if !ok {
		return nil
	}
	if err := half.CloseWrite(); err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, quiet)
	defer cancel()
	until, _ := ctx.Deadline()
	if err := c.SetReadDeadline(until); err != nil {
		return err
	}
	var b [512]byte
	for n := 0; n < mostAnswer; {
		k, err := c.Read(b[:])
		n += k
		var slow net.Error
		switch {
		case errors.Is(err, io.EOF), errors.As(err, &slow) && slow.Timeout():
			return nil
		case err != nil:
			return err
		}
	}
	return nil
}
