package main

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"beamward/closures/wire"
	"beamward/service/client"
)

// defaultServer is where a service listens unless its configuration says
// otherwise.
const defaultServer = "http://127.0.0.1:8460"

// serverFlags say whom to ask, and as whom. A token is never a flag, since
// everybody on a machine sees the flags of every process.
type serverFlags struct{ server, tokenFile, keyFile string }

func (f *serverFlags) on(c *cobra.Command) {
	c.PersistentFlags().StringVar(&f.server, "server", "", "the service's `address`; left out: $BEAMWARD_SERVER, else "+defaultServer)
	c.PersistentFlags().StringVar(&f.tokenFile, "token-file", "", "`file` that holds your token and nothing else; left out: $BEAMWARD_TOKEN")
}

// asked reports whether a server was named on the command line.
func (f *serverFlags) asked() bool { return f.server != "" }

func (f *serverFlags) client() (*client.Client, error) {
	o := client.Options{Server: f.server, Token: os.Getenv("BEAMWARD_TOKEN")}
	if o.Server == "" {
		o.Server = os.Getenv("BEAMWARD_SERVER")
	}
	if o.Server == "" {
		o.Server = defaultServer
	}
	if f.tokenFile != "" {
		text, err := os.ReadFile(f.tokenFile)
		if err != nil {
			return nil, usagef("--token-file: %w", err)
		}
		o.Token = strings.TrimSpace(string(text))
	}
	if f.keyFile != "" {
		text, err := os.ReadFile(f.keyFile)
		if err != nil {
			return nil, usagef("--key: %w", err)
		}
		if o.PermitKey, err = wire.ParseJWK(text); err != nil {
			return nil, usagef("--key %s: %w", f.keyFile, err)
		}
	}
	c, err := client.New(o)
	if err != nil {
		return nil, &usageError{err}
	}
	return c, nil
}

// explained puts a problem document into words: its detail, and every entry
// beyond it on a line of its own.
func explained(what string, err error) error {
	var p *client.Problem
	if !errors.As(err, &p) {
		if err != nil {
			return fmt.Errorf("%s: %w", what, err)
		}
		return nil
	}
	head := p.Detail // the title says no more than the status does
	if head == "" {
		head = p.Title
	}
	entries := p.Errors
	if len(entries) > 0 && entries[0].Detail == head && entries[0].Line == 0 {
		head = strings.Join(nonEmpty(entries[0].Field, entries[0].Pointer, head, entries[0].Mend), ": ")
		entries = entries[1:]
	}
	lines := []string{what + ": " + head}
	for _, e := range entries {
		line := what
		if e.Line > 0 {
			line += fmt.Sprintf(": line %d", e.Line)
		}
		lines = append(lines, line+": "+strings.Join(nonEmpty(e.Field, e.Pointer, e.Detail, e.Mend, printable(e.Text)), ": "))
	}
	if p.RetryAfter > 0 {
		lines = append(lines, fmt.Sprintf("%s: try again in %v", what, p.RetryAfter))
	}
	return errors.New(strings.Join(lines, "\n"))
}

// clockTime writes an instant for reading, to the second.
func clockTime(t time.Time) string { return t.UTC().Format("2006-01-02T15:04:05Z") }

// spanWords writes a span of time; an end that is not known is left open.
func spanWords(from, until *time.Time) string {
	switch {
	case from == nil && until == nil:
		return ""
	case until == nil:
		return "from " + clockTime(*from)
	case from == nil:
		return "until " + clockTime(*until)
	}
	return clockTime(*from) + " to " + clockTime(*until)
}
