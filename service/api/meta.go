package api

import (
	"net/http"
	"time"

	"beamward/service/access"
)

func metaRoutes() []route {
	return []route{
		{method: "GET", path: "/openapi.json", id: "openapi", summary: "This document", action: access.See,
			gives: []string{"application/openapi+json", jsonType}, answer: map[string]any{}, serve: func(c *call) error { return c.send(http.StatusOK, c.gives, c.api.openapi) }},
	}
}

// readyDoc says whether the service does its work, and what is missing.
type readyDoc struct {
	Ready   bool     `json:"ready"`
	Missing []string `json:"missing" doc:"empty for who may not see"`
}

// readiness is about the service, not the beams: one that is ready may well be
// right to keep every beam shuttered.
func (a *API) readiness() readyDoc {
	v, fresh := a.look()
	out := readyDoc{Missing: []string{}}
	need := func(ok bool, what string) {
		if !ok {
			out.Missing = append(out.Missing, what)
		}
	}
	need(v.Started, "the decision loop has not made its first turn")
	need(!v.Stopped, "the decision loop has ended")
	need(fresh || !v.Started || v.Stopped, "the last decision is too old to be believed")
	need(!v.Record.Damaged, "the record is damaged: verify it")
	need(!v.Record.Failed, "the record's store errs: look at its disk")
	need(!v.Record.Gap && !v.Record.Full && !v.Record.Half && v.Record.Behind <= BehindLimit, "the record does not keep up")
	need(len(v.Nights) > 0, "the sky is not prepared")
	out.Ready = len(out.Missing) == 0
	return out
}

// healthRouter serves what is asked before anybody signs in.
func (a *API) healthRouter() http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		c := call{api: a, w: w, r: r}
		if r.Method != http.MethodGet && r.Method != http.MethodHead {
			out := refuse(http.StatusMethodNotAllowed, "this is not done here", "use GET")
			out.allow = "GET, HEAD"
			a.fail(w, r, out)
			return
		}
		err := c.readQuery(nil)
		if err == nil {
			c.gives, err = negotiate(r.Header.Values("Accept"), []string{jsonType})
		}
		if err == nil && r.URL.Path == "/healthz" {
			// It answers, so it lives. More is told to who signs in.
			err = c.reply(http.StatusOK, struct {
				Alive bool `json:"alive"`
			}{true})
		} else if err == nil {
			err = c.ready()
		}
		if err != nil {
			a.fail(w, r, err)
		}
	})
}

func (c *call) ready() error {
	doc := c.api.readiness()
	if p, denial := c.api.options.Guard.Identify(c.r); denial != nil || !p.May(access.See) {
		doc.Missing = []string{}
	}
	status := http.StatusOK
	if !doc.Ready {
		status = http.StatusServiceUnavailable
		c.w.Header().Set("Retry-After", "1")
	}
	return c.reply(status, doc)
}

// NewServer makes a server with every limit set. Of its timeouts those of the
// body and of the answer are those of the longest routes; each request sets
// its own, shorter ones.
func NewServer(h http.Handler, l Limits) *http.Server {
	l = l.filled()
	return &http.Server{
		Handler:           h,
		ReadHeaderTimeout: 5 * time.Second,
		ReadTimeout:       l.BodyTime,
		WriteTimeout:      l.Answer,
		IdleTimeout:       60 * time.Second,
		MaxHeaderBytes:    16 << 10,
	}
}
