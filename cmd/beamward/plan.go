package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/service/client"
)

func planCommand(out *console) *cobra.Command {
	var from configFlag
	var server serverFlags
	var ask planAsk
	var begin, end string
	c := &cobra.Command{
		Use:   "plan --config FILE | --server ADDRESS --beam BEAM [--from T] [--until T] [--lists DIR] [--format FORMAT] FILE",
		Short: "Say when each target is allowed, and what stands against it",
		Long: `Reads a table of targets (- is stdin) and says for each when the beam may point
there, under everything that can be foreseen, by the same checks that decide each
second. The table is CSV under a header row, or a JSON array with the same names:
name and ra_deg,dec_deg (with pm_ra_mas_yr,pm_dec_mas_yr, or rate_ra_arcsec_s,
rate_dec_arcsec_s,rate_at), or az_deg,el_deg,refracted, or an ephemeris of rows
with point_at; and length_s, priority, min_span_s, reacquire_s.

With --config it plans offline, on the lists in the authorities' folders and in
--lists, as if each were confirmed; holds are then not known. With --server a
running service plans on what is in force. A plan names what it left out.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			var err error
			if ask.over.From, err = instantFlag("from", begin); err != nil {
				return err
			}
			if ask.over.Until, err = instantFlag("until", end); err != nil {
				return err
			}
			if out.json && !c.Flags().Changed("format") {
				ask.format = "json"
			}
			if err := oneOf("format", ask.format, "table", "json", "csv", "ics"); err != nil {
				return err
			}
			switch {
			case server.asked() && from.path != "":
				return usagef("--server and --config: give one of them")
			case server.asked() && ask.lists != "":
				return usagef("--lists: a service plans on its own lists: leave it out, or plan offline with --config")
			case server.asked() && ask.chart != "":
				return usagef("--chart: a plan is drawn offline: give --config instead of --server")
			}
			table, err := openTargets(out, args[0])
			if err != nil {
				return err
			}
			defer table.Close()
			if server.asked() {
				return planAtServer(c.Context(), out, &server, &ask, table)
			}
			return planOffline(c.Context(), out, &from, &ask, table)
		},
	}
	from.on(c)
	server.on(c)
	c.Flags().StringVar(&ask.beam, "beam", "", "the beam, where there are several")
	c.Flags().StringVar(&begin, "from", "", "begin, YYYY-MM-DDThh:mm:ssZ; left out: now")
	c.Flags().StringVar(&end, "until", "", "end; left out: 12 hours later")
	c.Flags().StringVar(&ask.lists, "lists", "", "a `folder` with more closure lists")
	c.Flags().StringVar(&ask.chart, "chart", "", "draw the plan into an SVG `file` as well (offline)")
	choice(c, &ask.format, "format", "table", "how the plan is written", "table", "json", "csv", "ics")
	return c
}

// planAsk is what is to be planned.
type planAsk struct {
	beam   string
	over   struct{ From, Until time.Time } // zero: not said
	lists  string
	format string
	chart  string // file to draw into; empty: none
}

// whole fills in what was not said.
func (a *planAsk) whole() {
	if a.over.From.IsZero() {
		a.over.From = time.Now().UTC().Truncate(time.Second)
	}
	if a.over.Until.IsZero() {
		a.over.Until = a.over.From.Add(12 * time.Hour)
	}
}

func openTargets(out *console, path string) (io.ReadCloser, error) {
	if path == "-" {
		return io.NopCloser(out.in), nil
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("reading targets: %w", err)
	}
	return f, nil
}

// planAtServer has a running service plan. What it renders itself is passed on.
func planAtServer(ctx context.Context, out *console, server *serverFlags, ask *planAsk, table io.Reader) error {
	if err := needed("beam", ask.beam, "say which beam to plan for"); err != nil {
		return err
	}
	asks, err := server.client()
	if err != nil {
		return err
	}
	defer asks.Close()
	q := client.PlanQuery{Beam: closures.BeamID(ask.beam), From: ask.over.From, Until: ask.over.Until}
	if ask.format != "table" {
		return explained("plan", asks.PlanText(ctx, q, table, ask.format, out))
	}
	var targets []client.Target
	p := out.watch("targets planned")
	head, err := asks.Plan(ctx, q, table, func(t client.Target) error {
		targets = append(targets, t)
		p.at(len(targets), 0)
		return nil
	})
	p.end()
	if err != nil {
		return explained("plan", err)
	}
	w := planTable{out: out}
	w.begin(&head)
	for i := range targets {
		w.target(&targets[i])
	}
	return w.end()
}

// badTargets tells every line of a table that cannot be used.
func badTargets(err error) error {
	var bad *plan.Refusal
	if !errors.As(err, &bad) {
		return err
	}
	all := []error{fmt.Errorf("targets: refused whole: %d bad in all", bad.Total)}
	for _, r := range bad.Rows {
		line := fmt.Sprintf("targets: line %d: %s: %s", r.Line, r.Cause, r.Mend)
		if r.Text != "" {
			line += ": " + printable(r.Text)
		}
		all = append(all, errors.New(line))
	}
	return errors.Join(all...)
}
