package main

import (
	"github.com/spf13/cobra"

	"beamward/closures"
)

func rearmCommand(out *console) *cobra.Command {
	var from serverFlags
	var note string
	c := &cobra.Command{
		Use:   "rearm BEAM|'*' [--note TEXT]",
		Short: "Let a beam open again after a cause that asks for a person",
		Long: `Says that a person has looked at what closed a beam. It overrides nothing: a cause
that is still there goes on closing, and asks for a person again.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			beams, err := asks.Rearm(c.Context(), closures.BeamID(args[0]), note, "")
			if err != nil {
				return explained("rearm "+args[0], err)
			}
			if out.json {
				return out.document(map[string]any{"beams": beams})
			}
			for i := range beams {
				b := &beams[i]
				out.printf("%s is re-armed: %s\n", b.Beam, b.State)
				for j := range b.Reasons {
					out.printf("  %s: %s\n", b.Reasons[j].Code, reasonWords(&b.Reasons[j]))
				}
			}
			return nil
		},
	}
	from.on(c)
	c.Flags().StringVar(&note, "note", "", "what was found, for the record")
	return c
}
