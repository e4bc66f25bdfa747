package client

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Closure is one closure that can be foreseen: when the beam is to be
// shuttered, with all margins in it.
type Closure struct {
	Beam   string     `json:"beam"` // empty: every beam
	Code   string     `json:"code"`
	Source string     `json:"source"`
	From   *time.Time `json:"from"`
	Until  *time.Time `json:"until"` // nil: no end in sight
	List   string     `json:"list"`
	Region string     `json:"region"`
	Ref    string     `json:"ref"`
	Detail string     `json:"detail"`
}

// Plan says what a plan is for.
type Plan struct {
	Beam        closures.BeamID `json:"beam"`
	From        time.Time       `json:"from"`
	Until       time.Time       `json:"until"`
	RulesDigest string          `json:"rules_digest"`
	ListsDigest string          `json:"lists_digest"`
	LeftOut     []string        `json:"left_out"`
	Notice      string          `json:"notice"`
}

// Target is what one target can have.
type Target struct {
	Name     string         `json:"name"`
	Allowed  []Span         `json:"allowed"`
	AllowedS float64        `json:"allowed_s"`
	Usable   []Span         `json:"usable"` // of the allowed spans, what serves the target
	Blocked  []Closure      `json:"blocked"`
	Cautions []wire.Caution `json:"cautions"`
	Error    string         `json:"error"` // it could not be planned
}

// PlanQuery says for which beam and span to plan. A zero From is now, a zero
// Until 12 h later.
type PlanQuery struct {
	Beam        closures.BeamID
	From, Until time.Time
}

func (q *PlanQuery) values() url.Values {
	v := url.Values{"beam": {string(q.Beam)}}
	span(v, q.From, q.Until)
	return v
}

func span(v url.Values, from, until time.Time) {
	if !from.IsZero() {
		v.Set("from", stamp(from))
	}
	if !until.IsZero() {
		v.Set("until", stamp(until))
	}
}

// tableType tells the media type of a table of targets by its first character.
func tableType(table io.Reader) (io.Reader, string) {
	in := bufio.NewReader(table)
	for n := 1; n <= in.Size(); n++ {
		head, err := in.Peek(n)
		if err != nil {
			break
		}
		switch head[n-1] {
		case ' ', '\t', '\r', '\n':
		case '[':
			return in, "application/json"
		default:
			return in, "text/csv"
		}
	}
	return in, "text/csv"
}

func planRequest(q PlanQuery, table io.Reader, accepts string) request {
	body, media := tableType(table)
	return request{method: http.MethodPost, path: []string{"v1", "plan"}, query: q.values(), body: body, accepts: accepts, header: http.Header{"Content-Type": {media}}}
}

// Plan plans a table of targets, CSV or JSON, and gives each target to each, in
// the order of the table, as it comes. A plan that ends early is an error.
func (c *Client) Plan(ctx context.Context, q PlanQuery, table io.Reader, each func(Target) error) (head Plan, err error) {
	out, err := c.do(ctx, planRequest(q, table, "application/x-ndjson"))
	if err != nil {
		return head, err
	}
	defer out.Body.Close()
	lines := bufio.NewReaderSize(out.Body, 64<<10)
	for n := 0; ; n++ {
		line, err := readLine(lines)
		if err != nil {
			return head, fmt.Errorf("reading a plan of %s: it ends after %d targets: %w", c.base.Host, max(n-1, 0), err)
		}
		if n == 0 {
			if err := json.Unmarshal(line, &head); err != nil {
				return head, fmt.Errorf("reading a plan of %s: %w", c.base.Host, err)
			}
			continue
		}
		var one struct {
			Target
			Done    bool `json:"done"`
			Targets int  `json:"targets"`
		}
		if err := json.Unmarshal(line, &one); err != nil {
			return head, fmt.Errorf("reading a plan of %s: %w", c.base.Host, err)
		}
		if one.Done {
			if one.Targets != n-1 {
				return head, fmt.Errorf("reading a plan of %s: it has %d of %d targets", c.base.Host, n-1, one.Targets)
			}
			return head, nil
		}
		if err := each(one.Target); err != nil {
			return head, err
		}
	}
}

// PlanText writes a plan as the service renders it: json, csv or ics.
func (c *Client) PlanText(ctx context.Context, q PlanQuery, table io.Reader, format string, to io.Writer) error {
	r := planRequest(q, table, "")
	r.query.Set("format", format)
	return c.copy(ctx, r, to)
}

func (c *Client) copy(ctx context.Context, r request, to io.Writer) error {
	out, err := c.do(ctx, r)
	if err != nil {
		return err
	}
	defer out.Body.Close()
	if _, err := io.Copy(to, out.Body); err != nil {
		return fmt.Errorf("reading the answer of %s: %w", c.base.Host, err)
	}
	return nil
}

// ClosuresQuery says which closures to show. A zero From is now, a zero Until
// 24 h later; without Direction it is all that lists, holds and limits say.
type ClosuresQuery struct {
	From, Until time.Time
	Beam        closures.BeamID // empty: all
	Direction   *Equator
}

func (q *ClosuresQuery) values() url.Values {
	v := url.Values{}
	span(v, q.From, q.Until)
	if q.Beam != "" {
		v.Set("beam", string(q.Beam))
	}
	if q.Direction != nil {
		v.Set("ra_deg", number(q.Direction.RA))
		v.Set("dec_deg", number(q.Direction.Dec))
	}
	return v
}

// Closures returns the closures that can be foreseen, page after page, in order
// of their start.
func (c *Client) Closures(ctx context.Context, q ClosuresQuery) ([]Closure, error) {
	var all []Closure
	v := q.values()
	v.Set("limit", "1000")
	for {
		var page struct {
			Closures []Closure `json:"closures"`
			Cursor   string    `json:"cursor"`
		}
		r := get("v1", "closures")
		r.query = v
		if _, err := c.ask(ctx, r, &page); err != nil {
			return all, err
		}
		if all = append(all, page.Closures...); page.Cursor == "" {
			return all, nil
		}
		v.Set("cursor", page.Cursor)
	}
}

// ClosuresText writes them as the service renders them: csv or ics.
func (c *Client) ClosuresText(ctx context.Context, q ClosuresQuery, format string, to io.Writer) error {
	r := get("v1", "closures")
	r.query = q.values()
	r.query.Set("format", format)
	return c.copy(ctx, r, to)
}

// Outlook is what is to come for a beam's present aim.
type Outlook struct {
	Beam     closures.BeamID `json:"beam"`
	AimKnown bool            `json:"aim_known"`
	Target   string          `json:"target"`
	From     time.Time       `json:"from"`
	Until    time.Time       `json:"until"`
	Allowed  []Span          `json:"allowed"`
	Closures []Closure       `json:"closures"`
	Cautions []wire.Caution  `json:"cautions"`
	LeftOut  []string        `json:"left_out"`
}

// Outlook returns what is to come for a beam's present aim. A zero hours is the
// service's own choice.
func (c *Client) Outlook(ctx context.Context, beam closures.BeamID, hours float64) (out Outlook, err error) {
	r := get("v1", "beams", string(beam), "outlook")
	if hours != 0 {
		r.query = url.Values{"hours": {number(hours)}}
	}
	_, err = c.ask(ctx, r, &out)
	return out, err
}
