package main

import (
	"context"
	"log/slog"
	"time"

	"github.com/coreos/go-systemd/v22/daemon"

	"beamward/service/engine"
)

// notifier tells systemd how the daemon stands, where systemd started it and
// asked. The watchdog is stroked by the decision loop alone, at the end of a
// turn in which all is well.
type notifier struct {
	log   *slog.Logger
	every time.Duration // of the watchdog; 0: not asked for
	alive chan struct{}
}

func newNotifier(log *slog.Logger) *notifier {
	n := &notifier{log: log, alive: make(chan struct{}, 1)}
	interval, err := daemon.SdWatchdogEnabled(false)
	if err != nil {
		log.Warn("systemd's watchdog cannot be served", "err", err)
	}
	n.every = interval / 2
	return n
}

// watchdog returns what the decision loop calls; nil where nobody asks. It does
// not wait: a word that was not yet sent on stands for the next.
func (n *notifier) watchdog() func() {
	if n.every <= 0 {
		return nil
	}
	return func() {
		select {
		case n.alive <- struct{}{}:
		default:
		}
	}
}

// run says ready after the first decision, then passes on that the loop lives,
// until ctx ends.
func (n *notifier) run(ctx context.Context, e *engine.Engine) {
	if !decided(ctx, e) {
		return
	}
	n.send(daemon.SdNotifyReady)
	if n.every <= 0 {
		return
	}
	var last time.Time
	for {
		select {
		case <-ctx.Done():
			return
		case <-n.alive:
			if now := time.Now(); now.Sub(last) >= n.every {
				n.send(daemon.SdNotifyWatchdog)
				last = now
			}
		}
	}
}

// decided waits for the first decision; false when ctx or the engine ended
// before.
func decided(ctx context.Context, e *engine.Engine) bool {
	updates, cancel := e.Watch(16)
	defer cancel()
	for {
		select {
		case <-ctx.Done():
			return false
		case u, more := <-updates:
			if !more {
				return false
			}
			if u.View.Started {
				return true
			}
		}
	}
}

func (n *notifier) stopping() { n.send(daemon.SdNotifyStopping) }

func (n *notifier) send(state string) {
	if _, err := daemon.SdNotify(false, state); err != nil {
		n.log.Warn("systemd cannot be told", "state", state, "err", err)
	}
}
