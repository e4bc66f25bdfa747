package api

import (
	"context"
	"encoding/json"
	"sync"
	"time"

	"beamward/closures"
)

// hub turns updates of the engine into the events of the stream. Changes are
// numbered from 1 and kept in a ring; views are not, since the newest says all
// that the older ones did.
type hub struct {
	api *API

	mu      sync.Mutex
	running bool
	ring    []event // the newest; the oldest of them has number first
	first   uint64
	view    *View // the newest; nil before the first
	fresh   bool
	views   uint64 // how many views there were
	encoded []byte // the view's document; nil until somebody asks
	news    chan struct{}
}

// event is one change, encoded once for all readers.
type event struct {
	name string
	data []byte
}

// watchBuffer is how many updates the engine may be ahead; beyond it the hub
// is cut off and starts again with a whole view.
const watchBuffer = 1024

func (h *hub) init(a *API) {
	h.api, h.first, h.news = a, 1, make(chan struct{})
}

// Run turns what the engine tells into the stream's events until ctx ends.
// While it does not run, streams are answered with 503.
func (a *API) Run(ctx context.Context) error {
	h := &a.hub
	h.set(true)
	defer h.set(false)
	for ctx.Err() == nil {
		h.follow(ctx)
		if a.options.Engine.View().Stopped || ctx.Err() != nil {
			break
		}
	}
	<-ctx.Done()
	return ctx.Err()
}

func (h *hub) set(running bool) {
	h.mu.Lock()
	defer h.mu.Unlock()
	h.running = running
	h.tell()
}

// tell wakes every reader. h.mu is held.
func (h *hub) tell() {
	close(h.news)
	h.news = make(chan struct{})
}

// follow takes updates until it is cut off, and looks at the engine's view
// when none comes: a loop that stands still must not leave its last word up.
func (h *hub) follow(ctx context.Context) {
	next, cancel := h.api.options.Engine.Watch(watchBuffer)
	defer cancel()
	for {
		wait := 3*h.api.options.Engine.View().Rules.Permit.DecisionInterval + 100*time.Millisecond
		timed, done := context.WithTimeout(ctx, wait)
		u, more := next(timed)
		late := !more && timed.Err() != nil && ctx.Err() == nil
		done()
		switch {
		case late:
			v, fresh := h.api.look()
			if fresh {
				continue
			}
			u = Update{View: v}
		case !more:
			if v := h.api.options.Engine.View(); v.Stopped {
				h.take(Update{View: v})
			}
			return
		}
		h.take(u)
	}
}

// take makes events of one update.
func (h *hub) take(u Update) {
	wall, boot := h.api.options.Clock.Read()
	fresh := u.View.fresh(wall, boot)
	var events []event
	add := func(name string, doc any) {
		data, err := json.Marshal(doc)
		if err != nil {
			h.api.options.Report(err)
			return
		}
		events = append(events, event{name, data})
	}
	h.mu.Lock()
	defer h.mu.Unlock()
	old := h.view
	if old != nil {
		again := fresh != h.fresh || old.Rules != u.View.Rules
		for i := range u.View.Beams {
			b := &u.View.Beams[i]
			if again || contains(u.Beams, b.Decision.Beam) {
				add("decision", stateOf(u.View, b, fresh))
			}
		}
		if old.Rules != u.View.Rules {
			add("rules", rulesDoc{u.View.Rules.Digest.String()})
		}
		if u.Kept {
			changedHolds(old, u.View, add)
			changedLists(old, u.View, add)
		}
	}
	h.view, h.fresh, h.encoded = u.View, fresh, nil
	h.views++
	h.ring = append(h.ring, events...)
	if extra := len(h.ring) - h.api.limits.Ring; extra > 0 {
		// Moved only now and then, so that a change costs the same with a large ring.
		if extra > h.api.limits.Ring/4+64 {
			h.ring = append([]event(nil), h.ring[extra:]...)
			h.first += uint64(extra)
		}
	}
	h.tell()
}

func contains(beams []closures.BeamID, id closures.BeamID) bool {
	for _, b := range beams {
		if b == id {
			return true
		}
	}
	return false
}

type rulesDoc struct {
	Digest string `json:"rules_digest"`
}

// holdChange is a hold that was placed or released.
type holdChange struct {
	Change string  `json:"change" enum:"placed,released"`
	Hold   holdDoc `json:"hold"`
}

func changedHolds(old, v *View, add func(string, any)) {
	i, j := 0, 0 // both are in order of identifier
	for i < len(old.Holds) || j < len(v.Holds) {
		switch {
		case j == len(v.Holds) || i < len(old.Holds) && old.Holds[i].ID < v.Holds[j].ID:
			add("hold", holdChange{"released", holdOf(&old.Holds[i], v.At)})
			i++
		case i == len(old.Holds) || v.Holds[j].ID < old.Holds[i].ID:
			add("hold", holdChange{"placed", holdOf(&v.Holds[j], v.At)})
			j++
		default:
			i, j = i+1, j+1
		}
	}
}

// listChange is a list that came, changed where it stands, or was dropped
// because it is long over.
type listChange struct {
	Change string   `json:"change" enum:"came,changed,dropped"`
	List   ListHead `json:"list"`
}

func changedLists(old, v *View, add func(string, any)) {
	for i := range v.Book {
		e := &v.Book[i]
		was := old.Book.Find(e.List.Authority(), e.List.ID())
		switch {
		case was == nil:
			add("list", listChange{"came", headOf(v, e)})
		case was.Status != e.Status || was.Asked != e.Asked || was.Confirmed != e.Confirmed || was.List != e.List && was.List.Digest() != e.List.Digest():
			add("list", listChange{"changed", headOf(v, e)})
		}
	}
	for i := range old.Book {
		if e := &old.Book[i]; v.Book.Find(e.List.Authority(), e.List.ID()) == nil {
			add("list", listChange{"dropped", headOf(old, e)})
		}
	}
}
