package access

import (
	"net"
	"net/http"
	"net/netip"
	"strings"
)

// Middleware lets in whom Identify knows, with the person in the request's
// context, and answers everybody else.
func (g *Guard) Middleware(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		p, d := g.Identify(r)
		if d != nil {
			g.tell(*d)
			g.options.Answer(w, r, *d)
			return
		}
		next.ServeHTTP(w, r.WithContext(WithPerson(r.Context(), p)))
	})
}

// Public lets in anyone, but for requests that a browser was tricked into:
// for what is served before signing in, such as the console's own files.
func (g *Guard) Public(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if d := g.tricked(r); d != nil {
			g.tell(*d)
			g.options.Answer(w, r, *d)
			return
		}
		next.ServeHTTP(w, r)
	})
}

// Require lets in people who may do a. It stands behind Middleware; without it
// nobody gets in.
func (g *Guard) Require(a Action, next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if p, _ := PersonOf(r.Context()); !p.May(a) {
			d := Denial{Status: http.StatusForbidden, Title: "not allowed", From: remote(r.RemoteAddr),
				Detail: "your role may not do this"}
			g.tell(d)
			g.options.Answer(w, r, d)
			return
		}
		next.ServeHTTP(w, r)
	})
}

// Identify says who is asking, or why they are not let in.
func (g *Guard) Identify(r *http.Request) (Person, *Denial) {
	from := remote(r.RemoteAddr)
	if secretLike.MatchString(r.URL.RawQuery) || secretLike.MatchString(r.URL.Path) {
		return Person{}, &Denial{Status: http.StatusBadRequest, Title: "a token in the URL", From: from,
			Detail: "URLs are kept in logs and histories: revoke this token, and send another in the header Authorization: Bearer"}
	}
	if d := g.tricked(r); d != nil {
		return Person{}, d
	}
	if !g.Named() {
		return g.local(r, from)
	}
	switch headers := r.Header.Values("Authorization"); len(headers) {
	case 0:
		if p, ok := whose(g.options.Certificates, r.TLS); ok {
			return p, nil
		}
		return Person{}, &Denial{Status: http.StatusUnauthorized, Title: "not signed in", From: from,
			Detail: "send a token in the header Authorization: Bearer, or a client certificate that is known here"}
	case 1:
		scheme, token, ok := strings.Cut(headers[0], " ")
		if !ok || !strings.EqualFold(scheme, "Bearer") {
			return Person{}, g.failed(from, "the header Authorization must be Bearer and a token")
		}
		return g.byToken(from, strings.TrimLeft(token, " "))
	default:
		return Person{}, g.failed(from, "there is more than one header Authorization")
	}
}

// local knows the one nameless operator: whoever is on this machine itself.
func (g *Guard) local(r *http.Request, from netip.Addr) (Person, *Denial) {
	forbid := func(detail string) (Person, *Denial) {
		return Person{}, &Denial{Status: http.StatusForbidden, Title: "this machine only", From: from, Detail: detail}
	}
	if !from.Unmap().IsLoopback() {
		return forbid("without tokens or certificates the service answers the loopback interface only")
	}
	for _, h := range []string{"Forwarded", "X-Forwarded-For", "X-Real-Ip", "Via"} {
		if r.Header.Get(h) != "" {
			return forbid("the request came through a proxy: configure tokens or certificates")
		}
	}
	if len(r.Header.Values("Authorization")) > 0 {
		return Person{}, g.failed(from, "there are no tokens here")
	}
	return Person{Name: LocalName, Role: Operate, anySource: true}, nil
}

// tricked refuses what another site's page made a browser send. A page can
// point a name of its own at the loopback address (DNS rebinding), where no
// certificate and no token is in its way: then only the Host header tells.
func (g *Guard) tricked(r *http.Request) *Denial {
	if !g.Named() && !g.hostOK(r.Host) {
		return &Denial{Status: http.StatusForbidden, Title: "another host", From: remote(r.RemoteAddr),
			Detail: "the Host header names neither this machine nor an address that the service listens on"}
	}
	if g.cross.Check(r) != nil {
		return &Denial{Status: http.StatusForbidden, Title: "another site", From: remote(r.RemoteAddr),
			Detail: "the request was sent by a page of another site"}
	}
	return nil
}

func (g *Guard) hostOK(hostPort string) bool {
	host := hostPort
	if h, _, err := net.SplitHostPort(hostPort); err == nil {
		host = h
	}
	host = strings.ToLower(strings.TrimSuffix(strings.TrimPrefix(host, "["), "]"))
	if g.hosts[host] {
		return true
	}
	ip, err := netip.ParseAddr(host)
	return err == nil && ip.Unmap().IsLoopback()
}
