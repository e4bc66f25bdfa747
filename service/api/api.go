package api

import (
	"fmt"
	"net/http"
	"runtime/debug"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/danielgtaylor/huma/v2"
	"github.com/danielgtaylor/huma/v2/adapters/humachi"
	"github.com/go-chi/chi/v5"
	"github.com/go-chi/chi/v5/middleware"

	"beamward/closures/wire"
	"beamward/service/access"
)

// API answers over HTTP. It is an http.Handler; Run feeds its stream.
type API struct {
	options  Options
	limits   Limits
	router   *chi.Mux
	guarded  http.Handler
	public   http.Handler
	document huma.API
	openapi  []byte

	clients    clients
	listChange chan struct{} // held by who confirms or withdraws a list
	answers    answers
	heavy      chan struct{}
	intakes    intakes
	summings   summings
	hub        hub
}

// New makes an API. It fails for options that are missing.
func New(o Options) (*API, error) {
	if err := o.check(); err != nil {
		return nil, err
	}
	if o.Report == nil {
		o.Report = func(error) {}
	}
	a := &API{options: o, limits: o.Limits.filled()}
	a.listChange = make(chan struct{}, 1)
	a.heavy = make(chan struct{}, a.limits.Heavy)
	a.clients.limits = &a.limits
	a.answers.keep = a.limits.Remember
	a.hub.init(a)
	a.router = chi.NewMux()
	a.router.Use(middleware.GetHead)
	a.document = humachi.New(a.router, documentConfig(o.Version))
	for _, rt := range slices.Concat(beamRoutes(), listRoutes(), holdRoutes(), factRoutes(), knownRoutes(), closureRoutes(), planRoutes(), recordRoutes(), streamRoutes(), metaRoutes()) {
		a.mount(rt)
	}
	if o.Metrics != nil {
		a.router.Method(http.MethodGet, "/metrics", a.seers(o.Metrics))
	}
	a.router.NotFound(func(w http.ResponseWriter, r *http.Request) {
		a.fail(w, r, refuse(http.StatusNotFound, "there is nothing here", "see /openapi.json for what there is"))
	})
	a.router.MethodNotAllowed(a.notAllowed)
	var err error
	if a.openapi, err = a.marshalDocument(); err != nil {
		return nil, fmt.Errorf("making the api: describing it: %w", err)
	}
	a.guarded = http.HandlerFunc(a.identify)
	a.public = o.Guard.Public(a.healthRouter())
	return a, nil
}

// ServeHTTP answers one request.
func (a *API) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	defer func() {
		switch p := recover(); p {
		case nil:
		case http.ErrAbortHandler:
			panic(p)
		default:
			a.options.Report(fmt.Errorf("answering %s %.80q: panic: %v\n%s", r.Method, r.URL.Path, p, debug.Stack()))
			a.fail(w, r, refuse(http.StatusInternalServerError, "something went wrong inside the service; its log tells more", ""))
		}
	}()
	secure(w.Header())
	// Each request has a bound for its body and for its answer, whatever server
	// it came through; routes that need longer say so. A writer that knows no
	// deadlines has none to be held by.
	now, control := time.Now(), http.NewResponseController(w)
	_ = control.SetReadDeadline(now.Add(a.limits.BodyTime))
	_ = control.SetWriteDeadline(now.Add(a.limits.Answer))
	switch r.URL.Path {
	case "/healthz", "/readyz":
		a.public.ServeHTTP(w, r)
	default:
		a.guarded.ServeHTTP(w, r)
	}
}

// secure sets the headers that every answer has. Nothing here is to be kept by
// a cache, shown in a frame or run.
func secure(h http.Header) {
	h.Set("Cache-Control", "no-store")
	h.Set("Content-Security-Policy", "default-src 'none'; frame-ancestors 'none'")
	h.Set("X-Content-Type-Options", "nosniff")
	h.Set("X-Frame-Options", "DENY")
	h.Set("Referrer-Policy", "no-referrer")
	h.Set("Cross-Origin-Resource-Policy", "same-origin")
}

// identify lets in whom the guard knows.
func (a *API) identify(w http.ResponseWriter, r *http.Request) {
	p, denial := a.options.Guard.Identify(r)
	if denial != nil {
		a.fail(w, r, denial)
		return
	}
	a.router.ServeHTTP(w, r.WithContext(access.WithPerson(r.Context(), p)))
}

// seers lets in who may see.
func (a *API) seers(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if p, _ := access.PersonOf(r.Context()); !p.May(access.See) {
			a.fail(w, r, refuse(http.StatusForbidden, "your role may not do this", "ask for a token of another role"))
			return
		}
		next.ServeHTTP(w, r)
	})
}

// notAllowed answers 405 with what the path does allow.
func (a *API) notAllowed(w http.ResponseWriter, r *http.Request) {
	path := r.URL.RawPath
	if path == "" {
		path = r.URL.Path
	}
	var allowed []string
	for _, m := range []string{http.MethodGet, http.MethodPut, http.MethodPost, http.MethodDelete, http.MethodPatch} {
		if a.router.Match(chi.NewRouteContext(), m, path) {
			if allowed = append(allowed, m); m == http.MethodGet {
				allowed = append(allowed, http.MethodHead)
			}
		}
	}
	out := refuse(http.StatusMethodNotAllowed, "this is not done here", "use "+strings.Join(allowed, ", "))
	out.allow = strings.Join(allowed, ", ")
	a.fail(w, r, out)
}

// look returns what was last published, and whether it may be believed.
func (a *API) look() (v *View, fresh bool) {
	v = a.options.Engine.View()
	wall, boot := a.options.Clock.Read()
	return v, v.fresh(wall, boot)
}

func statusKey(status int) string { return strconv.Itoa(status) }

func problemResponse(reg huma.Registry, status int) *huma.Response {
	return &huma.Response{Description: http.StatusText(status), Content: map[string]*huma.MediaType{wire.ProblemType: {Schema: problemSchema(reg)}}}
}
