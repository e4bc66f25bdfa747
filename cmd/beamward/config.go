package main

import (
	"encoding/json"
	"errors"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/service/config"
)

// configFlag is the flag by which every command that needs the configuration
// is told where it is.
type configFlag struct{ path string }

func (f *configFlag) on(c *cobra.Command) {
	c.Flags().StringVar(&f.path, "config", "", "the site's configuration `file`")
	_ = c.MarkFlagFilename("config", "yaml", "yml")
}

// load reads the configuration. One that cannot be met is a usage error, with
// every problem.
func (f *configFlag) load() (*config.Config, error) {
	if err := needed("config", f.path, "name the site's configuration file"); err != nil {
		return nil, err
	}
	c, err := config.Load(f.path)
	if err != nil {
		return nil, &usageError{err}
	}
	return c, nil
}

func configCommand(out *console) *cobra.Command {
	return group("config", "Check a configuration, or print its schema", "",
		configCheckCommand(out), configSchemaCommand(out))
}

func configCheckCommand(out *console) *cobra.Command {
	var from configFlag
	c := &cobra.Command{
		Use:   "check --config FILE",
		Short: "Say whether a configuration can be met, and every key that cannot",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			c, err := from.load()
			var bad *config.Error
			if out.json && errors.As(err, &bad) {
				if err := out.document(map[string]any{"file": from.path, "good": false, "problems": problemsOf(bad)}); err != nil {
					return err
				}
			}
			if err != nil {
				return err
			}
			if out.json {
				return out.document(map[string]any{"file": from.path, "good": true, "rules_digest": c.Rules.Digest.String()})
			}
			out.printf("config %s is good\n%s\n", from.path, c.Rules.Digest)
			return nil
		},
	}
	from.on(c)
	return c
}

// configProblem is one problem of a configuration as JSON has it.
type configProblem struct {
	Line  int    `json:"line,omitempty"`
	Key   string `json:"key,omitempty"`
	Value string `json:"value,omitempty"`
	Mend  string `json:"mend"`
}

func problemsOf(e *config.Error) []configProblem {
	var out []configProblem
	for _, p := range e.Problems {
		out = append(out, configProblem{p.Line, p.Key, p.Value, p.Mend})
	}
	return out
}

func configSchemaCommand(out *console) *cobra.Command {
	return &cobra.Command{
		Use:   "schema",
		Short: "Print the JSON Schema of a configuration",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			s := config.Schema()
			if !json.Valid(s) {
				return errors.New("the schema could not be made")
			}
			_, err := out.Write(s)
			return err
		},
	}
}

// beamOf finds one beam of the rules; an empty name is the only one there is.
func beamOf(r *closures.Rules, name string) (*closures.BeamRules, error) {
	if name == "" && len(r.Beams) == 1 {
		return &r.Beams[0], nil
	}
	if b := r.Beam(closures.BeamID(name)); b != nil {
		return b, nil
	}
	names := make([]string, len(r.Beams))
	for i := range r.Beams {
		names[i] = string(r.Beams[i].ID)
	}
	slices.Sort(names)
	if name == "" {
		return nil, usagef("--beam is missing: make it %s", either(names))
	}
	return nil, usagef("--beam %.64q is not configured: make it %s", name, strings.TrimSpace(either(names)))
}
