package api

import (
	"encoding/json"
	"net/http"
	"strconv"
	"strings"
	"time"

	"beamward/service/access"
)

const eventStream = "text/event-stream"

// viewEvery is the least time between two views on one stream.
const viewEvery = 100 * time.Millisecond

// stillEvery is how often a stream asks whether its reader may still read.
const stillEvery = 500 * time.Millisecond

// batchMost is how many changes go out in one write.
const batchMost = 256

func streamRoutes() []route {
	return []route{{method: "GET", path: "/v1/stream", id: "stream", summary: "Server-sent events: view, decision, hold, list, rules, reset", action: access.See,
		headers: []param{{"Last-Event-ID", "boot_id.number of the last event that was read: the stream goes on after it, or says reset", textOf(128)}},
		gives:   []string{eventStream}, serve: (*call).stream}}
}

// streamer writes the events of one reader.
type streamer struct {
	c     *call
	out   *http.ResponseController
	buf   []byte
	after uint64 // number of the last change that was written
	views uint64 // of the newest view that was written
	next  time.Time
	spoke time.Time
}

func (c *call) stream() error {
	if c.r.Method == http.MethodHead {
		c.w.Header().Set("Content-Type", eventStream)
		return nil
	}
	end, err := c.api.clients.stream(c)
	if err != nil {
		return err
	}
	defer end()
	h := &c.api.hub
	s := streamer{c: c, out: http.NewResponseController(c.w)}
	last := c.r.Header.Get("Last-Event-ID")
	at, resumes, ok := h.begin(last)
	if !ok {
		return refuse(http.StatusServiceUnavailable, "the stream does not run", "try again in a moment").after(time.Second)
	}
	s.after = at
	_ = s.out.SetReadDeadline(time.Time{}) // nothing more is read; a reader that is gone shows when it is written to
	header := c.w.Header()
	header.Set("Content-Type", eventStream)
	header.Set("X-Accel-Buffering", "no")
	c.w.WriteHeader(http.StatusOK)
	s.buf = append(s.buf, "retry: 1000\n\n"...)
	if last != "" && !resumes {
		s.event(h.boot(), at, "reset", []byte(`{"reason":"what came after the last event is no longer known here: forget it, and take the view that follows"}`))
	}
	return s.run(h)
}

// begin says after which change a reader starts: where it left off, or now. ok
// is false while nobody feeds the stream.
func (h *hub) begin(last string) (after uint64, resumes, ok bool) {
	h.mu.Lock()
	defer h.mu.Unlock()
	if !h.running || h.view == nil {
		return 0, false, false
	}
	newest := h.first + uint64(len(h.ring)) - 1
	boot, number, found := cutLast(last)
	n, err := strconv.ParseUint(number, 10, 64)
	if found && err == nil && boot == h.view.BootID && n+1 >= h.first && n <= newest {
		return n, true, true
	}
	return newest, false, true
}

// cutLast splits an event's id at its last point: a boot's name may have some.
func cutLast(id string) (boot, number string, found bool) {
	i := strings.LastIndexByte(id, '.')
	if i < 0 {
		return "", "", false
	}
	return id[:i], id[i+1:], true
}

func (h *hub) boot() string {
	h.mu.Lock()
	defer h.mu.Unlock()
	return h.view.BootID
}

// batch is what a reader has not had yet.
type batch struct {
	boot    string
	first   uint64 // number of the first event
	events  []event
	more    bool
	view    []byte // nil: none is due
	views   uint64
	waiting bool // a view is there and not due yet
	news    <-chan struct{}
	gone    bool // the hub ended, or the reader is too far behind
}

// since collects what comes after a change and a view.
func (h *hub) since(after, views uint64, viewDue bool) (b batch) {
	h.mu.Lock()
	defer h.mu.Unlock()
	if !h.running || h.view == nil || after+1 < h.first {
		b.gone = true
		return b
	}
	b.boot, b.first, b.news = h.view.BootID, after+1, h.news
	b.events = h.ring[after+1-h.first:]
	if b.more = len(b.events) > batchMost; b.more {
		b.events = b.events[:batchMost]
	}
	if h.views == views || b.more {
		return b
	}
	if !viewDue {
		b.waiting = true
		return b
	}
	if h.encoded == nil {
		data, err := json.Marshal(viewOf(h.view, h.fresh))
		if err != nil {
			h.api.options.Report(err)
			b.gone = true
			return b
		}
		h.encoded = data
	}
	b.view, b.views = h.encoded, h.views
	return b
}

// run writes until the reader goes, is too slow, or may read no longer.
func (s *streamer) run(h *hub) error {
	still := time.NewTicker(stillEvery)
	defer still.Stop()
	due := time.NewTimer(time.Hour)
	defer due.Stop()
	for {
		now := time.Now()
		b := h.since(s.after, s.views, !now.Before(s.next))
		if b.gone {
			return nil
		}
		for i := range b.events {
			s.after++
			s.event(b.boot, s.after, b.events[i].name, b.events[i].data)
		}
		if b.view != nil {
			s.event(b.boot, s.after, "view", b.view)
			s.views, s.next = b.views, now.Add(viewEvery)
		}
		if now.Sub(s.spoke) >= s.c.api.limits.Heartbeat && len(s.buf) == 0 {
			s.buf = append(s.buf, ": still here\n\n"...)
		}
		if !s.flush(now) {
			return nil
		}
		if b.more {
			continue
		}
		var view <-chan time.Time
		if b.waiting {
			due.Reset(time.Until(s.next))
			view = due.C
		}
		select {
		case <-b.news:
		case <-view:
		case <-still.C:
			if !s.c.api.options.Guard.Still(s.c.who) {
				return nil
			}
		case <-s.c.r.Context().Done():
			return nil
		}
	}
}

// event appends one event. Its data is JSON on one line.
func (s *streamer) event(boot string, number uint64, name string, data []byte) {
	s.buf = append(append(s.buf, "id: "...), boot...)
	s.buf = append(s.buf, '.')
	s.buf = strconv.AppendUint(s.buf, number, 10)
	s.buf = append(append(s.buf, "\nevent: "...), name...)
	s.buf = append(append(s.buf, "\ndata: "...), data...)
	s.buf = append(s.buf, "\n\n"...)
}

// flush writes what has gathered; false when the reader does not take it.
func (s *streamer) flush(now time.Time) bool {
	if len(s.buf) == 0 {
		return true
	}
	_ = s.out.SetWriteDeadline(now.Add(s.c.api.limits.Stall))
	if _, err := s.c.w.Write(s.buf); err != nil {
		return false
	}
	s.buf, s.spoke = s.buf[:0], now
	return s.out.Flush() == nil
}
