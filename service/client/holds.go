package client

import (
	"context"
	"time"

	"beamward/closures"
)

// Region is a piece of sky, in the shape that closure lists have. Exactly one
// of its members is set.
type Region struct {
	ICRS     *Cone  `json:"icrs,omitempty"`
	Horizon  *Box   `json:"horizon,omitempty"`
	Track    *Track `json:"track,omitempty"`
	WholeSky bool   `json:"whole_sky,omitempty"`
}

// Cone is a circle on the sky.
type Cone struct {
	RA     float64 `json:"ra_deg"`
	Dec    float64 `json:"dec_deg"`
	Radius float64 `json:"radius_deg"`
}

// Box is bounded by azimuths and elevations; AzFrom above AzTo passes through
// north.
type Box struct {
	AzFrom   float64 `json:"az_from_deg"`
	AzTo     float64 `json:"az_to_deg"`
	ElFrom   float64 `json:"el_from_deg"`
	ElTo     float64 `json:"el_to_deg"`
	Observed bool    `json:"observed,omitempty"`
}

// Track is a circle that moves.
type Track struct {
	Radius float64 `json:"radius_deg"`
	Points []Point `json:"points"`
}

// Point is where a track is at an instant.
type Point struct {
	At  time.Time `json:"at"`
	RA  float64   `json:"ra_deg"`
	Dec float64   `json:"dec_deg"`
}

// NewHold is a hold to be placed.
type NewHold struct {
	Beam     closures.BeamID `json:"beam"` // closures.EveryBeam: all
	Reason   string          `json:"reason"`
	From     *time.Time      `json:"from,omitempty"`   // nil: at once
	Until    *time.Time      `json:"until,omitempty"`  // nil: until released
	Region   *Region         `json:"region,omitempty"` // nil: the whole sky
	Order    string          `json:"order,omitempty"`  // site or authority
	Caller   string          `json:"caller,omitempty"`
	CallBack string          `json:"call_back,omitempty"`
}

// Hold is a hold as it is kept.
type Hold struct {
	ID       closures.HoldID `json:"id"`
	Beam     closures.BeamID `json:"beam"`
	Reason   string          `json:"reason"`
	By       string          `json:"by"`
	Placed   time.Time       `json:"placed"`
	From     time.Time       `json:"from"`
	Until    *time.Time      `json:"until"`
	Region   *Region         `json:"region"`
	Order    string          `json:"order"`
	Caller   string          `json:"caller"`
	CallBack string          `json:"call_back"`
	Now      bool            `json:"now"`
	ETag     string          `json:"etag"`
}

// Holds returns the holds that are placed.
func (c *Client) Holds(ctx context.Context) ([]Hold, error) {
	var out struct {
		Holds []Hold `json:"holds"`
	}
	_, err := c.ask(ctx, get("v1", "holds"), &out)
	return out.Holds, err
}

// PlaceHold places a hold; it returns once the hold is in force and on record.
// With an error that is no *Problem it may be in force all the same: send it
// again with the same key.
func (c *Client) PlaceHold(ctx context.Context, h NewHold, key string) (out Hold, err error) {
	err = c.send(ctx, h, &out, key, "", "v1", "holds")
	return out, err
}

// ReleaseHold ends a hold. An authority's order asks for its reference. tag is
// the hold's as it was looked at; empty: none.
func (c *Client) ReleaseHold(ctx context.Context, id closures.HoldID, reference, tag string) error {
	body := struct {
		Reference string `json:"reference,omitempty"`
	}{reference}
	return c.send(ctx, body, nil, "", tag, "v1", "holds", string(id), "release")
}
