package main

import (
	"errors"
	"time"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/client"
)

func permitCommand(out *console) *cobra.Command {
	var from serverFlags
	c := &cobra.Command{
		Use:   "permit BEAM [--server ADDRESS]",
		Short: "Succeed only while a beam may be on the sky",
		Long: `Asks for the permit of a beam, verifies its signature, its nonce and its times, and
says what it says. Succeeds only when the permit is open, still valid and not
simulated; anything else, an unreachable service too, means shuttered.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			l, err := asks.Permit(c.Context(), closures.BeamID(args[0]))
			if err != nil {
				return explained("permit "+args[0], err)
			}
			now := time.Now()
			open := l.Open(now)
			if out.json {
				if _, err := out.Write(append(l.JSON, '\n')); err != nil {
					return err
				}
			} else {
				writePermit(out, &l, open)
			}
			switch {
			case open:
				return nil
			case l.State != wire.Open:
				return &toldError{}
			case l.Simulated:
				return errors.New("the permit is simulated: no beam may follow it")
			}
			return errors.New("the permit has run out, or this machine's clock is wrong")
		},
	}
	from.on(c)
	c.Flags().StringVar(&from.keyFile, "key", "", "`file` with the permit key (JWK) to verify by; left out: the key that the service shows")
	_ = c.MarkFlagFilename("key", "json", "jwk")
	return c
}

func writePermit(out *console, l *client.Lease, open bool) {
	switch {
	case open:
		out.printf("%s OPEN until %s, entry %d\n", l.Beam, stamp(l.ValidUntil), l.Seq)
	case l.State == wire.Open && l.Simulated:
		out.printf("%s SIMULATED open until %s, entry %d\n", l.Beam, stamp(l.ValidUntil), l.Seq)
	default:
		out.printf("%s SHUTTERED, entry %d\n", l.Beam, l.Seq)
	}
	for _, r := range l.Reasons {
		out.printf("  %s: %s\n", r.Code, reasonWords(&r))
	}
	for _, c := range l.Cautions {
		out.printf("  caution: %s: %s: %s\n", c.Code, c.Source, c.Detail)
	}
	if l.ClosesAt != nil {
		out.printf("  closes at %s\n", stamp(*l.ClosesAt))
	}
	if l.OpensAt != nil {
		out.printf("  can open at %s\n", stamp(*l.OpensAt))
	}
}

func reasonWords(r *wire.Reason) string {
	s := r.Detail
	if r.Source != "" {
		s = r.Source + ": " + s
	}
	if r.Ref != "" {
		s += " (" + printable(r.Ref) + ")"
	}
	if when := spanWords(r.From, r.Until); when != "" {
		s += ", " + when
	}
	return s
}
