package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"os"
	"os/signal"
	"strings"
	"sync"
	"syscall"

	"github.com/spf13/cobra"

	"beamward/service"
	"beamward/service/config"
)

func serveCommand(out *console) *cobra.Command {
	var from configFlag
	var level string
	c := &cobra.Command{
		Use:   "serve --config FILE",
		Short: "Run the daemon",
		Long: `Runs the daemon until SIGTERM or SIGINT. The first line of its log, on stderr, names
the addresses that it bound. SIGHUP reads the configuration again: what only tightens
takes effect, anything else takes a restart, and one that cannot be met changes
nothing.`,
		Args: cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			if err := oneOf("log-level", level, "debug", "info", "warn", "error"); err != nil {
				return err
			}
			cfg, err := from.load()
			if err != nil {
				return err
			}
			held := &heldWriter{to: out.err}
			log := slog.New(logHandler(held, out.json, level))
			return serve(c.Context(), out, &from, cfg, log, held)
		},
	}
	from.on(c)
	choice(c, &level, "log-level", "info", "least level of the log", "debug", "info", "warn", "error")
	return c
}

func logHandler(w io.Writer, asJSON bool, level string) slog.Handler {
	var least slog.Level
	_ = least.UnmarshalText([]byte(level)) // one of the words that were checked
	o := &slog.HandlerOptions{Level: least}
	if asJSON {
		return slog.NewJSONHandler(w, o)
	}
	return slog.NewTextHandler(w, o)
}

// serve runs the service until ctx ends.
func serve(ctx context.Context, out *console, from *configFlag, cfg *config.Config, log *slog.Logger, held *heldWriter) error {
	defer held.release()
	// Caught from the very start: one that came early must not end the daemon.
	hup := make(chan os.Signal, 1)
	signal.Notify(hup, syscall.SIGHUP)
	defer signal.Stop(hup)
	notify := newNotifier(log)
	s, err := service.New(ctx, service.Options{Config: cfg, Log: log, Build: thisBuild().String(), Watchdog: notify.watchdog()})
	if err != nil {
		return err
	}
	// The addresses come first: what the start had to say was held back.
	at := s.Addresses()
	held.first(func() {
		log.Info("listening", "api", at.API, "permit", at.Permit, "feeds", strings.Join(at.Feeds, ","))
	})
	log.Info("starting", "site", cfg.Rules.Site.Name, "config", from.path, "rules", cfg.Rules.Digest.String(), "data_dir", cfg.DataDir, "build", thisBuild().String())

	var beside sync.WaitGroup
	running, stop := context.WithCancel(ctx)
	told := context.AfterFunc(ctx, notify.stopping)
	defer told()
	beside.Go(func() { notify.run(running, s.Engine()) })
	beside.Go(func() { reloads(running, hup, s, from, log) })
	err = s.Run(ctx)
	stop()
	beside.Wait()
	if err = errors.Join(err, s.Close()); err != nil {
		return fmt.Errorf("the service ended: %w", err)
	}
	log.Info("stopped: every beam is shuttered")
	return nil
}

// reloads reads the configuration again at each SIGHUP until ctx ends.
func reloads(ctx context.Context, hup <-chan os.Signal, s *service.Service, from *configFlag, log *slog.Logger) {
	for {
		select {
		case <-ctx.Done():
			return
		case <-hup:
		}
		cfg, err := from.load()
		if err == nil {
			err = s.Reload(ctx, cfg, "sighup")
		}
		if err != nil {
			for _, line := range strings.Split(err.Error(), "\n") {
				log.Error("the configuration was not taken; what was in force stays", "err", line)
			}
			continue
		}
		log.Info("the configuration was read again", "rules", cfg.Rules.Digest.String())
	}
}

// heldWriter keeps what is written until it is let go, so that one line can
// come first.
type heldWriter struct {
	to io.Writer

	mu   sync.Mutex
	kept []byte
	free bool
}

func (w *heldWriter) Write(p []byte) (int, error) {
	w.mu.Lock()
	defer w.mu.Unlock()
	if !w.free {
		w.kept = append(w.kept, p...)
		return len(p), nil
	}
	return w.to.Write(p)
}

// first has something written before all that was kept, then lets go.
func (w *heldWriter) first(write func()) {
	w.mu.Lock()
	kept := w.kept
	w.kept, w.free = nil, true
	w.mu.Unlock()
	write()
	_, _ = w.Write(kept) // a log that nobody reads stops nothing
}

// release lets go without more ado.
func (w *heldWriter) release() {
	w.mu.Lock()
	defer w.mu.Unlock()
	if len(w.kept) > 0 {
		_, _ = w.to.Write(w.kept)
	}
	w.kept, w.free = nil, true
}
