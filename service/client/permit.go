package client

import (
	"context"
	"crypto/ed25519"
	"crypto/rand"
	"errors"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Lease is a permit that was verified, and when it was asked for.
type Lease struct {
	wire.Permit           // as its signed payload has it
	Sent        time.Time // when the request was sent, with Go's monotonic reading
	JSON        []byte    // the answer as it came
}

// Open reports whether the beam may be on the sky at an instant, which should
// come from time.Now. False, always, for a permit that is simulated, shuttered
// or run out by any clock. The zero Lease is shuttered.
func (l *Lease) Open(now time.Time) bool {
	if l.Sent.IsZero() {
		return false
	}
	// By Go's monotonic clock, which stands still in a suspend, and by the wall
	// clock, which may be stepped: the first to end the lease ends it.
	running := now.Sub(l.Sent)
	wall := now.Round(0).Sub(l.Sent.Round(0))
	return l.Allows(now) && running >= 0 && running < l.Lease() && wall >= 0 && wall < l.Lease()
}

// seen is the newest decision that was read of a beam.
type seen struct {
	boot string
	seq  uint64
}

// PermitKey returns the key that permits are verified with: the one given, or
// the one that the service shows, which is then kept.
func (c *Client) PermitKey(ctx context.Context) (ed25519.PublicKey, error) {
	c.mu.Lock()
	key := c.key
	c.mu.Unlock()
	if key != nil {
		return key, nil
	}
	out, err := c.do(ctx, request{method: "GET", path: []string{"v1", "permit-key"}, accepts: "application/jwk+json, application/json"})
	if err != nil {
		return nil, err
	}
	defer out.Body.Close()
	data, err := readAll(out.Body)
	if err != nil {
		return nil, fmt.Errorf("reading the permit key: %w", err)
	}
	if key, err = wire.ParseJWK(data); err != nil {
		return nil, err
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.key == nil {
		c.key = key
	}
	return c.key, nil
}

// Permit asks for a permit and verifies it. With an error there is no permit.
func (c *Client) Permit(ctx context.Context, beam closures.BeamID) (Lease, error) {
	key, err := c.PermitKey(ctx)
	if err != nil {
		return Lease{}, err
	}
	nonce := rand.Text()
	q := get("v1", "beams", string(beam), "permit")
	q.query = map[string][]string{"nonce": {nonce}}
	q.accepts = "application/json"
	sent := time.Now()
	out, err := c.do(ctx, q)
	if err != nil {
		return Lease{}, err
	}
	defer out.Body.Close()
	data, err := readAll(out.Body)
	if err != nil {
		return Lease{}, fmt.Errorf("reading a permit: %w", err)
	}
	outer, err := wire.ParsePermit(data)
	if err != nil {
		return Lease{}, err
	}
	p, err := wire.VerifyPermit(outer.Signed, key)
	if err != nil {
		return Lease{}, err
	}
	switch {
	case p.Beam != beam:
		return Lease{}, errors.New("verifying a permit: it is about another beam")
	case p.Nonce != nonce:
		return Lease{}, errors.New("verifying a permit: it answers another request")
	case !c.newer(&p):
		return Lease{}, errors.New("verifying a permit: it is older than one that was seen before")
	}
	return Lease{Permit: p, Sent: sent, JSON: data}, nil
}

// newer reports whether a permit is at least as new as the newest seen of its
// beam and boot, and remembers it. A decision that comes out of order must not
// be acted on after a newer one.
func (c *Client) newer(p *wire.Permit) bool {
	c.mu.Lock()
	defer c.mu.Unlock()
	if old := c.seen[p.Beam]; old.boot == p.BootID && p.Seq < old.seq {
		return false
	}
	c.seen[p.Beam] = seen{p.BootID, p.Seq}
	return true
}
