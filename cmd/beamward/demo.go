package main

import (
	"log/slog"

	"github.com/spf13/cobra"

	"beamward/service/demo"
)

func demoCommand(out *console) *cobra.Command {
	o := demo.Options{Out: out, Build: thisBuild().String()}
	var verbose bool
	c := &cobra.Command{
		Use:   "demo [--speed N] [--for 2m] [--listen ADDRESS]",
		Short: "Play a short night of an invented observatory; needs nothing",
		Long: `Plays the end of a night at the invented Skerry Peak on the real service, with its
feeds through real sockets, and shows every reason for which a beam is shuttered.
It steps an injected clock, so the speed is a ceiling. Its permits say simulated
inside the signed bytes and use a throw-away key.

Succeeds only if every reason was shown and the record that is left verifies.`,
		Args: cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			if !(o.Speed > 0) {
				return usagef("--speed %v: make it more than 0", o.Speed)
			}
			if o.For <= 0 {
				return usagef("--for %v: make it more than 0s", o.For)
			}
			o.JSON = out.json
			if verbose {
				o.Log = slog.New(slog.NewTextHandler(out.err, nil))
			}
			return demo.Run(c.Context(), o)
		},
	}
	c.Flags().Float64Var(&o.Speed, "speed", 4, "how many times as fast as real time, at most")
	c.Flags().DurationVar(&o.For, "for", demo.Length, "how much of the night to play, in its own time; the story takes all of the default")
	c.Flags().StringVar(&o.Listen, "listen", "", "`address` of the API; left out: a free port of the loopback interface")
	c.Flags().StringVar(&o.Dir, "dir", "", "an empty `folder` to work in and leave behind; left out: a temporary one")
	c.Flags().BoolVar(&verbose, "log", false, "show the service's own log on stderr")
	return c
}
