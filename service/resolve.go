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
	"beamward/service/replay"
)

// Texts finds the texts that a record names by their digest: configurations
// and closure lists.
func Texts(ctx context.Context, r *journal.Reader) replay.Texts {
	return replay.Texts{
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
			text, err := r.List(ctx, d.String())
			if err != nil {
				return nil, err
			}
			l, _, err := listfile.Load(bytes.NewReader(text), listfile.JSON, listfile.Recorded())
			if err != nil {
				return nil, err
			}
			if l.Digest() != d {
				return nil, fmt.Errorf("list %s: its text on record is not the one that was taken", l)
			}
			return l, nil
		},
	}
}

// resolver is what a start needs of the record's texts. Lists are kept, since
// a durable state and its tail name the same ones. Nights are those of the
// rules given.
func resolver(ctx context.Context, r *journal.Reader, rules *closures.Rules) wire.Resolver {
	texts := Texts(ctx, r)
	lists := map[closures.Digest]*closures.List{}
	return wire.Resolver{
		Rules: texts.Rules,
		List: func(d closures.Digest) (*closures.List, error) {
			if l := lists[d]; l != nil {
				return l, nil
			}
			l, err := texts.List(d)
			if err != nil {
				return nil, err
			}
			lists[d] = l
			return l, nil
		},
		Night: func(bin time.Time) (*sky.Night, error) {
			return sky.Prepare(rules.Site.Position, bin, rules.Site.UT1)
		},
	}
}
