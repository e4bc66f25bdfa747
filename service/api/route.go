package api

import (
	"net/http"
	"net/url"
	"reflect"
	"slices"
	"strings"
	"time"

	"github.com/danielgtaylor/huma/v2"
	"github.com/danielgtaylor/huma/v2/adapters/humachi"
	"github.com/go-chi/chi/v5"

	"beamward/service/access"
)

// budget says whose requests a route is counted with.
type budget uint8

const (
	forReading budget = iota
	forWriting
	forFeeding
	forHolding
	numBudgets
)

// param is one query parameter or header of a route.
type param struct {
	name, doc string
	schema    *huma.Schema
}

// route is one operation: what the document says of it, and what serves it.
type route struct {
	method, path, id, summary string
	action                    access.Action
	budget                    budget
	query                     []param
	headers                   []param
	takes                     []string // media types of the body; none: no body
	body                      any      // a value of the JSON body's type; nil: text
	optional                  bool     // the body may be left out
	status                    int
	gives                     []string // media types of the answer, the first where none is asked for; none: JSON
	answer                    any      // a value of the JSON answer's type; nil: text
	errors                    []int    // beyond those that every route has
	serve                     func(c *call) error
}

// call is one request on its way.
type call struct {
	api   *API
	w     http.ResponseWriter
	r     *http.Request
	who   access.Person
	query url.Values
	gives string // media type that was agreed on
}

const jsonType = "application/json"

// mount makes a route answer, and puts it into the document.
func (a *API) mount(rt route) {
	if rt.status == 0 {
		rt.status = http.StatusOK
	}
	if len(rt.gives) == 0 {
		rt.gives = []string{jsonType}
	}
	op := a.describe(&rt)
	a.document.OpenAPI().AddOperation(op)
	known := make([]string, len(rt.query))
	for i, p := range rt.query {
		known[i] = p.name
	}
	a.document.Adapter().Handle(op, func(ctx huma.Context) {
		r, w := humachi.Unwrap(ctx)
		c := call{api: a, w: w, r: r}
		if err := c.run(&rt, known); err != nil {
			a.fail(w, r, err)
		}
	})
}

// run does what all routes share, then serves.
func (c *call) run(rt *route, known []string) error {
	c.who, _ = access.PersonOf(c.r.Context())
	if !c.who.May(rt.action) {
		return refuse(http.StatusForbidden, "your role may not do this", "ask for a token of another role")
	}
	if err := c.api.clients.take(c, rt.budget); err != nil {
		return err
	}
	if err := c.readQuery(known); err != nil {
		return err
	}
	var err error
	if c.gives, err = negotiate(c.r.Header.Values("Accept"), rt.gives); err != nil {
		return err
	}
	if len(rt.takes) > 0 {
		if err := c.checkBody(rt); err != nil {
			return err
		}
	}
	return rt.serve(c)
}

// describe makes the OpenAPI operation of a route.
func (a *API) describe(rt *route) *huma.Operation {
	reg := a.document.OpenAPI().Components.Schemas
	op := &huma.Operation{Method: rt.method, Path: rt.path, OperationID: rt.id, Summary: rt.summary, DefaultStatus: rt.status, Responses: map[string]*huma.Response{}}
	for _, name := range pathNames(rt.path) {
		op.Parameters = append(op.Parameters, &huma.Param{Name: name, In: "path", Required: true, Schema: &huma.Schema{Type: huma.TypeString, MinLength: new(1), MaxLength: new(64)}})
	}
	for _, p := range rt.query {
		op.Parameters = append(op.Parameters, &huma.Param{Name: p.name, In: "query", Description: p.doc, Schema: p.schema})
	}
	for _, p := range rt.headers {
		op.Parameters = append(op.Parameters, &huma.Param{Name: p.name, In: "header", Description: p.doc, Schema: p.schema})
	}
	media := func(types []string, sample any, hint string) map[string]*huma.MediaType {
		out := map[string]*huma.MediaType{}
		for _, t := range types {
			m := &huma.MediaType{Schema: &huma.Schema{Type: huma.TypeString}}
			if sample != nil && (t == jsonType || strings.HasSuffix(t, "+json")) {
				m.Schema = reg.Schema(reflect.TypeOf(sample), true, hint)
			}
			out[t] = m
		}
		return out
	}
	if len(rt.takes) > 0 {
		op.RequestBody = &huma.RequestBody{Required: !rt.optional, Content: media(rt.takes, rt.body, rt.id+"Body")}
	}
	op.Responses[statusKey(rt.status)] = &huma.Response{Description: http.StatusText(rt.status), Content: media(rt.gives, rt.answer, rt.id+"Answer")}
	problems := append([]int{400, 401, 403, 406, 429, 500, 503}, rt.errors...)
	if strings.Contains(rt.path, "{") {
		problems = append(problems, 404)
	}
	if len(rt.takes) > 0 {
		problems = append(problems, 408, 413, 415, 422)
	}
	slices.Sort(problems)
	for _, status := range slices.Compact(problems) {
		op.Responses[statusKey(status)] = problemResponse(reg, status)
	}
	return op
}

// pathNames returns the names in braces of a path.
func pathNames(path string) []string {
	var out []string
	for _, part := range strings.Split(path, "/") {
		if strings.HasPrefix(part, "{") {
			out = append(out, strings.Trim(part, "{}"))
		}
	}
	return out
}

// name returns a part of the path.
func (c *call) name(key string) string { return chi.URLParam(c.r, key) }

// wall is the service's time.
func (c *call) wall() time.Time {
	wall, _ := c.api.options.Clock.Read()
	return wall
}

// view returns what was last published, and whether it may be believed.
func (c *call) view() (v *View, fresh bool) { return c.api.look() }
