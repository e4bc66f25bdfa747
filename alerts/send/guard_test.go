package send

import (
	"context"
	"crypto/tls"
	"crypto/x509"
	"errors"
	"io"
	"log"
	"net"
	"net/http"
	"net/http/httptest"
	"net/netip"
	"strings"
	"testing"
)

func TestWhereNamesMayLead(t *testing.T) {
	for _, c := range []struct {
		address string
		public  bool
	}{
		{"93.184.216.34", true}, {"8.8.8.8", true}, {"2606:4700:4700::1111", true}, {"100.128.0.1", true}, {"172.32.0.1", true}, {"198.20.0.1", true},
		{"127.0.0.1", false}, {"127.255.1.1", false}, {"10.0.0.1", false}, {"172.16.5.4", false}, {"172.31.255.255", false}, {"192.168.1.1", false}, {"169.254.169.254", false},
		{"100.64.0.1", false}, {"0.0.0.0", false}, {"0.1.2.3", false}, {"192.0.0.170", false}, {"192.0.2.1", false}, {"198.18.0.1", false}, {"198.51.100.7", false}, {"203.0.113.9", false},
		{"224.0.0.1", false}, {"240.0.0.1", false}, {"255.255.255.255", false},
		{"::1", false}, {"::", false}, {"::7f00:1", false}, {"::ffff:127.0.0.1", false}, {"::ffff:10.1.2.3", false}, {"fc00::1", false}, {"fd12::1", false}, {"fe80::1", false}, {"fec0::1", false},
		{"ff02::1", false}, {"64:ff9b::7f00:1", false}, {"64:ff9b:1::1", false}, {"2002:7f00:1::", false}, {"2001:0:1::", false}, {"2001:db8::1", false}, {"100::1", false},
	} {
		if got := public(netip.MustParseAddr(c.address)); got != c.public {
			t.Errorf("%s: %v, want %v", c.address, got, c.public)
		}
	}
	if public(netip.Addr{}) {
		t.Error("no address is public")
	}
}

// A name that leads to this machine is refused when it is dialled, in every
// way of writing; the address itself is taken.
func TestNamesAreLookedAtWhenDialled(t *testing.T) {
	s := httptest.NewUnstartedServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {}))
	s.Config.ErrorLog = log.New(io.Discard, "", 0) // the handshakes that fail here on purpose
	s.StartTLS()
	defer s.Close()
	_, port, _ := net.SplitHostPort(s.Listener.Addr().String())
	pool := x509.NewCertPool()
	pool.AddCert(s.Certificate())
	for _, host := range []string{"localhost", "localhost.", "127.1", "2130706433", "0x7f000001", "LOCALHOST"} {
		h, err := NewWebhook(WebhookOptions{URL: "https://" + host + ":" + port, Secret: secret, Now: now, TLS: &tls.Config{InsecureSkipVerify: true}}) // the address is what is tested
		if err != nil {
			continue
		}
		err = h.Send(context.Background(), message())
		var dns *net.DNSError
		if !errors.Is(err, errInside) && !errors.As(err, &dns) {
			t.Errorf("%s: %v", host, err)
		}
	}
	h, err := NewWebhook(WebhookOptions{URL: "https://127.0.0.1:" + port, Secret: secret, Now: now, TLS: &tls.Config{RootCAs: pool, MinVersion: tls.VersionTLS12}})
	if err != nil {
		t.Fatal(err)
	}
	if err := h.Send(context.Background(), message()); err != nil {
		t.Errorf("the address itself: %v", err)
	}
	// A certificate that is not trusted is no receiver.
	h, _ = NewWebhook(WebhookOptions{URL: "https://127.0.0.1:" + port, Secret: secret, Now: now})
	if err := h.Send(context.Background(), message()); err == nil || !strings.Contains(err.Error(), "certificate") {
		t.Errorf("an untrusted certificate: %v", err)
	}
}

// A literal is the only inside address: another is refused even so.
func TestLiteralIsTheOnlyOne(t *testing.T) {
	d, err := guarded("127.0.0.1", Timeout)
	if err != nil {
		t.Fatal(err)
	}
	for address, ok := range map[string]bool{"127.0.0.1:80": true, "[::ffff:127.0.0.1]:80": true, "127.0.0.2:80": false, "10.0.0.1:80": false, "[::1]:80": false, "nonsense": false, "8.8.8.8:80": true} {
		if err := d.ControlContext(context.Background(), "tcp", address, nil); (err == nil) != ok {
			t.Errorf("%s: %v", address, err)
		}
	}
}

// The environment's proxy is not used.
func TestNoProxy(t *testing.T) {
	t.Setenv("HTTP_PROXY", "http://127.0.0.1:1")
	t.Setenv("HTTPS_PROXY", "http://127.0.0.1:1")
	_, c, err := web("https://hooks.example/x", Timeout, nil)
	if err != nil {
		t.Fatal(err)
	}
	if c.Transport.(*http.Transport).Proxy != nil {
		t.Error("a proxy is asked for")
	}
}

func listenAt(address string) (net.Listener, error) { return net.Listen("tcp", address) }
