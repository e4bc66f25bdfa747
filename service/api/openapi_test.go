package api

import (
	"encoding/json"
	"fmt"
	"net/http"
	"regexp"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/go-chi/chi/v5"

	"beamward/closures/wire"
)

// object is a JSON object as it stands.
type object = map[string]any

// walk is a reader of OpenAPI 3.1 that knows nothing of the library which
// wrote the document: what it does not know it refuses.
type walk struct {
	t   *testing.T
	doc object
}

func (w *walk) fail(at, format string, args ...any) {
	w.t.Helper()
	w.t.Errorf("%s: %s", at, fmt.Sprintf(format, args...))
}

func obj(v any) object { o, _ := v.(object); return o }
func str(v any) string { s, _ := v.(string); return s }
func arr(v any) []any  { a, _ := v.([]any); return a }

// resolve follows a reference.
func (w *walk) resolve(at string, s object) object {
	for range 10 {
		ref, is := s["$ref"].(string)
		if !is {
			return s
		}
		name, ok := strings.CutPrefix(ref, "#/components/schemas/")
		found := obj(obj(obj(w.doc["components"])["schemas"])[name])
		if !ok || found == nil {
			w.fail(at, "the reference %s leads nowhere", ref)
			return object{}
		}
		s = found
	}
	w.fail(at, "references go round")
	return object{}
}

var schemaKeys = []string{
	"$ref", "type", "format", "properties", "required", "additionalProperties", "items", "enum", "minimum", "maximum", "exclusiveMinimum", "exclusiveMaximum", "minLength", "maxLength",
	"minItems", "maxItems", "pattern", "description", "contentEncoding", "title", "examples", "default", "anyOf",
}

// schema checks that a schema says something that JSON Schema knows.
func (w *walk) schema(at string, s object, depth int) {
	if depth > 40 {
		return
	}
	for key := range s {
		if !slices.Contains(schemaKeys, key) {
			w.fail(at, "the keyword %s is not known", key)
		}
	}
	for _, kind := range types(s) {
		if !slices.Contains([]string{"object", "array", "string", "number", "integer", "boolean", "null"}, kind) {
			w.fail(at, "type %q", kind)
		}
	}
	if p := str(s["pattern"]); p != "" {
		if _, err := regexp.Compile(p); err != nil {
			w.fail(at, "%v", err)
		}
	}
	for _, name := range arr(s["required"]) {
		if obj(s["properties"])[str(name)] == nil {
			w.fail(at, "%s is required and no property", name)
		}
	}
	for i, one := range arr(s["anyOf"]) {
		w.schema(fmt.Sprintf("%s|%d", at, i), obj(one), depth+1)
	}
	for name, p := range obj(s["properties"]) {
		w.schema(at+"/"+name, obj(p), depth+1)
	}
	if items := obj(s["items"]); items != nil {
		w.schema(at+"[]", items, depth+1)
	}
	if s["$ref"] != nil {
		w.resolve(at, s)
	}
}

func types(s object) []string {
	switch t := s["type"].(type) {
	case string:
		return []string{t}
	case []any:
		var out []string
		for _, one := range t {
			out = append(out, str(one))
		}
		return out
	}
	return nil
}

// fits checks a value against a schema.
func (w *walk) fits(at string, s object, v any) {
	if any := arr(s["anyOf"]); any != nil { // here it is always something, or null
		if v != nil {
			w.fits(at, obj(any[0]), v)
		}
		return
	}
	s = w.resolve(at, s)
	kinds := types(s)
	kind := map[bool]string{true: "null", false: fmt.Sprintf("%T", v)}[v == nil]
	switch v := v.(type) {
	case object:
		kind = "object"
		extra, open := s["additionalProperties"]
		for name, value := range v {
			switch p := obj(obj(s["properties"])[name]); {
			case p != nil:
				w.fits(at+"/"+name, p, value)
			case !open && s["properties"] == nil:
			case extra == false, !open:
				w.fail(at, "%s is no property", name)
			}
		}
		for _, name := range arr(s["required"]) {
			if _, has := v[str(name)]; !has {
				w.fail(at, "%s is missing", name)
			}
		}
	case []any:
		kind = "array"
		for i, one := range v {
			w.fits(fmt.Sprintf("%s[%d]", at, i), obj(s["items"]), one)
		}
	case string:
		kind = "string"
		if s["format"] == "date-time" {
			if _, err := wire.ParseTime(v); err != nil {
				w.fail(at, "%v", err)
			}
		}
	case bool:
		kind = "boolean"
	case float64:
		kind = "number"
		if slices.Contains(kinds, "integer") && v == float64(int64(v)) {
			kind = "integer"
		}
		if lo, has := s["minimum"].(float64); has && v < lo {
			w.fail(at, "%v is below %v", v, lo)
		}
	}
	if len(kinds) > 0 && !slices.Contains(kinds, kind) {
		w.fail(at, "it is a %s, want %v", kind, kinds)
	}
	if enum := arr(s["enum"]); enum != nil && v != nil && !slices.Contains(enum, v) {
		w.fail(at, "%v is none of %v", v, enum)
	}
}

func document(t *testing.T, s *site) object {
	t.Helper()
	a := s.want(200, "eve", "GET", "/openapi.json", "")
	var strict any
	if err := wire.Strict(a.body, &strict); err != nil {
		t.Fatal(err)
	}
	var doc object
	a.into(t, &doc)
	return doc
}

func TestTheDocumentIsWhole(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Metrics = http.NotFoundHandler() })
	doc := document(t, s)
	w := &walk{t, doc}
	if !strings.HasPrefix(str(doc["openapi"]), "3.1.") || str(obj(doc["info"])["title"]) == "" || str(obj(doc["info"])["version"]) == "" {
		t.Errorf("head: %v %v", doc["openapi"], doc["info"])
	}
	for name, schema := range obj(obj(doc["components"])["schemas"]) {
		w.schema(name, obj(schema), 0)
	}
	ids := map[string]string{}
	documented := map[string]bool{}
	for path, item := range obj(doc["paths"]) {
		for method, op := range obj(item) {
			at, op := strings.ToUpper(method)+" "+path, obj(op)
			documented[at] = true
			if id := str(op["operationId"]); id == "" || ids[id] != "" {
				w.fail(at, "operationId %q is missing or that of %s", id, ids[id])
			} else {
				ids[id] = at
			}
			w.operation(at, path, op)
		}
	}
	// Every route is documented, and every documented one is there.
	routed := map[string]bool{"GET /healthz": true, "GET /readyz": true}
	if err := chi.Walk(s.api.router, func(method, route string, _ http.Handler, _ ...func(http.Handler) http.Handler) error {
		routed[method+" "+route] = true
		return nil
	}); err != nil {
		t.Fatal(err)
	}
	for at := range routed {
		if !documented[at] {
			t.Errorf("%s is not documented", at)
		}
	}
	for at := range documented {
		if !routed[at] {
			t.Errorf("%s is documented and not there", at)
		}
	}
	if len(documented) < 25 {
		t.Errorf("only %d operations", len(documented))
	}
}

func (w *walk) operation(at, path string, op object) {
	for key := range op {
		if !slices.Contains([]string{"operationId", "summary", "description", "parameters", "requestBody", "responses", "security", "tags"}, key) {
			w.fail(at, "the member %s is not known", key)
		}
	}
	if str(op["summary"]) == "" {
		w.fail(at, "no summary")
	}
	inPath := map[string]bool{}
	seen := map[string]bool{}
	for _, p := range arr(op["parameters"]) {
		p := obj(p)
		name, in := str(p["name"]), str(p["in"])
		if name == "" || !slices.Contains([]string{"path", "query", "header"}, in) || p["schema"] == nil || seen[in+name] {
			w.fail(at, "parameter %v", p)
		}
		seen[in+name] = true
		if in == "path" {
			inPath[name] = true
			if p["required"] != true {
				w.fail(at, "the path's %s is not required", name)
			}
		}
		w.schema(at+" "+name, obj(p["schema"]), 0)
	}
	for _, m := range regexp.MustCompile(`\{([^}]+)\}`).FindAllStringSubmatch(path, -1) {
		if !inPath[m[1]] {
			w.fail(at, "%s is not described", m[1])
		}
		delete(inPath, m[1])
	}
	if len(inPath) > 0 {
		w.fail(at, "%v is not in the path", inPath)
	}
	if body := obj(op["requestBody"]); body != nil && len(obj(body["content"])) == 0 {
		w.fail(at, "a body of no kind")
	}
	responses := obj(op["responses"])
	ok := false
	for status, r := range responses {
		if !regexp.MustCompile(`^[1-5]\d\d$`).MatchString(status) || str(obj(r)["description"]) == "" || len(obj(obj(r)["content"])) == 0 {
			w.fail(at, "response %s: %v", status, r)
		}
		ok = ok || status[0] == '2'
		for media, m := range obj(obj(r)["content"]) {
			w.schema(at+" "+status+" "+media, obj(obj(m)["schema"]), 0)
			if status[0] >= '4' && media != wire.ProblemType && path != "/readyz" {
				w.fail(at, "%s is answered as %s", status, media)
			}
		}
	}
	if !ok {
		w.fail(at, "no answer of success")
	}
}

// What is answered is what the document says, member for member.
func TestAnswersFitTheDocument(t *testing.T) {
	s := newSite(t, func(o *Options) { o.Record = fakeRecord(10) })
	s.stage.opened(t)
	doc := document(t, s)
	w := &walk{t, doc}
	s.scene()
	s.stage.advance(time.Second) // so that there are reasons to be shuttered
	for _, c := range []struct {
		status                 int
		method, path, of, body string
		header                 string
	}{
		{200, "GET", "/v1/beams", "", "", ""}, {200, "GET", "/v1/beams/north", "/v1/beams/{beam}", "", ""}, {200, "GET", "/v1/beams/north/aim", "/v1/beams/{beam}/aim", "", ""},
		{200, "GET", "/v1/beams/north/outlook", "/v1/beams/{beam}/outlook", "", ""}, {200, "GET", "/v1/beams/north/exposure", "/v1/beams/{beam}/exposure", "", ""},
		{200, "GET", "/v1/lists", "", "", ""}, {200, "GET", "/v1/lists/orbital-desk/2031-045-A", "/v1/lists/{authority}/{id}", "", ""}, {200, "GET", "/v1/holds", "", "", ""},
		{200, "GET", "/v1/sources", "", "", ""}, {200, "GET", "/v1/aircraft", "", "", ""}, {200, "GET", "/v1/neighbours", "", "", ""}, {200, "GET", "/v1/closures", "", "", ""}, {200, "GET", "/v1/closures?ra_deg=150.1&dec_deg=2.2", "/v1/closures", "", ""},
		{200, "GET", "/v1/record", "", "", ""}, {503, "GET", "/readyz", "", "", ""}, {200, "GET", "/healthz", "", "", ""},
		{200, "POST", "/v1/beams/north/rearm", "/v1/beams/{beam}/rearm", `{"note":"x"}`, ""}, {200, "POST", "/v1/facts", "", "no\n" + interlock(now, ""), nd},
		{200, "POST", "/v1/lists/check", "", strings.Replace(listText("orbital-desk", "X", "replaces: [2031-045-A]\n"+closedField), "13T18:05", "13T19:05", 1), yaml}, {201, "POST", "/v1/lists", "", listText("quick-desk", "X", closedField), yaml},
		{201, "POST", "/v1/holds", "", `{"beam":"north","reason":"x","region":{"icrs":{"ra_deg":1,"dec_deg":1,"radius_deg":1}}}`, ""},
		{200, "POST", "/v1/plan?beam=north", "/v1/plan", "name,ra_deg,dec_deg\na,150.1,2.2\nb,10,-80\n", csvHeader},
		{404, "GET", "/v1/beams/west", "/v1/beams/{beam}", "", ""}, {422, "POST", "/v1/holds", "", `{}`, ""}, {400, "GET", "/v1/lists?x=1", "/v1/lists", "", ""}, {401, "GET", "/v1/holds", "", "", "Authorization: Bearer x"},
	} {
		of := c.of
		if of == "" {
			of = c.path
		}
		var headers []string
		if c.header != "" {
			headers = []string{c.header}
		}
		a := s.want(c.status, "ann", c.method, c.path, c.body, headers...)
		media, _, _ := strings.Cut(a.header.Get("Content-Type"), ";")
		response := obj(obj(obj(obj(obj(doc["paths"])[of])[strings.ToLower(c.method)])["responses"])[fmt.Sprint(c.status)])
		m := obj(obj(response["content"])[media])
		if m == nil {
			t.Errorf("%s %s: %d as %s is not in the document", c.method, c.path, c.status, media)
			continue
		}
		var v any
		if err := json.Unmarshal(a.body, &v); err != nil {
			t.Fatal(err)
		}
		w.fits(c.method+" "+c.path, obj(m["schema"]), v)
	}
}
