package main

import (
	"context"
	"errors"
	"io"
	"os"
	"os/signal"
	"syscall"

	"github.com/spf13/cobra"
)

// The exit statuses.
const (
	done   = 0
	failed = 1 // refused, or could not be done
	misuse = 2 // the command line or the configuration cannot be used
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), syscall.SIGINT, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second signal ends it at once
	os.Exit(run(ctx, os.Args[1:], os.Stdin, os.Stdout, os.Stderr))
}

// run carries out one command line and returns the exit status. It ends early
// when ctx does.
func run(ctx context.Context, args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	out := &console{in: stdin, out: stdout, err: stderr}
	root := rootCommand(out)
	root.SetArgs(args)
	root.SetIn(stdin)
	root.SetOut(stdout)
	root.SetErr(stderr)
	err := root.ExecuteContext(ctx)
	if err == nil {
		err = out.broken // what could not be written was not said
	}
	if err == nil {
		return done
	}
	var told *toldError
	if !errors.As(err, &told) {
		out.complain(err)
	}
	var use *usageError
	if errors.As(err, &use) {
		return misuse
	}
	return failed
}

// rootCommand puts the subcommands together.
func rootCommand(out *console) *cobra.Command {
	root := &cobra.Command{
		Use:   "beamward",
		Short: "Says second by second whether a laser guide star beam may be on the sky",
		Long: `beamward says second by second whether an observatory's laser guide star beam
may be on the sky: the authorities' closure lists, aircraft, neighbour
telescopes, people on site and the age of everything that the answer rests on.

It permits beside a hardware interlock, human spotters and the authorities' own
procedures, never in their place. Where local law, an authority, a code,
licensed practice or a spotter says otherwise, they are right.

Exit status: 0 done, 1 refused or failed, 2 the command line or the
configuration cannot be used.`,
		SilenceUsage:  true,
		SilenceErrors: true,
		Args:          noSuchCommand,
		RunE:          func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	root.PersistentFlags().BoolVar(&out.json, "json", false, "write JSON to stdout")
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		return usagef("%s: %w: see %s --help", named(c), err, c.CommandPath())
	})
	root.AddCommand(
		demoCommand(out), serveCommand(out), checkCommand(out), permitCommand(out), listCommand(out), holdCommand(out),
		rearmCommand(out), planCommand(out), recordCommand(out), replayCommand(out), explainCommand(out), exposureCommand(out), configCommand(out), tokenCommand(out),
		versionCommand(out),
	)
	root.InitDefaultHelpCmd()
	root.InitDefaultCompletionCmd(root.Name())
	misuseOfArguments(root)
	return root
}
