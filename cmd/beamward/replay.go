package main

import (
	"errors"
	"strconv"

	"github.com/spf13/cobra"

	"beamward/service"
	"beamward/service/journal"
	"beamward/service/replay"
)

func replayCommand(out *console) *cobra.Command {
	var from recordPlace
	var over replay.Range
	c := &cobra.Command{
		Use:   "replay",
		Short: "Decide a night again from its record, and hold it against the record",
		Long: `Gives the recorded facts to the same decision once more, at the recorded
instants, and compares every decision, tally and snapshot. On the build that
recorded them they are the same to the bit; on another, states and reasons are,
but where a margin is too small to tell, which is listed. Fails at a difference.`,
		Args: cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			r, err := from.open()
			if err != nil {
				return err
			}
			defer r.Close()
			o, end := replayOptions(c, out, r)
			report, err := replay.Replay(c.Context(), r, over, o)
			end()
			if err != nil {
				return err
			}
			if out.json {
				if err := out.document(report); err != nil {
					return err
				}
			} else {
				out.printf("%s", report.Words())
			}
			if !report.Identical() {
				return errors.New("the record was not decided so by this program: see the differences above")
			}
			return nil
		},
	}
	from.flags(c)
	c.Flags().Uint64Var(&over.From, "from", 0, "the first entry's `number`; 0: from the start")
	c.Flags().Uint64Var(&over.To, "to", 0, "the last entry's `number`; 0: to the end")
	return c
}

func explainCommand(out *console) *cobra.Command {
	var from recordPlace
	c := &cobra.Command{
		Use:   "explain SEQ",
		Short: "Say what an entry of the record rested on",
		Long: `For a decision: every check with its verdict and margin, the ages of what was
heard, the aim, the lists, the holds and the rules it rested on, and what changed
against the one before. For a fact: what it said and what it did.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			seq, err := strconv.ParseUint(args[0], 10, 63)
			if err != nil || seq == 0 {
				return usagef("%q is not the number of an entry: give what record show prints first", args[0])
			}
			r, err := from.open()
			if err != nil {
				return err
			}
			defer r.Close()
			o, end := replayOptions(c, out, r)
			e, err := replay.Explain(c.Context(), r, seq, o)
			end()
			if err != nil {
				return err
			}
			if out.json {
				return out.document(e)
			}
			out.printf("%s", e.Words())
			return nil
		},
	}
	from.flags(c)
	return c
}

// replayOptions are what a replay of a record needs; end ends its progress.
func replayOptions(c *cobra.Command, out *console, r *journal.Reader) (o replay.Options, end func()) {
	p := out.watch("entries replayed")
	return replay.Options{Texts: service.Texts(c.Context(), r), Build: thisBuild().String()}, p.end
}
