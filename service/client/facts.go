package client

import (
	"context"
	"encoding/json"
	"errors"
	"io"
	"net/http"
)

// Facts is what became of a body of facts.
type Facts struct {
	Accepted     int           `json:"accepted"`
	Superseded   int           `json:"superseded"`
	RefusedTotal int           `json:"refused_total"`
	Refused      []RefusedLine `json:"refused"` // the first 100
}

// RefusedLine is one line that was not taken.
type RefusedLine struct {
	Line  int    `json:"line"`
	Field string `json:"field"`
	Cause string `json:"cause"`
	Mend  string `json:"mend"`
}

// Facts sends facts, one JSON object a line, as they are read. With a *Problem
// the result says what was taken in before it; sending the same again is
// harmless.
func (c *Client) Facts(ctx context.Context, lines io.Reader) (out Facts, err error) {
	q := request{method: http.MethodPost, path: []string{"v1", "facts"}, body: lines, header: http.Header{"Content-Type": {"application/x-ndjson"}}}
	_, err = c.ask(ctx, q, &out)
	var p *Problem
	if errors.As(err, &p) && p.Body != nil {
		_ = json.Unmarshal(p.Body, &out) // the counts, where it has them
	}
	return out, err
}
