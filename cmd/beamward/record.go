package main

import (
	"context"
	"errors"
	"fmt"
	"os"

	"github.com/spf13/cobra"

	"beamward/service/journal"
)

func recordCommand(out *console) *cobra.Command {
	var from recordPlace
	c := group("record", "Show, verify and export the record",
		`Reads the record in the configuration's data_dir, for reading only. A service
may be running on it meanwhile.`,
		recordShowCommand(out, &from), recordVerifyCommand(out, &from), recordExportCommand(out, &from))
	from.flags(c)
	return c
}

// recordPlace is where the record is.
type recordPlace struct {
	config configFlag
	dir    string
}

// flags adds the flags that say so, to a command and those below it.
func (p *recordPlace) flags(c *cobra.Command) {
	c.PersistentFlags().StringVar(&p.config.path, "config", "", "the site's configuration `file`, whose data_dir is meant")
	c.PersistentFlags().StringVar(&p.dir, "data-dir", "", "the `folder` of the record itself, instead of --config")
}

func (p *recordPlace) open() (*journal.Reader, error) {
	dir := p.dir
	switch {
	case p.dir != "" && p.config.path != "":
		return nil, usagef("--data-dir and --config: give one of them")
	case p.dir == "":
		c, err := p.config.load()
		if err != nil {
			return nil, err
		}
		dir = c.DataDir
	}
	return journal.OpenReader(dir)
}

func recordVerifyCommand(out *console, from *recordPlace) *cobra.Command {
	return &cobra.Command{
		Use:   "verify",
		Short: "Prove that nothing on record was changed, or say where it was",
		Long: `Walks the whole record: each block against its digest and the one before it, each
text against its sum. Fails at the first damage. The head it prints, written down
elsewhere, proves later that nothing up to it was changed.`,
		Args: cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			r, err := from.open()
			if err != nil {
				return err
			}
			defer r.Close()
			p := out.watch("blocks verified")
			rep, err := r.Verify(c.Context(), p.at)
			p.end()
			if err != nil {
				return err
			}
			return writeVerified(out, &rep)
		},
	}
}

type verified struct {
	Verifies bool          `json:"verifies"`
	Blocks   int           `json:"blocks"`
	Pruned   int           `json:"pruned_blocks"`
	Entries  uint64        `json:"entries"`
	Gone     uint64        `json:"pruned_entries"`
	Gaps     uint64        `json:"lost_entries"`
	Texts    int           `json:"texts"`
	Cuts     int           `json:"torn_ends"`
	First    uint64        `json:"first_seq"`
	Last     uint64        `json:"last_seq"`
	Head     string        `json:"head"`
	Damage   *recordDamage `json:"damage,omitempty"`
}

type recordDamage struct {
	First uint64 `json:"first_seq,omitempty"`
	Last  uint64 `json:"last_seq,omitempty"`
	What  string `json:"what"`
	Mend  string `json:"mend,omitempty"`
}

func writeVerified(out *console, rep *journal.Report) error {
	v := verified{
		Verifies: rep.Damage == nil, Blocks: rep.Blocks, Pruned: rep.Pruned, Entries: rep.Entries, Gone: rep.Gone, Gaps: rep.Gaps,
		Texts: rep.Lists, Cuts: rep.Cuts, First: rep.First, Last: rep.Last, Head: rep.Head.String(),
	}
	if d := rep.Damage; d != nil {
		v.Damage = &recordDamage{d.First, d.Last, d.What, d.Mend}
	}
	if out.json {
		if err := out.document(v); err != nil {
			return err
		}
	} else if rep.Damage == nil {
		out.printf("the record verifies: %d entries in %d blocks, %d to %d, %d texts\n", v.Entries, v.Blocks, v.First, v.Last, v.Texts)
		if v.Pruned > 0 {
			out.printf("pruned: %d entries in %d blocks are past their keeping; their digests are left\n", v.Gone, v.Pruned)
		}
		if v.Gaps > 0 {
			out.printf("lost: %d entries did not fit the queue, and are counted on record\n", v.Gaps)
		}
		if v.Cuts > 0 {
			out.printf("torn: %d unfinished blocks were cut off at a start\n", v.Cuts)
		}
		out.printf("head %s\n", v.Head)
	}
	if rep.Damage != nil {
		return rep.Damage
	}
	return nil
}

func recordExportCommand(out *console, from *recordPlace) *cobra.Command {
	var first, last uint64
	var path string
	c := &cobra.Command{
		Use:   "export [--from SEQ] [--to SEQ] [-o FILE]",
		Short: "Write entries with all that proves them, as JSON lines",
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			r, err := from.open()
			if err != nil {
				return err
			}
			defer r.Close()
			q := journal.Query{From: first, To: last}
			if path == "" {
				return r.Export(c.Context(), out, q)
			}
			return exportTo(c.Context(), r, path, q)
		},
	}
	c.Flags().Uint64Var(&first, "from", 0, "number of the first entry; whole blocks are written")
	c.Flags().Uint64Var(&last, "to", 0, "number of the last entry; 0: to the end")
	c.Flags().StringVarP(&path, "output", "o", "", "write to a new `file` instead of stdout")
	return c
}

// exportTo writes into a file that did not exist, and leaves none behind that
// is not whole.
func exportTo(ctx context.Context, r *journal.Reader, path string, q journal.Query) error {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o600)
	if err != nil {
		return fmt.Errorf("exporting the record: %w: name a file that does not exist yet", err)
	}
	err = r.Export(ctx, f, q)
	if err == nil {
		err = f.Sync()
	}
	if err = errors.Join(err, f.Close()); err != nil {
		_ = os.Remove(path)
	}
	return err
}
