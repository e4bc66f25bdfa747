package main

import (
	"context"
	"crypto/rand"
	"errors"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/client"
)

func holdCommand(out *console) *cobra.Command {
	var from serverFlags
	c := group("hold", "Shutter beams, end a hold, show holds", "",
		holdPlaceCommand(out, &from), holdReleaseCommand(out, &from), holdShowCommand(out, &from))
	from.on(c)
	return c
}

func holdPlaceCommand(out *console, from *serverFlags) *cobra.Command {
	var h client.NewHold
	var begin, end, icrs, horizon string
	var lasts time.Duration
	c := &cobra.Command{
		Use:   "place BEAM|'*' [--reason TEXT] [--for 10m]",
		Short: "Shutter a beam, or every beam, at once",
		Long: `Shutters a beam, or with '*' every beam, and says so once it is on record. Without
--for or --until the hold lasts until it is released.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			h.Beam = closures.BeamID(args[0])
			if err := holdTimes(&h, begin, end, lasts); err != nil {
				return err
			}
			if err := oneOf("order", h.Order, "site", "authority"); err != nil {
				return err
			}
			var err error
			if h.Region, err = holdRegion(icrs, horizon); err != nil {
				return err
			}
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			placed, err := placeHold(c.Context(), asks, h)
			if err != nil {
				return explained("hold place "+args[0], err)
			}
			return writeHolds(out, []client.Hold{placed}, true)
		},
	}
	c.Flags().StringVar(&h.Reason, "reason", "placed from the command line", "why, for the record")
	c.Flags().StringVar(&begin, "from", "", "when it begins, YYYY-MM-DDThh:mm:ssZ; left out: at once")
	c.Flags().StringVar(&end, "until", "", "when it ends; left out: when it is released")
	c.Flags().DurationVar(&lasts, "for", 0, "how long it lasts, instead of --until")
	c.Flags().StringVar(&icrs, "icrs", "", "only about a direction: ra_deg,dec_deg,radius_deg")
	c.Flags().StringVar(&horizon, "horizon", "", "only between az_from_deg,az_to_deg,el_from_deg,el_to_deg")
	choice(c, &h.Order, "order", "site", "whose order it is; an authority's is released by a second person", "site", "authority")
	c.Flags().StringVar(&h.Caller, "caller", "", "who called")
	c.Flags().StringVar(&h.CallBack, "call-back", "", "where they can be called back")
	return c
}

// placeHold tries again where no answer came, by the same key, so that there
// is one hold however often it was sent.
func placeHold(ctx context.Context, asks *client.Client, h client.NewHold) (client.Hold, error) {
	key := rand.Text()
	var placed client.Hold
	var err error
	for range 3 {
		placed, err = asks.PlaceHold(ctx, h, key)
		var p *client.Problem
		if err == nil || errors.As(err, &p) || ctx.Err() != nil {
			break
		}
	}
	return placed, err
}

func holdTimes(h *client.NewHold, begin, end string, lasts time.Duration) error {
	from, err := instantFlag("from", begin)
	if err != nil {
		return err
	}
	until, err := instantFlag("until", end)
	if err != nil {
		return err
	}
	switch {
	case lasts != 0 && end != "":
		return usagef("--for and --until: give one of them")
	case lasts < 0:
		return usagef("--for %v: make it more than 0s", lasts)
	case lasts > 0:
		until = time.Now().UTC().Add(lasts)
		if !from.IsZero() {
			until = from.Add(lasts)
		}
	}
	if !from.IsZero() {
		h.From = &from
	}
	if !until.IsZero() {
		h.Until = &until
	}
	return nil
}

func holdRegion(icrs, horizon string) (*client.Region, error) {
	switch {
	case icrs != "" && horizon != "":
		return nil, usagef("--icrs and --horizon: give one of them")
	case icrs != "":
		n, err := numbers("icrs", icrs, 3)
		if err != nil {
			return nil, err
		}
		return &client.Region{ICRS: &client.Cone{RA: n[0], Dec: n[1], Radius: n[2]}}, nil
	case horizon != "":
		n, err := numbers("horizon", horizon, 4)
		if err != nil {
			return nil, err
		}
		return &client.Region{Horizon: &client.Box{AzFrom: n[0], AzTo: n[1], ElFrom: n[2], ElTo: n[3]}}, nil
	}
	return nil, nil
}

// numbers reads a flag's n numbers, apart by commas.
func numbers(flag, text string, n int) ([]float64, error) {
	cells := strings.Split(text, ",")
	if len(cells) != n {
		return nil, usagef("--%s %.80q: write %d numbers apart by commas", flag, text, n)
	}
	out := make([]float64, n)
	for i, cell := range cells {
		v, err := wire.ParseNumber(strings.TrimSpace(cell))
		if err != nil {
			return nil, usagef("--%s %.80q: %w", flag, text, err)
		}
		out[i] = v
	}
	return out, nil
}

func holdReleaseCommand(out *console, from *serverFlags) *cobra.Command {
	var reference string
	c := &cobra.Command{
		Use:   "release ID [--reference TEXT]",
		Short: "End a hold",
		Args:  cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			if err := asks.ReleaseHold(c.Context(), closures.HoldID(args[0]), reference, ""); err != nil {
				return explained("hold release "+args[0], err)
			}
			if out.json {
				return out.document(map[string]any{"released": args[0]})
			}
			out.printf("hold %s is released\n", args[0])
			return nil
		},
	}
	c.Flags().StringVar(&reference, "reference", "", "the authority's own, for its orders")
	return c
}

func holdShowCommand(out *console, from *serverFlags) *cobra.Command {
	return &cobra.Command{
		Use:   "show [ID]",
		Short: "Show the holds that are placed, or one of them",
		Args:  cobra.MaximumNArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			holds, err := asks.Holds(c.Context())
			if err != nil {
				return explained("hold show", err)
			}
			if len(args) == 0 {
				return writeHolds(out, holds, false)
			}
			for _, h := range holds {
				if string(h.ID) == args[0] {
					return writeHolds(out, []client.Hold{h}, true)
				}
			}
			return errors.New("hold " + printable(args[0]) + ": not known: see which holds there are")
		},
	}
}

// writeHolds shows holds; one that was asked for by itself is a document of
// its own.
func writeHolds(out *console, holds []client.Hold, one bool) error {
	if out.json {
		if one {
			return out.document(holds[0])
		}
		if holds == nil {
			holds = []client.Hold{}
		}
		return out.document(map[string]any{"holds": holds})
	}
	rows := [][]string{{"HOLD", "BEAM", "NOW", "FROM", "UNTIL", "ORDER", "BY", "REASON"}}
	for _, h := range holds {
		until, now := "released", "no"
		if h.Until != nil {
			until = clockTime(*h.Until)
		}
		if h.Now {
			now = "yes"
		}
		rows = append(rows, []string{string(h.ID), string(h.Beam), now, clockTime(h.From), until, h.Order, h.By, printable(h.Reason)})
	}
	return out.table(rows)
}
