package client

import (
	"bytes"
	"context"
	"crypto/ed25519"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/url"
	"strings"
	"sync"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Options say whom to ask, and as whom.
type Options struct {
	Server string // such as http://127.0.0.1:8460
	Token  string // empty: none
	// PermitKey verifies permits; nil: the key that the service shows first.
	PermitKey ed25519.PublicKey
	// Transport is nil for one with bounds of its own.
	Transport http.RoundTripper
}

// Client speaks to one service. It is safe for concurrent use.
type Client struct {
	base  *url.URL
	token string
	http  *http.Client

	mu   sync.Mutex
	key  ed25519.PublicKey
	seen map[closures.BeamID]seen // the newest decision of each beam
}

// maxAnswer bounds an answer that is read whole.
const maxAnswer = 64 << 20

// New makes a client. It asks nothing yet.
func New(o Options) (*Client, error) {
	base, err := url.Parse(o.Server)
	if err != nil || base.Scheme != "http" && base.Scheme != "https" || base.Host == "" || base.RawQuery != "" || base.User != nil {
		return nil, fmt.Errorf("server %.200q: give an address such as http://127.0.0.1:8460", o.Server)
	}
	if strings.ContainsFunc(o.Token, func(r rune) bool { return r <= ' ' || r > '~' }) {
		return nil, errors.New("the token holds characters that no token has: copy it anew")
	}
	c := &Client{base: base, token: o.Token, key: o.PermitKey, seen: map[closures.BeamID]seen{}}
	transport := o.Transport
	if transport == nil {
		transport = &http.Transport{
			Proxy:               http.ProxyFromEnvironment,
			DialContext:         (&net.Dialer{Timeout: 5 * time.Second, KeepAlive: 15 * time.Second}).DialContext,
			TLSHandshakeTimeout: 5 * time.Second, ResponseHeaderTimeout: 2 * time.Minute, ExpectContinueTimeout: time.Second,
			IdleConnTimeout: 30 * time.Second, MaxIdleConns: 8, MaxResponseHeaderBytes: 64 << 10, ForceAttemptHTTP2: true,
		}
	}
	// A redirect would take the token elsewhere.
	c.http = &http.Client{Transport: transport, CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse }}
	return c, nil
}

// Close lets go of idle connections.
func (c *Client) Close() { c.http.CloseIdleConnections() }

// request is one thing to ask.
type request struct {
	method  string
	path    []string // unescaped parts
	query   url.Values
	header  http.Header
	body    io.Reader
	accepts string
}

// do sends a request. The answer's body is the caller's to close, and its
// status is one of success; any other is a *Problem.
func (c *Client) do(ctx context.Context, q request) (*http.Response, error) {
	for _, part := range q.path {
		if part == "" || part == "." || part == ".." {
			return nil, fmt.Errorf("asking %s: an empty name or one of points alone names nothing", c.base.Host)
		}
	}
	u := c.base.JoinPath(escaped(q.path)...)
	u.RawQuery = q.query.Encode()
	r, err := http.NewRequestWithContext(ctx, q.method, u.String(), q.body)
	if err != nil {
		return nil, fmt.Errorf("asking %s: %w", c.base.Host, err)
	}
	for name, values := range q.header {
		r.Header[name] = values
	}
	if q.accepts != "" {
		r.Header.Set("Accept", q.accepts)
	}
	if c.token != "" {
		r.Header.Set("Authorization", "Bearer "+c.token)
	}
	out, err := c.http.Do(r)
	if err != nil {
		var u *url.Error
		if errors.As(err, &u) {
			err = u.Err // its URL may be long; the host tells enough
		}
		return nil, fmt.Errorf("asking %s: %w", c.base.Host, err)
	}
	if out.StatusCode < 200 || out.StatusCode > 299 {
		defer out.Body.Close()
		return nil, problemOf(out)
	}
	return out, nil
}

func escaped(parts []string) []string {
	out := make([]string, len(parts))
	for i, p := range parts {
		out[i] = url.PathEscape(p)
	}
	return out
}

// ask sends a request and decodes the JSON of the answer into what into points
// to; nil reads and forgets it.
func (c *Client) ask(ctx context.Context, q request, into any) (http.Header, error) {
	q.accepts = "application/json"
	out, err := c.do(ctx, q)
	if err != nil {
		return nil, err
	}
	defer out.Body.Close()
	data, err := readAll(out.Body)
	if err != nil {
		return nil, fmt.Errorf("reading the answer of %s: %w", c.base.Host, err)
	}
	if into != nil {
		if err := json.Unmarshal(data, into); err != nil {
			return nil, fmt.Errorf("reading the answer of %s: %w", c.base.Host, err)
		}
	}
	return out.Header, nil
}

func readAll(r io.Reader) ([]byte, error) {
	data, err := io.ReadAll(io.LimitReader(r, maxAnswer+1))
	if err == nil && len(data) > maxAnswer {
		err = fmt.Errorf("it is over %d bytes", maxAnswer)
	}
	return data, err
}

func get(path ...string) request { return request{method: http.MethodGet, path: path} }

// post makes a request with a JSON body.
func post(body any, path ...string) (request, error) {
	data, err := json.Marshal(body)
	if err != nil {
		return request{}, fmt.Errorf("making a request: %w", err)
	}
	return request{method: http.MethodPost, path: path, body: bytes.NewReader(data), header: http.Header{"Content-Type": {"application/json"}}}, nil
}

// send posts a JSON body and decodes the answer. An empty key or tag is left
// out.
func (c *Client) send(ctx context.Context, body, into any, key, tag string, path ...string) error {
	q, err := post(body, path...)
	if err != nil {
		return err
	}
	if key != "" {
		q.header.Set("Idempotency-Key", key)
	}
	if tag != "" {
		q.header.Set("If-Match", tag)
	}
	_, err = c.ask(ctx, q, into)
	return err
}

// stamp writes an instant for a query.
func stamp(t time.Time) string { return wire.FormatTime(t) }
