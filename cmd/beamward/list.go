package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/service/client"
)

func listCommand(out *console) *cobra.Command {
	var from serverFlags
	c := group("list", "Bring, show, confirm and withdraw closure lists",
		`Closure lists of a running service. A list with one bad line is refused whole, and
every bad line is told. A list that opens time waits until a person confirms it,
where its authority's rule says so, and closes meanwhile.`,
		listAddCommand(out, &from), listShowCommand(out, &from), listConfirmCommand(out, &from), listWithdrawCommand(out, &from))
	from.on(c)
	return c
}

func listAddCommand(out *console, from *serverFlags) *cobra.Command {
	var layout, format string
	c := &cobra.Command{
		Use:   "add FILE... [--layout FILE] [--format auto|yaml|json|csv]",
		Short: "Bring closure lists; - is stdin",
		Args:  cobra.MinimumNArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			if err := oneOf("format", format, "auto", "yaml", "json", "csv"); err != nil {
				return err
			}
			by, err := newListReader(nil, layout)
			if err != nil {
				return err
			}
			asks, err := from.client()
			if err != nil {
				return err
			}
			defer asks.Close()
			var told []error
			for _, path := range args {
				l, err := addList(c, out, asks, by, path, format)
				if err != nil {
					told = append(told, err)
					continue
				}
				if out.json {
					err = out.object(l)
				} else {
					writeListHead(out, &l.ListHead)
				}
				if err != nil {
					return err
				}
			}
			return errors.Join(told...)
		},
	}
	c.Flags().StringVar(&layout, "layout", "", "read the files by this layout `file` and send what was understood")
	choice(c, &format, "format", "auto", "how the text is written, where its name does not say it", "auto", "yaml", "json", "csv")
	return c
}

// addList sends one file as it is, or, by a layout, in the one canonical form
// of what was understood.
func addList(c *cobra.Command, out *console, asks *client.Client, by *listReader, path, format string) (client.List, error) {
	what := "list " + path
	var text io.Reader = out.in
	if by.layout != nil {
		l := by.read(path, false)
		if err := l.told(); err != nil {
			return client.List{}, err
		}
		var canonical bytes.Buffer
		if err := listfile.Canonical(&canonical, l.list.Text()); err != nil {
			return client.List{}, err
		}
		text, format = &canonical, "json"
	} else if path != "-" {
		f, err := os.Open(path)
		if err != nil {
			return client.List{}, fmt.Errorf("reading list: %w", err)
		}
		defer f.Close()
		text = f
		if named := listfile.FormatOf(filepath.Base(path)); format == "auto" && named != listfile.Auto {
			format = named.String()
		}
	}
	if format == "auto" {
		format = ""
	}
	l, err := asks.AddList(c.Context(), text, format, "")
	return l, explained(what, err)
}

func writeListHead(out *console, l *client.ListHead) {
	out.printf("list %s/%s: %s\n", l.Authority, l.ID, l.Status)
	out.printf("  issued %s, covers %s to %s\n", clockTime(l.Issued), clockTime(l.Covers.From), clockTime(l.Covers.Until))
	out.printf("  %d regions, %d windows; brought by %s\n", l.Regions, l.Windows, l.By)
	out.printf("  %s\n", l.Digest)
	switch l.Needs {
	case "confirmation":
		out.printf("  a person must confirm it: beamward list confirm %s/%s --digest %s\n", l.Authority, l.ID, l.Digest)
	case "second-person":
		out.printf("  a second person must confirm it: beamward list confirm %s/%s --digest %s\n", l.Authority, l.ID, l.Digest)
	}
}

// listName takes AUTHORITY/ID apart.
func listName(arg string) (closures.AuthorityID, closures.ListID, error) {
	a, id, ok := strings.Cut(arg, "/")
	if !ok || !closures.ValidName(a) || !closures.ValidName(id) {
		return "", "", usagef("list %.80q: write AUTHORITY/ID, such as orbital-desk/2031-045-B", arg)
	}
	return closures.AuthorityID(a), closures.ListID(id), nil
}

func listConfirmCommand(out *console, from *serverFlags) *cobra.Command {
	var digest string
	c := &cobra.Command{
		Use:   "confirm AUTHORITY/ID --digest DIGEST",
		Short: "Let a waiting list, or a withdrawal, take effect",
		Long: `Lets a list that waits, or a withdrawal, take effect. The digest is that of the
list as you looked at it (list show): one that changed meanwhile is not confirmed.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			a, id, err := listName(args[0])
			if err != nil {
				return err
			}
			if err := needed("digest", digest, "give the list's digest as list show tells it"); err != nil {
				return err
			}
			if _, err := closures.ParseDigest(digest); err != nil {
				return usagef("--digest: %w", err)
			}
			return changeList(c, out, from, "confirm "+args[0], func(asks *client.Client) (client.List, error) {
				return asks.ConfirmList(c.Context(), a, id, digest)
			})
		},
	}
	c.Flags().StringVar(&digest, "digest", "", "digest of the list as it was looked at")
	return c
}

func listWithdrawCommand(out *console, from *serverFlags) *cobra.Command {
	var reference string
	c := &cobra.Command{
		Use:   "withdraw AUTHORITY/ID [--reference TEXT]",
		Short: "Take a list out of force, or ask for it where that waits for confirmation",
		Args:  cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			a, id, err := listName(args[0])
			if err != nil {
				return err
			}
			return changeList(c, out, from, "withdraw "+args[0], func(asks *client.Client) (client.List, error) {
				return asks.WithdrawList(c.Context(), a, id, reference)
			})
		},
	}
	c.Flags().StringVar(&reference, "reference", "", "the authority's own reference")
	return c
}

// changeList asks for one change and shows the list as it then stands.
func changeList(_ *cobra.Command, out *console, from *serverFlags, what string, ask func(*client.Client) (client.List, error)) error {
	asks, err := from.client()
	if err != nil {
		return err
	}
	defer asks.Close()
	l, err := ask(asks)
	if err != nil {
		return explained(what, err)
	}
	if out.json {
		return out.document(l)
	}
	writeListHead(out, &l.ListHead)
	return nil
}
