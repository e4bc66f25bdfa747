package api

import (
	"encoding/json"
	"reflect"
	"strings"

	"github.com/danielgtaylor/huma/v2"

	"beamward/closures/wire"
)

// documentConfig is the head of /openapi.json. Reading, checking and answering
// are this package's own: only the document comes from the library.
func documentConfig(version string) huma.Config {
	if version == "" {
		version = "0"
	}
	reg := huma.NewMapRegistry("#/components/schemas/", huma.DefaultSchemaNamer)
	return huma.Config{OpenAPI: &huma.OpenAPI{
		OpenAPI: "3.1.0",
		Info: &huma.Info{
			Title: "beamward", Version: version,
			Description: "Says, second by second, whether a laser guide star beam may be on the sky. Beside the hardware interlock, spotters and the authorities' own procedures, never in their place. Nothing here forces a beam open.",
		},
		Components: &huma.Components{
			Schemas: reg,
			SecuritySchemes: map[string]*huma.SecurityScheme{
				"token":       {Type: "http", Scheme: "bearer", Description: "a token of beamward"},
				"certificate": {Type: "mutualTLS"},
			},
		},
		Security: []map[string][]string{{"token": {}}, {"certificate": {}}},
	}}
}

func problemSchema(reg huma.Registry) *huma.Schema {
	return reg.Schema(reflect.TypeFor[wire.Problem](), true, "Problem")
}

// describeHealth describes the routes that stand before signing in.
func (a *API) describeHealth() {
	reg := a.document.OpenAPI().Components.Schemas
	anyone := []map[string][]string{}
	for path, id := range map[string]string{"/healthz": "healthz", "/readyz": "readyz"} {
		op := &huma.Operation{Method: "GET", Path: path, OperationID: id, Summary: "Whether the service lives; for anybody", Security: anyone, Responses: map[string]*huma.Response{
			"200": {Description: "OK", Content: map[string]*huma.MediaType{jsonType: {Schema: &huma.Schema{Type: huma.TypeObject}}}},
			"400": problemResponse(reg, 400), "403": problemResponse(reg, 403), "406": problemResponse(reg, 406),
		}}
		if id == "readyz" {
			op.Summary = "Whether the service does its work, and what is missing; for anybody"
			ready := map[string]*huma.MediaType{jsonType: {Schema: reg.Schema(reflect.TypeFor[readyDoc](), true, "Ready")}}
			op.Responses["200"].Content = ready
			op.Responses["503"] = &huma.Response{Description: "Service Unavailable", Content: ready}
		}
		a.document.OpenAPI().AddOperation(op)
	}
}

// allowNull adds null to what the schemas say of pointers to objects: the
// library knows it of plain values alone.
func allowNull(reg huma.Registry) {
	for name, schema := range reg.Map() {
		t := reg.TypeFromRef("#/components/schemas/" + name)
		if t == nil || t.Kind() != reflect.Struct {
			continue
		}
		for i := range t.NumField() {
			f := t.Field(i)
			key, rest, _ := strings.Cut(f.Tag.Get("json"), ",")
			p := schema.Properties[key]
			if p == nil || f.Type.Kind() != reflect.Pointer || strings.Contains(rest, "omitempty") || p.Ref == "" {
				continue
			}
			schema.Properties[key] = &huma.Schema{AnyOf: []*huma.Schema{{Ref: p.Ref}, {Type: "null"}}, Description: p.Description}
		}
	}
}

// marshalDocument writes the document, once everything is in it.
func (a *API) marshalDocument() ([]byte, error) {
	a.describeHealth()
	allowNull(a.document.OpenAPI().Components.Schemas)
	if a.options.Metrics != nil {
		a.document.OpenAPI().AddOperation(&huma.Operation{Method: "GET", Path: "/metrics", OperationID: "metrics", Summary: "Figures for Prometheus", Responses: map[string]*huma.Response{
			"200": {Description: "OK", Content: map[string]*huma.MediaType{"text/plain": {Schema: &huma.Schema{Type: huma.TypeString}}}},
		}})
	}
	return json.Marshal(a.document.OpenAPI())
}
