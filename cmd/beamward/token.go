package main

import (
	"strings"
	"time"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/service/access"
)

func tokenCommand(out *console) *cobra.Command {
	var at tokenPlace
	c := group("token", "Give, list and revoke the tokens that people and machines sign in with",
		`A token is shown once, when it is made, and kept as its SHA-256 in a file that
only this user can read. A change holds within a second, without a restart.`,
		tokenAddCommand(out, &at), tokenListCommand(out, &at), tokenRevokeCommand(out, &at))
	c.PersistentFlags().StringVar(&at.config.path, "config", "", "the site's configuration `file`, whose access.tokens_file is meant")
	c.PersistentFlags().StringVar(&at.path, "file", "", "the token `file` itself, instead of --config")
	return c
}

// tokenPlace is where the tokens are kept.
type tokenPlace struct {
	config configFlag
	path   string
}

func (p *tokenPlace) file() (access.TokenFile, error) {
	switch {
	case p.path != "" && p.config.path != "":
		return "", usagef("--file and --config: give one of them")
	case p.path != "":
		return access.TokenFile(p.path), nil
	}
	c, err := p.config.load()
	if err != nil {
		return "", err
	}
	if c.Access.TokensFile == "" {
		return "", usagef("config %s: access.tokens_file: it is missing: name a file, so that people can sign in by name", p.config.path)
	}
	return access.TokenFile(c.Access.TokensFile), nil
}

func tokenAddCommand(out *console, at *tokenPlace) *cobra.Command {
	var role string
	var sources []string
	c := &cobra.Command{
		Use:   "add NAME --role read|feed|operate|admin [--source NAME]...",
		Short: "Give a name a token, and show it this once",
		Args:  cobra.ExactArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if err := needed("role", role, "make it read, feed, operate or admin"); err != nil {
				return err
			}
			if err := oneOf("role", role, "read", "feed", "operate", "admin"); err != nil {
				return err
			}
			r, _ := access.ParseRole(role)
			file, err := at.file()
			if err != nil {
				return err
			}
			var bound []closures.Source
			for _, s := range sources {
				bound = append(bound, closures.Source(s))
			}
			secret, err := file.Add(args[0], r, bound, time.Now())
			if err != nil {
				return err
			}
			if out.json {
				return out.document(struct {
					Name    string   `json:"name"`
					Role    string   `json:"role"`
					Sources []string `json:"sources,omitempty"`
					Token   string   `json:"token"`
				}{args[0], role, sources, secret.Reveal()})
			}
			out.say("the token of %s, shown this once; it is kept nowhere:", args[0])
			out.printf("%s\n", secret.Reveal())
			return nil
		},
	}
	choice(c, &role, "role", "", "what it may do", "read", "feed", "operate", "admin")
	c.Flags().StringSliceVar(&sources, "source", nil, "a source, beam, neighbour or post that it may speak for; again for more")
	return c
}

func tokenListCommand(out *console, at *tokenPlace) *cobra.Command {
	return &cobra.Command{
		Use:   "list",
		Short: "List who has a token",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			file, err := at.file()
			if err != nil {
				return err
			}
			tokens, err := file.List()
			if err != nil {
				return err
			}
			type one struct {
				Name    string            `json:"name"`
				Role    string            `json:"role"`
				Sources []closures.Source `json:"sources"`
				Created time.Time         `json:"created"`
			}
			rows, all := [][]string{{"NAME", "ROLE", "CREATED", "SPEAKS FOR"}}, []one{}
			for _, t := range tokens {
				all = append(all, one{t.Name, t.Role, append([]closures.Source{}, t.Sources...), t.Created})
				rows = append(rows, []string{t.Name, t.Role, t.Created.UTC().Format(time.RFC3339), joinNames(t.Sources)})
			}
			if out.json {
				return out.document(map[string]any{"tokens": all})
			}
			return out.table(rows)
		},
	}
}

func tokenRevokeCommand(out *console, at *tokenPlace) *cobra.Command {
	return &cobra.Command{
		Use:   "revoke NAME",
		Short: "Take a name's token away",
		Args:  cobra.ExactArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			file, err := at.file()
			if err != nil {
				return err
			}
			if err := file.Revoke(args[0]); err != nil {
				return err
			}
			if out.json {
				return out.document(map[string]any{"revoked": args[0]})
			}
			out.say("the token of %s is revoked; a running service knows within a second", args[0])
			return nil
		},
	}
}

func joinNames[T ~string](names []T) string {
	words := make([]string, len(names))
	for i, n := range names {
		words[i] = string(n)
	}
	return strings.Join(words, ", ")
}
