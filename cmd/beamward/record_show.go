package main

import (
	"encoding/json"
	"fmt"
	"strings"
	"time"
	"unicode/utf8"

	"github.com/spf13/cobra"

	"beamward/closures/wire"
	"beamward/service/journal"
)

func recordShowCommand(out *console, from *recordPlace) *cobra.Command {
	var first, last uint64
	var since, until string
	var kinds []string
	var limit int
	var newest bool
	c := &cobra.Command{
		Use:   "show [--from SEQ] [--to SEQ] [--since T] [--until T] [--kind KIND]...",
		Short: "Show entries of the record",
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			q := journal.Query{From: first, To: last, Kinds: kinds, NewestFirst: newest}
			var err error
			if q.Since, err = instantFlag("since", since); err != nil {
				return err
			}
			if q.Until, err = instantFlag("until", until); err != nil {
				return err
			}
			if limit < 0 {
				return usagef("--limit %d: make it 0 or more", limit)
			}
			r, err := from.open()
			if err != nil {
				return err
			}
			defer r.Close()
			n := 0
			q.Pruned = func(first, last uint64, count int) error {
				out.say("entries %d to %d are past their keeping: %d are gone, their digests are left", first, last, count)
				return nil
			}
			return r.Read(c.Context(), q, func(e journal.Entry) error {
				if n++; limit > 0 && n > limit {
					return journal.ErrStop
				}
				if err := showEntry(out, &e); err != nil {
					return err
				}
				return out.broken
			})
		},
	}
	c.Flags().Uint64Var(&first, "from", 0, "number of the first entry")
	c.Flags().Uint64Var(&last, "to", 0, "number of the last entry; 0: to the end")
	c.Flags().StringVar(&since, "since", "", "the first instant, YYYY-MM-DDThh:mm:ssZ")
	c.Flags().StringVar(&until, "until", "", "the instant before which to end")
	c.Flags().StringSliceVar(&kinds, "kind", nil, "only entries of a kind, such as decision, hold, aim; again for more")
	c.Flags().IntVar(&limit, "limit", 0, "most entries to show; 0: all")
	c.Flags().BoolVar(&newest, "newest-first", false, "show the newest first")
	return c
}

// instantFlag reads an instant in the one form that the whole program takes.
func instantFlag(name, text string) (time.Time, error) {
	if text == "" {
		return time.Time{}, nil
	}
	t, err := wire.ParseTime(text)
	if err != nil {
		return time.Time{}, usagef("--%s %.40q: write UTC as YYYY-MM-DDThh:mm:ssZ", name, text)
	}
	return t, nil
}

type shownEntry struct {
	Seq  uint64          `json:"seq"`
	At   string          `json:"at"`
	Kind string          `json:"kind"`
	Body json.RawMessage `json:"body"`
}

// showEntry writes one entry on one line. Only a decision is put into words;
// anything else is shown as it is on record.
func showEntry(out *console, e *journal.Entry) error {
	if out.json {
		body := json.RawMessage(e.Body)
		if !json.Valid(e.Body) {
			body, _ = json.Marshal(strings.ToValidUTF8(string(e.Body), "\uFFFD"))
		}
		return out.object(shownEntry{e.Seq, wire.FormatTime(e.At), e.Kind, body})
	}
	out.printf("%d  %s  %-10s  %s\n", e.Seq, wire.FormatTime(e.At), e.Kind, saysOf(e))
	return nil
}

func saysOf(e *journal.Entry) string {
	if e.Kind != wire.KindDecision {
		return printable(string(e.Body))
	}
	d, err := wire.DecodeDecision(e.Body)
	if err != nil {
		return printable(string(e.Body))
	}
	s := string(d.Beam) + " shuttered: " + strings.Join(d.Codes.Names(), ", ")
	if d.Open {
		s = string(d.Beam) + " open"
		if !d.OpenUntil.IsZero() {
			s += " until " + stamp(d.OpenUntil)
		}
	}
	return s
}

// stamp writes an instant to the millisecond, earlier rather than later.
func stamp(t time.Time) string { return wire.FormatTime(t.UTC().Truncate(time.Millisecond)) }

// printable keeps what is shown from acting on a terminal.
func printable(s string) string {
	if !utf8.ValidString(s) || strings.ContainsFunc(s, func(r rune) bool { return r < ' ' || r == 0x7f || r >= 0x80 && r < 0xa0 }) {
		return fmt.Sprintf("%q", s)
	}
	return s
}
