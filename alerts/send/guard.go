package send

import (
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/netip"
	"net/url"
	"strings"
	"syscall"
	"time"
)

// Timeout is how long one attempt may take where nothing else is configured.
const Timeout = 10 * time.Second

const (
	mostAnswer = 64 << 10 // of an answer's body that is read, to use the connection again
	mostHeader = 16 << 10
)

// Refused is a refusal for good: sending the same again cannot help.
type Refused struct{ Why string }

// Error says why.
func (r *Refused) Error() string { return r.Why }

// errInside is the answer to a name that leads to an address which only a
// literal may name.
var errInside = errors.New("the name leads to a loopback, private or reserved address: configure the address itself if that is meant")

// never are addresses that are no receiver, whoever configured them: among them
// those at which clouds give out secrets.
func never(a netip.Addr) bool {
	return !a.IsValid() || a.IsUnspecified() || a.IsMulticast() || a.IsLinkLocalUnicast() || a == netip.AddrFrom4([4]byte{255, 255, 255, 255})
}

// reserved are the networks, beside those that netip knows, to which no name
// may lead: shared and protocol space, documentation, benchmarks, the future,
// and those in which an IPv4 address hides (RFC 6890 and its registry).
var reserved = func() (out []netip.Prefix) {
	for _, s := range strings.Fields(`0.0.0.0/8 100.64.0.0/10 192.0.0.0/24 192.0.2.0/24 192.88.99.0/24 198.18.0.0/15 198.51.100.0/24 203.0.113.0/24 240.0.0.0/4
		::/96 64:ff9b::/96 64:ff9b:1::/48 100::/64 2001::/23 2001:db8::/32 2002::/16 3fff::/20 5f00::/16 fec0::/10`) {
		out = append(out, netip.MustParsePrefix(s))
	}
	return out
}()

// public reports whether a name may lead to an address.
func public(a netip.Addr) bool {
	a = a.Unmap()
	if never(a) || a.IsLoopback() || a.IsPrivate() || !a.IsGlobalUnicast() {
		return false
	}
	for _, p := range reserved {
		if p.Contains(a) {
			return false
		}
	}
	return true
}

// literal returns the address that a host is written as, if it is one.
func literal(host string) (netip.Addr, bool) {
	a, err := netip.ParseAddr(host)
	if err != nil || a.Zone() != "" {
		return netip.Addr{}, false
	}
	return a.Unmap(), true
}

// guarded is a dialer to one configured host. It looks at the address after
// the name was resolved, so that a name which changes its mind is caught too.
func guarded(host string, timeout time.Duration) (*net.Dialer, error) {
	only, isLiteral := literal(host)
	if isLiteral && never(only) {
		return nil, fmt.Errorf("%s is no address of a receiver: name another", only)
	}
	return &net.Dialer{Timeout: timeout, ControlContext: func(_ context.Context, _, address string, _ syscall.RawConn) error {
		to, err := netip.ParseAddrPort(address)
		if err != nil {
			return errInside
		}
		a := to.Addr().WithZone("").Unmap()
		if isLiteral && a == only || public(a) {
			return nil
		}
		return errInside
	}}, nil
}

// address reads a host and port of a configuration.
func address(s string) (host string, err error) {
	host, port, err := net.SplitHostPort(s)
	if err != nil || host == "" || port == "" {
		return "", fmt.Errorf("address %.64q: give host:port", s)
	}
	return host, named(host)
}

// named refuses a host that is neither an address nor a name of letters,
// digits, hyphens and dots.
func named(host string) error {
	if _, is := literal(host); is {
		return nil
	}
	for _, r := range host {
		if !(r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '-' || r == '.') {
			return fmt.Errorf("host %.64q: give a name of letters, digits, hyphens and dots, or an address", host)
		}
	}
	if host == "" || len(host) > 253 {
		return fmt.Errorf("host %.64q: give a name or an address", host)
	}
	return nil
}

// web reads the URL of a receiver and makes the client for it. Plain http is
// for a literal address alone: what leaves the site is encrypted.
func web(text string, timeout time.Duration, trust *tls.Config) (*url.URL, *http.Client, error) {
	u, err := url.Parse(text)
	if err != nil { // its text may hold a secret: say nothing of it
		return nil, nil, errors.New("the URL cannot be read: give https://host/path")
	}
	host := u.Hostname()
	_, isLiteral := literal(host)
	switch {
	case u.User != nil || u.Fragment != "" || u.Opaque != "":
		return nil, nil, fmt.Errorf("url of %.64q: leave out user, password and fragment", host)
	case u.Scheme != "https" && !(u.Scheme == "http" && isLiteral):
		return nil, nil, fmt.Errorf("url of %.64q: use https; plain http is for an address of this machine or site, written as one", host)
	}
	if err := named(host); err != nil {
		return nil, nil, err
	}
	dialer, err := guarded(host, timeout)
	if err != nil {
		return nil, nil, err
	}
	if trust == nil {
		trust = &tls.Config{MinVersion: tls.VersionTLS12}
	}
	return u, &http.Client{
		Timeout:       timeout,
		CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse },
		Transport: &http.Transport{
			DialContext: dialer.DialContext, TLSClientConfig: trust, TLSHandshakeTimeout: timeout, ResponseHeaderTimeout: timeout,
			MaxResponseHeaderBytes: mostHeader, MaxIdleConns: 1, MaxConnsPerHost: 2, IdleConnTimeout: 30 * time.Second, DisableCompression: true, ForceAttemptHTTP2: true,
		},
	}, nil
}

// post sends one request and judges its answer.
func post(c *http.Client, r *http.Request) error {
	answer, err := c.Do(r)
	if err != nil {
		// The error of net/http prints the whole URL, which may hold a secret.
		var inner *url.Error
		if errors.As(err, &inner) {
			err = inner.Err
		}
		return fmt.Errorf("sending to %s: %w", r.URL.Hostname(), err)
	}
	defer func() { _ = answer.Body.Close() }()
	_, _ = io.Copy(io.Discard, io.LimitReader(answer.Body, mostAnswer))
	switch s := answer.StatusCode; {
	case s >= 200 && s < 300:
		return nil
	case s >= 300 && s < 400:
		return &Refused{fmt.Sprintf("%s answers %d: redirects are not followed, name the right address", r.URL.Hostname(), s)}
	case s == 400 || s == 410 || s == 413 || s == 414 || s == 415 || s == 422:
		return &Refused{fmt.Sprintf("%s answers %d: it does not take this message", r.URL.Hostname(), s)}
	default:
		return fmt.Errorf("%s answers %d", r.URL.Hostname(), s)
	}
}
