package service

import (
	"bytes"
	"context"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/closures/wire"
	"beamward/geometry/sky"
	"beamward/service/config"
	"beamward/service/journal"
)

// resolver finds the texts that the record names by their digest. Lists are
// kept, since a durable state and its tail name the same ones. Nights are
// those of the rules given.
func resolver(ctx context.Context, r *journal.Reader, rules *closures.Rules) wire.Resolver {
	lists := map[closures.Digest]*closures.List{}
	return wire.Resolver{
		Rules: func(d closures.Digest) (*closures.Rules, error) {
			text, err := r.List(ctx, d.String())
			if err != nil {
				return nil, err
			}
			c, err := config.Parse(text, "/")
			if err != nil {
				return nil, err
			}
			return c.Rules, nil
		},
		List: func(d closures.Digest) (*closures.List, error) {
			if l := lists[d]; l != nil {
				return l, nil
			}
			text, err := r.List(ctx, d.String())
			if err != nil {
				return nil, err
			}
			l, _, err := listfile.Load(bytes.NewReader(text), listfile.JSON, listfile.Limits{})
			if err != nil {
				return nil, err
			}
			if l.Digest() != d {
				return nil, fmt.Errorf("list %s: its text on record is not the one that was taken", l)
			}
			lists[d] = l
			return l, nil
		},
		Night: func(bin time.Time) (*sky.Night, error) {
			return sky.Prepare(rules.Site.Position, bin, rules.Site.UT1)
		},
	}
}
