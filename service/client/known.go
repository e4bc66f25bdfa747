package client

import (
	"context"
	"encoding/json"
	"errors"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"
)

// Aircraft is one aircraft as one source knows it. What was not said is nil.
type Aircraft struct {
	Aircraft     string     `json:"aircraft"`
	Source       string     `json:"source"`
	SaidAt       *time.Time `json:"said_at"`
	AgeS         *float64   `json:"age_s"`
	Located      bool       `json:"located"`
	Unclear      bool       `json:"unclear"`
	Inside       bool       `json:"inside"`
	Popup        bool       `json:"popup"`
	OnGround     bool       `json:"on_ground"`
	Drill        bool       `json:"drill"`
	Lat          *float64   `json:"lat_deg"`
	Lon          *float64   `json:"lon_deg"`
	AltitudeM    *float64   `json:"altitude_m"`
	AltitudeFrom string     `json:"altitude_from"`
	Az           *float64   `json:"az_deg"`
	El           *float64   `json:"el_deg"`
	RangeM       *float64   `json:"range_m"`
	SpeedMPS     *float64   `json:"speed_mps"`
	TrackDeg     *float64   `json:"track_deg"`
	ClimbMPS     *float64   `json:"climb_mps"`
}

// Aircraft returns the aircraft that are known, page after page.
func (c *Client) Aircraft(ctx context.Context) ([]Aircraft, error) {
	var all []Aircraft
	v := url.Values{"limit": {"1000"}}
	for {
		var page struct {
			Aircraft []Aircraft `json:"aircraft"`
			Cursor   string     `json:"cursor"`
		}
		r := get("v1", "aircraft")
		r.query = v
		if _, err := c.ask(ctx, r, &page); err != nil {
			return all, err
		}
		if all = append(all, page.Aircraft...); page.Cursor == "" {
			return all, nil
		}
		v.Set("cursor", page.Cursor)
	}
}

// Neighbour is what is known of a neighbour telescope.
type Neighbour struct {
	ID           string     `json:"id"`
	State        string     `json:"state"`
	SaidAt       *time.Time `json:"said_at"`
	AgeS         *float64   `json:"age_s"`
	StaleAfterS  float64    `json:"stale_after_s"`
	ForgetAfterS float64    `json:"forget_after_s"`
	WhenSilent   string     `json:"when_silent"`
	Yields       string     `json:"yields"`
	ICRS         *Equator   `json:"icrs"`
	Horizon      *Horizon   `json:"horizon"`
	FieldDeg     float64    `json:"field_radius_deg"`
	Exposing     *bool      `json:"exposing"`
	Target       string     `json:"target"`
	AimSince     *time.Time `json:"aim_since"`
	EastM        float64    `json:"east_m"`
	NorthM       float64    `json:"north_m"`
	UpM          float64    `json:"up_m"`
}

// Neighbours returns what is known of the neighbour telescopes.
func (c *Client) Neighbours(ctx context.Context) ([]Neighbour, error) {
	var out struct {
		Neighbours []Neighbour `json:"neighbours"`
	}
	_, err := c.ask(ctx, get("v1", "neighbours"), &out)
	return out.Neighbours, err
}

// Ready is whether the service does its work, and what is missing.
type Ready struct {
	Ready   bool     `json:"ready"`
	Missing []string `json:"missing"`
}

// Ready asks whether the service is ready. One that is not is no error.
func (c *Client) Ready(ctx context.Context) (out Ready, err error) {
	_, err = c.ask(ctx, get("readyz"), &out)
	var p *Problem
	if errors.As(err, &p) && p.Status == http.StatusServiceUnavailable && json.Unmarshal(p.Body, &out) == nil {
		return out, nil
	}
	return out, err
}

// Exposure returns the hazard of a beam as the service's JSON: exposure limits
// and distances with the cautions that belong to each number. A zero elevation
// stands for the service's own choice of several.
func (c *Client) Exposure(ctx context.Context, beam string, elevationDeg float64) (out json.RawMessage, err error) {
	r := get("v1", "beams", beam, "exposure")
	if elevationDeg != 0 {
		r.query = url.Values{"elevation_deg": {number(elevationDeg)}}
	}
	_, err = c.ask(ctx, r, &out)
	return out, err
}

// Entry is one entry of the record.
type Entry struct {
	Seq  uint64          `json:"seq"`
	At   time.Time       `json:"at"`
	Kind string          `json:"kind"`
	Body json.RawMessage `json:"body"`
}

// RecordQuery says which entries to read. The zero query is all of them.
type RecordQuery struct {
	After, Before uint64 // numbers, not included
	Since, Until  time.Time
	Kinds         []string
	NewestFirst   bool
}

// Record gives the entries that match to each, page after page, until there
// are no more at present or each returns an error.
func (c *Client) Record(ctx context.Context, q RecordQuery, each func(Entry) error) error {
	v := url.Values{"limit": {"1000"}}
	if q.After > 0 {
		v.Set("after", strconv.FormatUint(q.After, 10))
	}
	if q.Before > 0 {
		v.Set("before", strconv.FormatUint(q.Before, 10))
	}
	if !q.Since.IsZero() {
		v.Set("since", stamp(q.Since))
	}
	if !q.Until.IsZero() {
		v.Set("until", stamp(q.Until))
	}
	if len(q.Kinds) > 0 {
		v.Set("kinds", strings.Join(q.Kinds, ","))
	}
	if q.NewestFirst {
		v.Set("order", "newest")
	}
	for {
		var page struct {
			Entries []Entry `json:"entries"`
			Cursor  string  `json:"cursor"`
		}
		r := get("v1", "record")
		r.query = v
		if _, err := c.ask(ctx, r, &page); err != nil {
			return err
		}
		for _, e := range page.Entries {
			if err := each(e); err != nil {
				return err
			}
		}
		if page.Cursor == "" {
			return nil
		}
		v.Set("cursor", page.Cursor)
	}
}
