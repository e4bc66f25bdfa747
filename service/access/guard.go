package access

import (
	"crypto/tls"
	"fmt"
	"net"
	"net/http"
	"net/netip"
	"slices"
	"strings"
	"time"
)

// Options are what a Guard is made of. With neither TokensFile nor
// Certificates it knows nobody by name.
type Options struct {
	TokensFile   string
	Certificates []Certificate
	Listen       []string // addresses that are listened on, which a Host header may name

	// Denied is told of every refusal, for logs and counters; it must not
	// block. It never sees a credential. Absent: nobody is told.
	Denied func(Denial)
	// Answer writes a refusal. Absent: WriteProblem.
	Answer func(http.ResponseWriter, *http.Request, Denial)
}

// Guard lets people and machines in. It is safe for concurrent use.
type Guard struct {
	options Options
	tokens  *store // nil: there are none
	hosts   map[string]bool
	cross   *http.CrossOriginProtection
	fails   fails
}

// New makes a Guard. A token file that cannot be read is no error: nobody gets
// in by it until it can, and Err says why.
func New(o Options) (*Guard, error) {
	for i := range o.Certificates {
		if err := o.Certificates[i].check(); err != nil {
			return nil, err
		}
		for j := range o.Certificates[:i] {
			if strings.EqualFold(o.Certificates[i].Name, o.Certificates[j].Name) {
				return nil, fmt.Errorf("certificate %s: another has its name", o.Certificates[i].Name)
			}
		}
	}
	if o.Answer == nil {
		o.Answer = WriteProblem
	}
	g := &Guard{options: o, hosts: map[string]bool{"localhost": true}, cross: http.NewCrossOriginProtection()}
	if o.TokensFile != "" {
		g.tokens = &store{path: o.TokensFile}
	}
	for _, l := range o.Listen {
		if host, _, err := net.SplitHostPort(l); err == nil && host != "" {
			g.hosts[strings.ToLower(host)] = true
		}
	}
	return g, nil
}

// Named reports whether people sign in by name here, so that a second person
// can exist.
func (g *Guard) Named() bool { return g.tokens != nil || len(g.options.Certificates) > 0 }

// Err says why nobody gets in by token at present; nil when all is well.
func (g *Guard) Err() error {
	if g.tokens == nil {
		return nil
	}
	_, err := g.tokens.now()
	return err
}

// Token returns who holds a token that came over another way than HTTP. A
// failure counts against the address.
func (g *Guard) Token(from netip.Addr, token string) (Person, error) {
	p, d := g.byToken(from, token)
	if d != nil {
		g.tell(*d)
		return Person{}, d
	}
	return p, nil
}

// Connection returns whom the client certificate of a TLS connection stands
// for. A failure counts against the address.
func (g *Guard) Connection(from netip.Addr, state tls.ConnectionState) (Person, error) {
	p, ok := whose(g.options.Certificates, &state)
	if !ok {
		d := g.failed(from, "the certificate stands for nobody here")
		g.tell(*d)
		return Person{}, d
	}
	return p, nil
}

// Still reports whether someone who was let in before still would be: what
// lasts longer than a request asks it every half second, and ends when it says
// no.
func (g *Guard) Still(p Person) bool {
	switch {
	case p.Name == "":
		return false
	case !p.Token:
		return !g.Named()
	case !p.until.IsZero(): // by certificate
		for i := range g.options.Certificates {
			if c := &g.options.Certificates[i]; c.Name == p.Name && c.Role == p.Role && slices.Equal(c.Sources, p.Sources) {
				return time.Now().Before(p.until)
			}
		}
		return false
	case g.tokens == nil:
		return false
	}
	tokens, err := g.tokens.now()
	if err != nil {
		return false
	}
	t, ok := find(tokens, p.proof)
	return ok && t.Name == p.Name && t.role == p.Role && slices.Equal(t.Sources, p.Sources)
}

func (g *Guard) byToken(from netip.Addr, token string) (Person, *Denial) {
	if g.tokens == nil {
		return Person{}, g.failed(from, "there are no tokens here")
	}
	tokens, err := g.tokens.now()
	if err != nil {
		return Person{}, &Denial{Status: http.StatusServiceUnavailable, Title: "nobody can sign in", From: from,
			Detail: "the file of tokens cannot be read: see the service's log", RetryAfter: time.Second}
	}
	secret, ok := parseSecret(token)
	if !ok {
		return Person{}, g.failed(from, "this is not a token of this service")
	}
	t, ok := find(tokens, secret.digest())
	if !ok {
		return Person{}, g.failed(from, "nobody holds this token")
	}
	return t.person(), nil
}

// failed is the refusal of a credential, or of too many.
func (g *Guard) failed(from netip.Addr, detail string) *Denial {
	if !g.fails.allow(from) {
		return &Denial{Status: http.StatusTooManyRequests, Title: "too many failed attempts", From: from,
			Detail: "this address has tried too often with credentials that are not known here", RetryAfter: failEvery}
	}
	return &Denial{Status: http.StatusUnauthorized, Title: "not signed in", Detail: detail, From: from}
}

func (g *Guard) tell(d Denial) {
	if g.options.Denied != nil {
		g.options.Denied(d)
	}
}
