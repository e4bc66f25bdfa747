package send

import (
	"bufio"
	"context"
	"io"
	"net"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"beamward/alerts"
)

// header is RFC 5424's, section 6: PRI VERSION TIMESTAMP HOSTNAME APP-NAME
// PROCID MSGID, then one structured element, then the message with its BOM.
var header = regexp.MustCompile(`^<(\d{1,3})>1 \d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{6}Z [!-~]{1,255} beamward - [!-~]{1,32} \[beamward@32473( [a-z]{1,32}="(?:[^"\]\\]|\\["\]\\])*")*\] \x{FEFF}[^\x00-\x1f]*$`)

func syslogFor(t *testing.T, network, address string) *Syslog {
	t.Helper()
	s, err := NewSyslog(SyslogOptions{Network: network, Address: address, Host: "peak host", Timeout: 2 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestSyslogLine(t *testing.T) {
	s := syslogFor(t, "udp", "127.0.0.1:514")
	m := message()
	line := string(s.line(m))
	if !header.MatchString(line) {
		t.Errorf("not after RFC 5424: %q", line)
	}
	if !strings.HasPrefix(line, "<129>1 2031-02-14T20:00:00.000000Z peak_host beamward - shutter-fault [") { // local0 is 16, alert 1: 129
		t.Errorf("head: %q", line)
	}
	m.Subject = `a"b]c\d`
	if line := string(s.line(m)); !header.MatchString(line) || !strings.Contains(line, `subject="a\"b\]c\\d"`) {
		t.Errorf("escapes: %q", line)
	}
	for want, o := range map[string]*alerts.Message{
		"<130>1 ": {Kind: alerts.Fault, Priority: alerts.High, State: alerts.Unacknowledged},
		"<132>1 ": {Kind: alerts.DiskLow, Priority: alerts.Medium, State: alerts.Unacknowledged},
		"<133>1 ": {Kind: alerts.NotReady, Priority: alerts.Low, State: alerts.Unacknowledged},
		"<134>1 ": {What: alerts.Notice},
	} {
		if line := string(s.line(o)); !strings.HasPrefix(line, want) || !header.MatchString(line) {
			t.Errorf("%q, want %s", line, want)
		}
	}
	if got := field("", 5) + field("a b\x00é-long", 5); got != "-a_b__" {
		t.Errorf("fields: %q", got)
	}
}

func TestSyslogUDP(t *testing.T) {
	c, err := net.ListenPacket("udp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = c.Close() }()
	m := message()
	m.Detail = strings.Repeat("é", 2000)
	if err := syslogFor(t, "udp", c.LocalAddr().String()).Send(context.Background(), m); err != nil {
		t.Fatal(err)
	}
	b := make([]byte, 65536)
	_ = c.SetReadDeadline(time.Now().Add(5 * time.Second))
	n, _, err := c.ReadFrom(b)
	if err != nil || n > mostDatagram || !utf8.Valid(b[:n]) || !header.Match(b[:n]) {
		t.Errorf("%d bytes, %v", n, err)
	}
}

// collect takes one connection after another and reads what RFC 6587 counts.
func collect(t *testing.T, slow bool) (address string, got <-chan string) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = l.Close() })
	lines := make(chan string, 10)
	go func() {
		for {
			c, err := l.Accept()
			if err != nil {
				return
			}
			r := bufio.NewReader(c)
			size, _ := r.ReadString(' ')
			n, _ := strconv.Atoi(strings.TrimSpace(size))
			b := make([]byte, n)
			_, _ = io.ReadFull(r, b)
			lines <- string(b)
			if !slow {
				_ = c.Close()
			}
		}
	}()
	return l.Addr().String(), lines
}

func TestSyslogTCP(t *testing.T) {
	for _, slow := range []bool{false, true} { // a receiver that keeps the connection is believed
		address, got := collect(t, slow)
		if err := syslogFor(t, "tcp", address).Send(context.Background(), message()); err != nil {
			t.Fatal(err)
		}
		if line := <-got; !header.MatchString(line) || !strings.HasSuffix(line, "one stop") {
			t.Errorf("%q", line)
		}
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	address := l.Addr().String()
	_ = l.Close()
	if err := syslogFor(t, "tcp", address).Send(context.Background(), message()); err == nil {
		t.Error("nobody listens, and it was sent")
	}
}

// A receiver that resets the connection did not take the message.
func TestSyslogReset(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = l.Close() }()
	go func() {
		c, err := l.Accept()
		if err != nil {
			return
		}
		var one [1]byte
		_, _ = io.ReadFull(c, one[:])
		_ = c.(*net.TCPConn).SetLinger(0)
		_ = c.Close()
	}()
	if err := syslogFor(t, "tcp", l.Addr().String()).Send(context.Background(), message()); err == nil {
		t.Error("the connection was reset, and it was sent")
	}
}

func TestSyslogRefusals(t *testing.T) {
	for _, o := range []SyslogOptions{
		{Network: "unix", Address: "127.0.0.1:514"}, {Network: "udp", Address: "127.0.0.1"}, {Network: "udp", Address: ":514"}, {Network: "tcp", Address: "a b:514"}, {Network: "tcp", Address: "169.254.169.254:514"},
	} {
		if _, err := NewSyslog(o); err == nil {
			t.Errorf("taken: %+v", o)
		}
	}
	s, err := NewSyslog(SyslogOptions{Network: "tcp", Address: "localhost:514"})
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Send(context.Background(), message()); err == nil {
		t.Error("a name of this machine was dialled")
	}
}
