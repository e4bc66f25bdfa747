package service

import (
	"bytes"
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"log"
	"net"
	"net/http"
	"strings"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/service/access"
	"beamward/service/api"
	"beamward/service/console"
	"beamward/service/engine"
	"beamward/service/permit"
)

// bind makes every listener. Nothing is served before Run.
func (s *Service) bind() error {
	guard, err := s.guard()
	if err != nil {
		return err
	}
	issuer, err := s.issuer()
	if err != nil {
		return err
	}
	var secure *tls.Config
	if t := s.cfg.TLS; t.On() {
		if secure, err = access.ServerTLS(t.CertFile, t.KeyFile, t.ClientCAFile); err != nil {
			return err
		}
	}
	if err := s.bindPermit(guard, issuer, secure); err != nil {
		return err
	}
	if err := s.bindAPI(guard, issuer, secure); err != nil {
		return err
	}
	if err := s.bindFeeds(guard, secure); err != nil {
		return err
	}
	return s.upkeep()
}

func (s *Service) guard() (*access.Guard, error) {
	o := access.Options{TokensFile: s.cfg.Access.TokensFile, Listen: []string{s.cfg.Listen, s.cfg.PermitListen}, Denied: s.denied}
	for _, c := range s.cfg.Access.Certificates {
		role, ok := access.ParseRole(c.Role)
		if !ok {
			return nil, fmt.Errorf("access: certificate %s: no such role: use read, feed, operate or admin", c.Name)
		}
		o.Certificates = append(o.Certificates, access.Certificate{
			Name: c.Name, Role: role, Sources: c.Sources, CommonName: c.CommonName, DNS: c.DNS, Email: c.Email, URI: c.URI,
		})
	}
	return access.New(o)
}

// denied logs who was not let in. No credential is in it.
func (s *Service) denied(d access.Denial) {
	s.log.Warn("somebody was not let in", "status", d.Status, "detail", d.Detail)
}

func (s *Service) issuer() (*permit.Issuer, error) {
	var key *permit.Key
	var err error
	if s.opt.Simulated {
		key, err = permit.ThrowAway()
	} else {
		key, err = permit.LoadKey(s.cfg.DataDir)
	}
	if err != nil {
		return nil, err
	}
	return permit.New(sights{s.engine}, s.clock, key, s.opt.Simulated)
}

func (s *Service) bindPermit(guard *access.Guard, issuer *permit.Issuer, secure *tls.Config) error {
	l, err := s.parts.listen("tcp", s.cfg.PermitListen)
	if err != nil {
		return err
	}
	s.parts.addresses.Permit = l.Addr().String()
	if secure != nil {
		l = tls.NewListener(l, secure)
	}
	var h http.Handler = permit.NewHandler(issuer)
	server := permit.NewServer(guard.Middleware(h), 0)
	s.parts.run("permit listener", func(ctx context.Context) error { return server.Serve(ctx, l) })
	return nil
}

func (s *Service) bindAPI(guard *access.Guard, issuer *permit.Issuer, secure *tls.Config) error {
	layouts, err := s.layouts()
	if err != nil {
		return err
	}
	a, err := api.New(api.Options{
		Engine: apiEngine{s}, Clock: s.clock, Guard: guard, Permits: permits{issuer}, Record: entries{s.journal},
		Layouts: layouts, Metrics: s.metrics(issuer), Version: s.opt.Build, Report: func(err error) { s.log.Error("the api reports", "err", err) },
	})
	if err != nil {
		return err
	}
	l, err := s.parts.listen("tcp", s.cfg.Listen)
	if err != nil {
		return err
	}
	s.parts.addresses.API = l.Addr().String()
	if secure != nil {
		l = tls.NewListener(l, secure)
	}
	s.parts.run("api", func(ctx context.Context) error {
		return serveAPI(ctx, l, withConsole(a, guard.Public(console.Handler())))
	})
	s.parts.run("api stream", a.Run)
	return nil
}

// withConsole answers for the page and its files beside the API. The page asks
// nobody who they are: it holds no secret, and what it shows comes from the
// API, which asks.
func withConsole(api, page http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.URL.Path == "/" || strings.HasPrefix(r.URL.Path, "/console/") {
			page.ServeHTTP(w, r)
			return
		}
		api.ServeHTTP(w, r)
	})
}

// Bounds of the API's listener. Bodies and answers have their own times, which
// the API sets for each request.
const (
	headerTime = 5 * time.Second
	idleTime   = 60 * time.Second
	maxHeader  = 16 << 10
)

// serveAPI answers until ctx ends; requests that are being answered then have
// a little time, and streams end at once.
func serveAPI(ctx context.Context, l net.Listener, h http.Handler) error {
	server := http.Server{
		Handler: h, ReadHeaderTimeout: headerTime, IdleTimeout: idleTime, MaxHeaderBytes: maxHeader,
		BaseContext: func(net.Listener) context.Context { return ctx }, ErrorLog: log.New(discard{}, "", 0),
	}
	ended := make(chan struct{})
	stopped := make(chan struct{})
	go func() {
		defer close(stopped)
		select {
		case <-ctx.Done():
		case <-ended:
		}
		short, cancel := context.WithTimeout(context.WithoutCancel(ctx), drain)
		defer cancel()
		if server.Shutdown(short) != nil {
			_ = server.Close()
		}
	}()
	err := server.Serve(l)
	close(ended)
	<-stopped
	if errors.Is(err, http.ErrServerClosed) && ctx.Err() != nil {
		return nil
	}
	return err
}

// discard drops what net/http says of single connections, which a stranger
// could make endless.
type discard struct{}

func (discard) Write(p []byte) (int, error) { return len(p), nil }

// submit gives a fact to the engine and waits until it is on record. The text
// of a list is recorded with it, so that a restart finds it.
func (s *Service) submit(ctx context.Context, from closures.Source, body closures.Body) (engine.Result, error) {
	if o, is := body.(closures.ListOffered); is && o.List != nil {
		var text bytes.Buffer
		if err := listfile.Canonical(&text, o.List.Text()); err != nil {
			return engine.Result{}, fmt.Errorf("recording list %s: %w", o.List, err)
		}
		if err := s.journal.PutList(o.List.Digest().String(), text.Bytes()); err != nil {
			return engine.Result{}, closures.Errorf(closures.Busy, "try again when the record has room", "list %s: its text cannot be recorded", o.List)
		}
	}
	return s.engine.SubmitDurable(ctx, from, body)
}
