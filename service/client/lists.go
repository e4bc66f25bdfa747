package client

import (
	"context"
	"io"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"

	"beamward/closures"
)

// ListHead is a closure list in a table of lists.
type ListHead struct {
	Authority  closures.AuthorityID `json:"authority"`
	ID         closures.ListID      `json:"id"`
	Status     string               `json:"status"` // waiting, in-force, replaced, withdrawn
	Issued     time.Time            `json:"issued"`
	Covers     Span                 `json:"covers"`
	Beams      []closures.BeamID    `json:"beams"` // none: every beam
	Regions    int                  `json:"region_count"`
	Windows    int                  `json:"window_count"`
	Digest     string               `json:"digest"`
	By         string               `json:"by"`
	Confirmed  string               `json:"confirmed_by"`
	Withdrawal string               `json:"withdrawal_asked_by"`
	Needs      string               `json:"needs"` // nothing, confirmation, second-person
	ETag       string               `json:"etag"`
}

// Understood is what was read of a list.
type Understood struct {
	Replaces     []closures.ListID `json:"replaces"`
	UnlistedSky  string            `json:"unlisted_sky"`
	ProofDigest  bool              `json:"proved_digest"`
	ProofCount   bool              `json:"proved_window_count"`
	RegionList   []RegionSummary   `json:"regions"` // the first 1000
	ClosedTotalS float64           `json:"closed_total_s"`
}

// RegionSummary is what was read of one region.
type RegionSummary struct {
	ID         string  `json:"id"`
	Shape      string  `json:"shape"`
	Throughout string  `json:"throughout"`
	Windows    int     `json:"windows"`
	ClosedS    float64 `json:"closed_s"`
}

// List is one closure list.
type List struct {
	ListHead
	Understood
}

// Change is what a list changes against those that it replaces, region by
// region, for people to look at.
type Change struct {
	Replaced    []closures.ListID `json:"replaced"`
	CoverAdded  []Span            `json:"coverage_added"`
	CoverLost   []Span            `json:"coverage_lost"`
	OpenedS     float64           `json:"opened_s"`
	ClosedS     float64           `json:"closed_s"`
	Opened      []RegionSpan      `json:"opened"`
	Closed      []RegionSpan      `json:"closed"`
	UnlistedWas string            `json:"unlisted_sky_was"`
}

// RegionSpan is a span of time of a region.
type RegionSpan struct {
	Region string    `json:"region"`
	From   time.Time `json:"from"`
	Until  time.Time `json:"until"`
}

// Check is how a list would be understood and what it would do.
type Check struct {
	Authority closures.AuthorityID `json:"authority"`
	ID        closures.ListID      `json:"id"`
	Issued    time.Time            `json:"issued"`
	Covers    Span                 `json:"covers"`
	Beams     []closures.BeamID    `json:"beams"`
	Windows   int                  `json:"window_count"`
	Digest    string               `json:"digest"`
	Format    string               `json:"format"`
	Layout    string               `json:"layout"`
	Lines     int                  `json:"lines"`
	Class     string               `json:"class"` // same, tightening, loosening
	Would     string               `json:"would"`
	Change    Change               `json:"change"`
	Understood
}

// ListQuery says which lists to show. The zero query is all of them.
type ListQuery struct {
	Status    string
	Authority closures.AuthorityID
}

// Lists returns the lists that are known, page after page.
func (c *Client) Lists(ctx context.Context, q ListQuery) ([]ListHead, error) {
	var all []ListHead
	query := url.Values{"limit": {"1000"}}
	if q.Status != "" {
		query.Set("status", q.Status)
	}
	if q.Authority != "" {
		query.Set("authority", string(q.Authority))
	}
	for {
		var page struct {
			Lists  []ListHead `json:"lists"`
			Cursor string     `json:"cursor"`
		}
		r := get("v1", "lists")
		r.query = query
		if _, err := c.ask(ctx, r, &page); err != nil {
			return all, err
		}
		if all = append(all, page.Lists...); page.Cursor == "" {
			return all, nil
		}
		query.Set("cursor", page.Cursor)
	}
}

// List returns one list as it was understood.
func (c *Client) List(ctx context.Context, authority closures.AuthorityID, id closures.ListID) (out List, err error) {
	_, err = c.ask(ctx, get("v1", "lists", string(authority), string(id)), &out)
	return out, err
}

// ListText writes a list itself, as yaml or csv.
func (c *Client) ListText(ctx context.Context, authority closures.AuthorityID, id closures.ListID, format string, to io.Writer) error {
	r := get("v1", "lists", string(authority), string(id))
	r.accepts = mediaTypes[format]
	return c.copy(ctx, r, to)
}

var mediaTypes = map[string]string{"yaml": "application/yaml", "json": "application/json", "csv": "text/csv"}

// LayoutPrefix stands before the name of a layout of the service's config,
// where a format is asked for.
const LayoutPrefix = "layout:"

// listRequest is a post of a list's text. format is yaml, json, csv, a layout
// after LayoutPrefix, or empty where the text itself tells.
func listRequest(text io.Reader, format, key string, path ...string) request {
	r := request{method: http.MethodPost, path: path, body: text, header: http.Header{"Content-Type": {"application/octet-stream"}}}
	if m := mediaTypes[format]; m != "" {
		r.header.Set("Content-Type", m)
	} else if layout, is := strings.CutPrefix(format, LayoutPrefix); is {
		r.query = url.Values{"layout": {layout}}
	} else if format != "" {
		r.query = url.Values{"format": {format}}
	}
	if key != "" {
		r.header.Set("Idempotency-Key", key)
	}
	return r
}

// AddList brings a closure list. The text is read once, as it is sent. format
// is yaml, json, csv, a layout after LayoutPrefix, or empty where the text
// itself tells. An empty key is left out.
func (c *Client) AddList(ctx context.Context, text io.Reader, format, key string) (out List, err error) {
	_, err = c.ask(ctx, listRequest(text, format, key, "v1", "lists"), &out)
	return out, err
}

// CheckList asks how a list would be understood and what it would do; the
// service keeps nothing of it.
func (c *Client) CheckList(ctx context.Context, text io.Reader, format string) (out Check, err error) {
	_, err = c.ask(ctx, listRequest(text, format, "", "v1", "lists", "check"), &out)
	return out, err
}

// ConfirmList lets a waiting list take effect. digest is that of the list as it
// was looked at.
func (c *Client) ConfirmList(ctx context.Context, authority closures.AuthorityID, id closures.ListID, digest string) (out List, err error) {
	return c.confirm(ctx, authority, id, digest, false)
}

// ConfirmWithdrawal lets a list's withdrawal, which somebody asked for, take
// effect.
func (c *Client) ConfirmWithdrawal(ctx context.Context, authority closures.AuthorityID, id closures.ListID, digest string) (out List, err error) {
	return c.confirm(ctx, authority, id, digest, true)
}

func (c *Client) confirm(ctx context.Context, authority closures.AuthorityID, id closures.ListID, digest string, withdrawal bool) (out List, err error) {
	body := struct {
		Digest     string `json:"digest"`
		Withdrawal bool   `json:"withdrawal,omitempty"`
	}{digest, withdrawal}
	err = c.send(ctx, body, &out, "", "", "v1", "lists", string(authority), string(id), "confirm")
	return out, err
}

// WithdrawList takes a list out of force, or asks for it where that waits for
// confirmation: see the answer's Needs.
func (c *Client) WithdrawList(ctx context.Context, authority closures.AuthorityID, id closures.ListID, reference string) (out List, err error) {
	body := struct {
		Reference string `json:"reference,omitempty"`
	}{reference}
	err = c.send(ctx, body, &out, "", "", "v1", "lists", string(authority), string(id), "withdraw")
	return out, err
}

// number writes a number for a query.
func number(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }
