package feed

import (
	"context"
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/tls"
	"crypto/x509"
	"crypto/x509/pkix"
	"errors"
	"fmt"
	"io"
	"math/big"
	"net"
	"net/netip"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"beamward/closures"
)

// bench is a running TCP feed.
type bench struct {
	*TCP
	in      *inbox
	told    *notices
	stop    func()
	stopped chan error
}

func startTCP(t *testing.T, change func(*TCPOptions)) *bench {
	t.Helper()
	b := &bench{in: newInbox(), told: &notices{}, stopped: make(chan error, 1)}
	o := TCPOptions{Listen: "127.0.0.1:0", Admits: AdmitAnyone}
	o.Options = Options{Intake: b.in.take, Clock: newWallClock(), Notice: b.told.tell, Bound: []Bound{{Name: "catwalk"}, {Name: "rx-1", Aircraft: true}}}
	if change != nil {
		change(&o)
	}
	f, err := ListenTCP(o)
	if err != nil {
		t.Fatal(err)
	}
	b.TCP = f
	ctx, cancel := context.WithCancel(t.Context())
	go func() { b.stopped <- f.Run(ctx) }()
	done := false
	b.stop = func() {
		cancel()
		if !done {
			if err := <-b.stopped; err != nil {
				t.Errorf("run: %v", err)
			}
		}
		done = true
	}
	t.Cleanup(b.stop)
	return b
}

func (b *bench) dial(t *testing.T) net.Conn {
	t.Helper()
	c, err := net.Dial("tcp", b.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return c
}

func say(t *testing.T, c net.Conn, lines ...string) {
	t.Helper()
	if _, err := io.WriteString(c, strings.Join(lines, "\n")+"\n"); err != nil {
		t.Fatal(err)
	}
}

// A bad line is refused with its number and cause, counted, and the connection
// lives.
func TestBadLineLeavesTheConnection(t *testing.T) {
	b := startTCP(t, nil)
	c := b.dial(t)
	say(t, c, interlockLine("catwalk"), `{"kind":"interlock"`, "", "\r", interlockLine("catwalk")+"\r")
	for range 2 {
		h := b.in.next(t)
		if f, ok := h.body.(closures.InterlockSeen); h.from != "catwalk" || !ok || !f.Safe {
			t.Errorf("got %+v", h)
		}
	}
	until(t, "all are counted", func() bool { return b.Stats().Accepted == 2 })
	s := b.Stats()
	if s.Accepted != 2 || s.Refused != 1 || s.Lines != 3 || s.Open != 1 || s.Connections != 1 || len(s.Refusals) != 1 {
		t.Fatalf("stats: %+v", s)
	}
	r := s.Refusals[0]
	if r.Line != 2 || r.From != c.LocalAddr().String() || r.Text != `{\"kind\":\"interlock\"` || !strings.HasPrefix(r.Cause, "fact: ") {
		t.Errorf("refusal: %+v", r)
	}
}

// BW-026: a line that names a source to which the listener is not bound is
// refused.
func TestBoundSources(t *testing.T) {
	b := startTCP(t, nil)
	c := b.dial(t)
	say(t, c, interlockLine("hatch"), aircraftLine("rx-2", "a1b2c3"), interlockLine("catwalk"))
	if h := b.in.next(t); h.from != "catwalk" {
		t.Errorf("got %+v", h)
	}
	if s := b.Stats(); s.Refused != 2 || !strings.Contains(s.Refusals[0].Cause, "not bound") {
		t.Errorf("stats: %+v", s)
	}
}

// The first fact of an aircraft source on each connection is preceded by the
// word that its reception starts again; other sources have no warm-up.
func TestReceptionStartsAgainOnEachConnection(t *testing.T) {
	b := startTCP(t, nil)
	for range 2 {
		c := b.dial(t)
		say(t, c, interlockLine("catwalk"), aircraftLine("rx-1", "a1b2c3"), aircraftLine("rx-1", "a1b2c4"))
		if _, ok := b.in.next(t).body.(closures.InterlockSeen); !ok {
			t.Fatal("no interlock")
		}
		h := b.in.next(t)
		if f, ok := h.body.(closures.Heard); h.from != "rx-1" || !ok || !f.Connected || f.Source != "rx-1" || f.Scope != closures.HeardLink {
			t.Fatalf("got %+v", h)
		}
		for _, want := range []string{"a1b2c3", "a1b2c4"} {
			if f, ok := b.in.next(t).body.(closures.AircraftSeen); !ok || f.Aircraft != want {
				t.Fatalf("got %+v", f)
			}
		}
		c.Close()
	}
	b.in.none(t)
}

// While intake is full nothing is lost, and nothing overtakes: the same fact
// is tried again, the word that reception starts again too.
func TestFullIntakeIsWaitedFor(t *testing.T) {
	b := startTCP(t, nil)
	b.in.answer(errFull, 3)
	c := b.dial(t)
	say(t, c, aircraftLine("rx-1", "a1b2c3"), interlockLine("catwalk"))
	if f, ok := b.in.next(t).body.(closures.Heard); !ok || !f.Connected {
		t.Errorf("got %+v", f)
	}
	if _, ok := b.in.next(t).body.(closures.AircraftSeen); !ok {
		t.Error("no aircraft")
	}
	if _, ok := b.in.next(t).body.(closures.InterlockSeen); !ok {
		t.Error("no interlock")
	}
	until(t, "all are counted", func() bool { return b.Stats().Accepted == 2 })
	if s := b.Stats(); s.Waited != 1 || s.Refused != 0 || s.Dropped != 0 || s.Accepted != 2 {
		t.Errorf("stats: %+v", s)
	}
}

func TestStopWhileIntakeIsFull(t *testing.T) {
	b := startTCP(t, nil)
	b.in.answer(errFull, 1<<16)
	c := b.dial(t)
	say(t, c, interlockLine("catwalk"))
	until(t, "it waits", func() bool { return b.Stats().Waited == 1 })
	b.stop()
	if _, err := c.Read(make([]byte, 1)); err == nil {
		t.Error("the connection lives on")
	}
	b.in.none(t)
}

// What intake refuses for good is a refused line.
func TestRefusedByIntake(t *testing.T) {
	b := startTCP(t, nil)
	b.in.answer(closures.Errorf(closures.NotFound, "name a configured source", "source: not configured"), 1)
	say(t, b.dial(t), interlockLine("catwalk"), interlockLine("catwalk"))
	b.in.next(t)
	until(t, "all are counted", func() bool { return b.Stats().Accepted == 1 })
	if s := b.Stats(); s.Refused != 1 || s.Accepted != 1 || s.Refusals[0].Cause != "source: not configured: name a configured source" {
		t.Errorf("stats: %+v", s)
	}
}

func TestLongLine(t *testing.T) {
	b := startTCP(t, nil)
	c := b.dial(t)
	for _, n := range []int{64 << 10, 64<<10 + 1, 64<<10 + 2, 200 << 10} {
		say(t, c, strings.Repeat("x", n))
	}
	say(t, c, interlockLine("catwalk"))
	b.in.next(t)
	s := b.Stats()
	if s.Refused != 4 || s.Lines != 5 {
		t.Fatalf("stats: %+v", s)
	}
	for i, r := range s.Refusals {
		if long := strings.Contains(r.Cause, "longer than 65536"); long != (i > 0) || r.Line != uint64(i+1) || len(r.Text) > 100 {
			t.Errorf("refusal %d: %+v", i, r)
		}
	}
}

// A fact behind which the connection ends without a line end counts if it is
// whole.
func TestLastLineWithoutItsEnd(t *testing.T) {
	b := startTCP(t, nil)
	line := interlockLine("catwalk")
	c := b.dial(t)
	io.WriteString(c, line)
	c.Close()
	b.in.next(t)
	c = b.dial(t)
	io.WriteString(c, line[:len(line)-1])
	c.Close()
	until(t, "the half is refused", func() bool { return b.Stats().Refused == 1 })
	b.in.none(t)
}

func TestKeptRefusalsAreTheLastOnesAndPrintable(t *testing.T) {
	b := startTCP(t, nil)
	c := b.dial(t)
	for i := range 30 {
		say(t, c, fmt.Sprintf("\x1b[31m%d\xff", i))
	}
	say(t, c, `{"token":"very secret"}`, interlockLine("catwalk"))
	b.in.next(t)
	s := b.Stats()
	if s.Refused != 31 || len(s.Refusals) != 20 {
		t.Fatalf("%d refused, %d kept", s.Refused, len(s.Refusals))
	}
	for i, r := range s.Refusals {
		want := fmt.Sprintf(`\x1b[31m%d\xff`, i+11)
		if i == 19 {
			want = ""
		}
		if r.Text != want || r.Line != uint64(i+12) {
			t.Errorf("refusal %d: %+v", i, r)
		}
	}
	if n := b.told.count(); n != 1 {
		t.Errorf("operators were told %d times of one kind of thing at once", n)
	}
	if strings.Contains(fmt.Sprint(s.Refusals)+b.told.text(), "secret") {
		t.Error("a token is shown")
	}
}

func TestTooManyConnections(t *testing.T) {
	b := startTCP(t, func(o *TCPOptions) { o.Most = 2 })
	one, two := b.dial(t), b.dial(t)
	say(t, one, interlockLine("catwalk"))
	say(t, two, interlockLine("catwalk"))
	b.in.next(t)
	b.in.next(t)
	three := b.dial(t)
	if _, err := three.Read(make([]byte, 1)); err == nil {
		t.Error("a third connection lives")
	}
	one.Close()
	until(t, "there is room again", func() bool { return b.Stats().Open == 1 })
	say(t, b.dial(t), interlockLine("catwalk"))
	b.in.next(t)
	if s := b.Stats(); s.TurnedAway != 1 || s.Connections != 3 {
		t.Errorf("stats: %+v", s)
	}
}

// A line must come within its time, even if bytes of it do.
func TestSlowLineEndsTheConnection(t *testing.T) {
	b := startTCP(t, func(o *TCPOptions) { o.Idle = 50 * time.Millisecond })
	c := b.dial(t)
	go func() {
		for {
			if _, err := c.Write([]byte(" ")); err != nil {
				return
			}
			time.Sleep(5 * time.Millisecond)
		}
	}()
	until(t, "it is closed", func() bool { s := b.Stats(); return s.Connections == 1 && s.Open == 0 })
	b.in.none(t)
}

// people is who may sign in.
type people struct {
	tokens  map[string]*speaker
	revoked atomic.Bool
	cert    *speaker
}

type speaker struct {
	names []closures.Source
	of    *people
}

func (s *speaker) MaySpeakFor(n closures.Source) bool {
	for _, o := range s.names {
		if o == n {
			return true
		}
	}
	return false
}

func (s *speaker) Still() bool { return !s.of.revoked.Load() }

func (p *people) Token(from netip.Addr, token string) (Speaker, error) {
	if s := p.tokens[token]; s != nil && from.IsLoopback() {
		return s, nil
	}
	return nil, errors.New("nobody holds this token")
}

func (p *people) Certificate(_ netip.Addr, state tls.ConnectionState) (Speaker, error) {
	if len(state.VerifiedChains) > 0 && state.VerifiedChains[0][0].Subject.CommonName == "rx" {
		return p.cert, nil
	}
	return nil, nil
}

func newPeople() *people {
	p := &people{}
	p.tokens = map[string]*speaker{"good": {names: []closures.Source{"catwalk", "elsewhere"}, of: p}}
	p.cert = &speaker{names: []closures.Source{"rx-1"}, of: p}
	return p
}

func TestAdmittedByToken(t *testing.T) {
	p := newPeople()
	b := startTCP(t, func(o *TCPOptions) { o.Admits, o.Access = AdmitToken, p })
	c := b.dial(t)
	say(t, c, `{"token":"good"}`, interlockLine("catwalk"), aircraftLine("rx-1", "a1b2c3"), interlockLine("elsewhere"), interlockLine("catwalk"))
	b.in.next(t)
	b.in.next(t)
	until(t, "all are counted", func() bool { return b.Stats().Accepted == 2 })
	if s := b.Stats(); s.Refused != 2 || s.Accepted != 2 {
		t.Errorf("stats: %+v", s)
	}
	for i, first := range []string{`{"token":"bad"}`, `{"token":null}`, `{"Token":"good"}`, `{"token":"good","token":"good"}`, `{"token":"good"} `, interlockLine("catwalk"), ""} {
		c := b.dial(t)
		say(t, c, first, interlockLine("catwalk"))
		if first == `{"token":"good"} ` {
			b.in.next(t) // blanks around JSON mean nothing
			continue
		}
		if _, err := c.Read(make([]byte, 1)); err == nil {
			t.Errorf("%d: let in", i)
		}
	}
	b.in.none(t)
	if s := b.Stats(); s.TurnedAway != 6 {
		t.Errorf("stats: %+v", s)
	}
	if told := b.told.text(); strings.Contains(told, "good") || strings.Contains(told, `"bad`) {
		t.Errorf("a token is told: %s", told)
	}
}

// A token that is revoked ends its connections.
func TestRevokedTokenEndsTheConnection(t *testing.T) {
	p := newPeople()
	b := startTCP(t, func(o *TCPOptions) { o.Admits, o.Access = AdmitToken, p })
	c := b.dial(t)
	say(t, c, `{"token":"good"}`, interlockLine("catwalk"))
	b.in.next(t)
	p.revoked.Store(true)
	until(t, "it is closed", func() bool {
		_, err := io.WriteString(c, interlockLine("catwalk")+"\n")
		return err != nil
	})
}

// authority signs certificates for these tests.
type authority struct {
	key  *ecdsa.PrivateKey
	cert *x509.Certificate
}

func newAuthority(t *testing.T) *authority {
	t.Helper()
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	c := &x509.Certificate{SerialNumber: big.NewInt(1), Subject: pkix.Name{CommonName: "ca"}, NotAfter: time.Now().Add(time.Hour),
		IsCA: true, BasicConstraintsValid: true, KeyUsage: x509.KeyUsageCertSign}
	der, err := x509.CreateCertificate(rand.Reader, c, c, &key.PublicKey, key)
	if err != nil {
		t.Fatal(err)
	}
	c, err = x509.ParseCertificate(der)
	if err != nil {
		t.Fatal(err)
	}
	return &authority{key, c}
}

func (a *authority) issue(t *testing.T, name string) tls.Certificate {
	t.Helper()
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	c := &x509.Certificate{SerialNumber: big.NewInt(2), Subject: pkix.Name{CommonName: name}, NotAfter: time.Now().Add(time.Hour),
		IPAddresses: []net.IP{net.IPv4(127, 0, 0, 1)}, ExtKeyUsage: []x509.ExtKeyUsage{x509.ExtKeyUsageClientAuth, x509.ExtKeyUsageServerAuth}}
	der, err := x509.CreateCertificate(rand.Reader, c, a.cert, &key.PublicKey, a.key)
	if err != nil {
		t.Fatal(err)
	}
	return tls.Certificate{Certificate: [][]byte{der}, PrivateKey: key}
}

func (a *authority) pool() *x509.CertPool {
	p := x509.NewCertPool()
	p.AddCert(a.cert)
	return p
}

func TestAdmittedByCertificate(t *testing.T) {
	ours, foreign, p := newAuthority(t), newAuthority(t), newPeople()
	b := startTCP(t, func(o *TCPOptions) {
		o.Admits, o.Access = AdmitCertificate, p
		o.TLS = &tls.Config{Certificates: []tls.Certificate{ours.issue(t, "server")}, ClientCAs: ours.pool()}
	})
	dial := func(certs ...tls.Certificate) *tls.Conn {
		c := tls.Client(b.dial(t), &tls.Config{RootCAs: ours.pool(), ServerName: "127.0.0.1", Certificates: certs})
		if err := c.Handshake(); err != nil {
			return nil
		}
		return c
	}
	c := dial(ours.issue(t, "rx"))
	say(t, c, interlockLine("catwalk"), aircraftLine("rx-1", "a1b2c3"))
	b.in.next(t)
	if f, ok := b.in.next(t).body.(closures.AircraftSeen); !ok || f.Aircraft != "a1b2c3" {
		t.Errorf("got %+v", f)
	}
	if s := b.Stats(); s.Refused != 1 {
		t.Errorf("stats: %+v", s)
	}
	for name, c := range map[string]*tls.Conn{"none": dial(), "a foreign one": dial(foreign.issue(t, "rx")), "nobody's": dial(ours.issue(t, "someone"))} {
		if c == nil {
			continue
		}
		io.WriteString(c, aircraftLine("rx-1", "a1b2c4")+"\n")
		if _, err := c.Read(make([]byte, 1)); err == nil {
			t.Errorf("%s: let in", name)
		}
	}
	plain := b.dial(t)
	say(t, plain, aircraftLine("rx-1", "a1b2c4"))
	io.ReadAll(plain)
	until(t, "all are turned away", func() bool { return b.Stats().TurnedAway == 4 })
	b.in.none(t)
}

func TestTCPOptionsThatCannotBe(t *testing.T) {
	good := Options{Bound: []Bound{{Name: "a"}}, Intake: newInbox().take, Clock: newWallClock()}
	for name, o := range map[string]TCPOptions{
		"no access":                {Options: good, Listen: "127.0.0.1:0", Admits: AdmitToken},
		"the zero admission":       {Options: good, Listen: "127.0.0.1:0"},
		"certificates, no TLS":     {Options: good, Listen: "127.0.0.1:0", Admits: AdmitCertificate, Access: newPeople()},
		"bound to nothing":         {Options: Options{Intake: good.Intake, Clock: good.Clock}, Listen: "127.0.0.1:0", Admits: AdmitAnyone},
		"bound to what is no name": {Options: Options{Intake: good.Intake, Clock: good.Clock, Bound: []Bound{{Name: "a b"}}}, Listen: "127.0.0.1:0", Admits: AdmitAnyone},
		"bound twice":              {Options: Options{Intake: good.Intake, Clock: good.Clock, Bound: []Bound{{Name: "a"}, {Name: "a"}}}, Listen: "127.0.0.1:0", Admits: AdmitAnyone},
		"no intake":                {Options: Options{Clock: good.Clock, Bound: good.Bound}, Listen: "127.0.0.1:0", Admits: AdmitAnyone},
		"anyone, anywhere":         {Options: good, Listen: ":0", Admits: AdmitAnyone},
		"no address":               {Options: good, Listen: "nowhere:nothing:", Admits: AdmitAnyone},
	} {
		if f, err := ListenTCP(o); err == nil {
			f.Close()
			t.Errorf("%s: made", name)
		}
	}
	f, err := ListenTCP(TCPOptions{Options: good, Listen: "127.0.0.1:0", Admits: AdmitAnyone})
	if err != nil {
		t.Fatal(err)
	}
	if err := errors.Join(f.Close(), f.Close()); err != nil {
		t.Error(err)
	}
}
