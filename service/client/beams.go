package client

import (
	"context"

	"beamward/closures"
)

// Beams returns every beam.
func (c *Client) Beams(ctx context.Context) (out Beams, err error) {
	_, err = c.ask(ctx, get("v1", "beams"), &out)
	return out, err
}

// Beam returns one beam, with the tag for Rearm.
func (c *Client) Beam(ctx context.Context, beam closures.BeamID) (out Beam, err error) {
	header, err := c.ask(ctx, get("v1", "beams", string(beam)), &out)
	out.ETag = header.Get("ETag")
	return out, err
}

// Aim returns where a beam points.
func (c *Client) Aim(ctx context.Context, beam closures.BeamID) (out Aim, err error) {
	_, err = c.ask(ctx, get("v1", "beams", string(beam), "aim"), &out)
	return out, err
}

// Rearm lets a beam open again after a cause that asks for a person, and
// returns the beams as they are then. tag is that of the beam as it was looked
// at; empty: none. closures.EveryBeam re-arms all.
func (c *Client) Rearm(ctx context.Context, beam closures.BeamID, note, tag string) ([]BeamState, error) {
	var out struct {
		Beams []BeamState `json:"beams"`
	}
	body := struct {
		Note string `json:"note,omitempty"`
	}{note}
	err := c.send(ctx, body, &out, "", tag, "v1", "beams", string(beam), "rearm")
	return out.Beams, err
}

// Sources returns what is known of each source.
func (c *Client) Sources(ctx context.Context) (out Sources, err error) {
	_, err = c.ask(ctx, get("v1", "sources"), &out)
	return out, err
}
