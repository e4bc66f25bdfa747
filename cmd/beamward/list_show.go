package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/service/client"
)

func listShowCommand(out *console, from *serverFlags) *cobra.Command {
	var status, authority, format string
	c := &cobra.Command{
		Use:   "show [AUTHORITY/ID] [--status STATUS] [--authority NAME] [--format table|yaml|csv]",
		Short: "Show which lists there are, or one of them",
		Args:  cobra.MaximumNArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			if status != "" {
				if err := oneOf("status", status, "waiting", "in-force", "replaced", "withdrawn"); err != nil {
					return err
				}
			}
			if err := oneOf("format", format, "table", "yaml", "csv"); err != nil {
				return err
			}
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			if len(args) == 0 {
				if format != "table" {
					return usagef("--format %s: name one list, AUTHORITY/ID", format)
				}
				lists, err := asks.Lists(c.Context(), client.ListQuery{Status: status, Authority: closures.AuthorityID(authority)})
				if err != nil {
					return explained("list show", err)
				}
				return writeLists(out, lists)
			}
			a, id, err := listName(args[0])
			if err != nil {
				return err
			}
			if format != "table" {
				return explained("list show "+args[0], asks.ListText(c.Context(), a, id, format, out))
			}
			l, err := asks.List(c.Context(), a, id)
			if err != nil {
				return explained("list show "+args[0], err)
			}
			return writeList(out, &l)
		},
	}
	choice(c, &status, "status", "", "only lists of a status", "waiting", "in-force", "replaced", "withdrawn")
	c.Flags().StringVar(&authority, "authority", "", "only this authority's")
	choice(c, &format, "format", "table", "of one list, the list itself where yaml or csv", "table", "yaml", "csv")
	return c
}

func writeLists(out *console, lists []client.ListHead) error {
	if out.json {
		if lists == nil {
			lists = []client.ListHead{}
		}
		return out.document(map[string]any{"lists": lists})
	}
	rows := [][]string{{"LIST", "STATUS", "COVERS", "REGIONS", "WINDOWS", "NEEDS"}}
	for _, l := range lists {
		rows = append(rows, []string{
			string(l.Authority) + "/" + string(l.ID), l.Status, clockTime(l.Covers.From) + " to " + clockTime(l.Covers.Until),
			fmt.Sprint(l.Regions), fmt.Sprint(l.Windows), l.Needs,
		})
	}
	return out.table(rows)
}

func writeList(out *console, l *client.List) error {
	if out.json {
		return out.document(l)
	}
	writeListHead(out, &l.ListHead)
	out.printf("  the sky outside its regions is %s\n", l.UnlistedSky)
	if len(l.Replaces) > 0 {
		out.printf("  replaces %s\n", joinNames(l.Replaces))
	}
	rows := [][]string{{"REGION", "SHAPE", "THROUGHOUT", "WINDOWS", "CLOSED_S"}}
	for _, r := range l.RegionList {
		rows = append(rows, []string{r.ID, r.Shape, r.Throughout, fmt.Sprint(r.Windows), fmt.Sprintf("%.3f", r.ClosedS)})
	}
	return out.table(rows)
}
