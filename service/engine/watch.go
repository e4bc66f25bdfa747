package engine

import (
	"sync"
	"time"

	"beamward/closures"
)

// viewEvery is the least time between two updates in which nothing changed.
const viewEvery = 100 * time.Millisecond

// Update is one published view and why it was sent.
type Update struct {
	View  *View
	Beams []closures.BeamID // whose published state, codes or end of opening changed
	Kept  bool              // lists, holds, latches or sightings changed
}

// watchers are told of views. A watcher whose buffer is full is cut off.
type watchers struct {
	mu     sync.Mutex
	all    map[*watcher]struct{}
	ended  bool
	cutOff uint64
}

type watcher struct{ c chan Update }

// Watch sends updates until cancel is called: at once where something changed,
// else at most ten a second. The first is the whole view at the time of the
// call. A watcher that leaves buffer updates unread (at least 1) is cut off:
// the channel is closed, as it is when the engine ends.
func (e *Engine) Watch(buffer int) (updates <-chan Update, cancel func()) {
	w := &watcher{c: make(chan Update, max(buffer, 1))}
	ws := &e.watchers
	ws.mu.Lock()
	defer ws.mu.Unlock()
	v := e.View()
	first := Update{View: v, Kept: true}
	for i := range v.Beams {
		first.Beams = append(first.Beams, v.Beams[i].Decision.Beam)
	}
	w.c <- first
	if ws.ended {
		close(w.c)
		return w.c, func() {}
	}
	if ws.all == nil {
		ws.all = map[*watcher]struct{}{}
	}
	ws.all[w] = struct{}{}
	return w.c, func() {
		ws.mu.Lock()
		defer ws.mu.Unlock()
		ws.drop(w)
	}
}

// drop closes a watcher once. ws.mu is held.
func (ws *watchers) drop(w *watcher) {
	if _, there := ws.all[w]; there {
		delete(ws.all, w)
		close(w.c)
	}
}

// tell sends one update to all. It never waits.
func (ws *watchers) tell(u Update) {
	ws.mu.Lock()
	defer ws.mu.Unlock()
	for w := range ws.all {
		select {
		case w.c <- u:
		default:
			ws.drop(w)
			ws.cutOff++
		}
	}
}

// end closes all.
func (ws *watchers) end() {
	ws.mu.Lock()
	defer ws.mu.Unlock()
	ws.ended = true
	for w := range ws.all {
		ws.drop(w)
	}
}

// announce tells the watchers of v what differs from the view before.
func (e *Engine) announce(before, v *View) {
	u := Update{View: v, Kept: before.Durable != v.Durable || before.Rules != v.Rules}
	for i := range v.Beams {
		d := v.Beams[i].Decision
		if o := before.Beam(d.Beam); o == nil || differs(o.Decision, d) {
			u.Beams = append(u.Beams, d.Beam)
		}
	}
	if !u.Kept && len(u.Beams) == 0 && v.Stopped == before.Stopped && v.Boot-e.told < viewEvery {
		return
	}
	e.told = v.Boot
	e.watchers.tell(u)
}

// differs reports whether two decisions of a beam differ in state, codes or
// the end of the opening.
func differs(a, b *closures.Decision) bool {
	if a.Open != b.Open || a.Codes != b.Codes || a.OpenUntil.IsZero() != b.OpenUntil.IsZero() {
		return true
	}
	return a.OpenUntil.Sub(b.OpenUntil).Abs() > OpenUntilStep
}
