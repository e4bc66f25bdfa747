package main

import (
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/cobra"
)

// usageError is a command line or a configuration that cannot be used.
type usageError struct{ err error }

func (e *usageError) Error() string { return e.err.Error() }
func (e *usageError) Unwrap() error { return e.err }

func usagef(format string, args ...any) error { return &usageError{fmt.Errorf(format, args...)} }

// toldError is a failure whose reasons stand in the output already.
type toldError struct{}

func (*toldError) Error() string { return "refused" }

// named is how a command is called in messages: without the program's own name.
func named(c *cobra.Command) string {
	if !c.HasParent() {
		return "command line"
	}
	return strings.TrimPrefix(c.CommandPath(), c.Root().Name()+" ")
}

// noSuchCommand refuses what follows a command that has only subcommands.
func noSuchCommand(c *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	c.SuggestionsMinimumDistance = 2 // letters
	mend := "it is one of " + strings.Join(subcommands(c), ", ")
	if near := c.SuggestionsFor(args[0]); len(near) > 0 {
		mend = "did you mean " + strings.Join(near, " or ") + "?"
	}
	return usagef("%s: there is no command %.40q: %s", named(c), args[0], mend)
}

// group makes a command that has only subcommands.
func group(use, short, long string, subs ...*cobra.Command) *cobra.Command {
	c := &cobra.Command{Use: use, Short: short, Long: long, Args: noSuchCommand, RunE: func(c *cobra.Command, _ []string) error {
		return usagef("%s: say what to do: %s", named(c), strings.Join(subcommands(c), ", "))
	}}
	c.AddCommand(subs...)
	return c
}

func subcommands(c *cobra.Command) []string {
	var names []string
	for _, s := range c.Commands() {
		if s.IsAvailableCommand() {
			names = append(names, s.Name())
		}
	}
	return names
}

// misuseOfArguments turns the errors of every command's argument check into
// usage errors that show how the command is written.
func misuseOfArguments(c *cobra.Command) {
	if check := c.Args; check != nil {
		c.Args = func(c *cobra.Command, args []string) error {
			err := check(c, args)
			if _, is := err.(*usageError); err == nil || is {
				return err
			}
			return usagef("%s: %w: write %s", named(c), err, c.UseLine())
		}
	}
	for _, s := range c.Commands() {
		misuseOfArguments(s)
	}
}

// oneOf refuses a flag's value that is none of the words.
func oneOf(flag, value string, words ...string) error {
	if slices.Contains(words, value) {
		return nil
	}
	return usagef("--%s %.40q: make it %s", flag, value, either(words))
}

// choice makes a flag that is one of some words, for the shell's completion;
// oneOf checks it.
func choice(c *cobra.Command, value *string, flag, def, usage string, words ...string) {
	c.Flags().StringVar(value, flag, def, usage+": "+either(words))
	// It fails only for a flag that does not exist or has one already.
	_ = c.RegisterFlagCompletionFunc(flag, cobra.FixedCompletions(words, cobra.ShellCompDirectiveNoFileComp))
}

// either writes "a, b or c".
func either(words []string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	return strings.Join(words[:len(words)-1], ", ") + " or " + words[len(words)-1]
}

// needed refuses an empty flag that cannot be left out.
func needed(flag, value, mend string) error {
	if value == "" {
		return usagef("--%s is missing: %s", flag, mend)
	}
	return nil
}
