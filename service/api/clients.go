package api

import (
	"net/http"
	"net/netip"
	"sync"
	"time"

	"golang.org/x/time/rate"
)

// clients counts the requests of each client by name, and of the nameless by
// address. A hold has a budget of its own, so that whoever reads too much can
// still shutter.
type clients struct {
	limits *Limits

	mu      sync.Mutex
	by      map[string]*client
	rest    *client // all that are too many to be told apart
	streams int
}

type client struct {
	budgets [numBudgets]*rate.Limiter
	last    time.Time
	streams int
}

const (
	clientsKept = 1024
	clientIdle  = time.Minute // by then every budget is full again, or nearly
)

func (l *Limits) rates() [numBudgets]Rate {
	return [numBudgets]Rate{forReading: l.Requests, forWriting: l.Writes, forFeeding: l.Feeds, forHolding: l.Holds}
}

func (cs *clients) fresh() *client {
	one := &client{}
	for b, r := range cs.limits.rates() {
		one.budgets[b] = rate.NewLimiter(rate.Limit(r.PerSecond), r.Burst)
	}
	return one
}

// of returns the client of a call. cs.mu is held.
func (cs *clients) of(c *call, now time.Time) *client {
	key := "name " + c.who.Name
	if !c.who.Token {
		key = "address "
		if a, err := netip.ParseAddrPort(c.r.RemoteAddr); err == nil {
			key += a.Addr().Unmap().String()
		}
	}
	if one := cs.by[key]; one != nil {
		one.last = now
		return one
	}
	if cs.by == nil {
		cs.by = map[string]*client{}
		cs.rest = cs.fresh()
	}
	if len(cs.by) >= clientsKept {
		for k, old := range cs.by {
			if now.Sub(old.last) > clientIdle && old.streams == 0 {
				delete(cs.by, k)
			}
		}
	}
	if len(cs.by) >= clientsKept {
		return cs.rest
	}
	one := cs.fresh()
	one.last = now
	cs.by[key] = one
	return one
}

// take counts one request and refuses it beyond the budget.
func (cs *clients) take(c *call, b budget) error {
	now := time.Now()
	cs.mu.Lock()
	one := cs.of(c, now)
	cs.mu.Unlock()
	r := one.budgets[b].ReserveN(now, 1)
	if r.OK() {
		wait := r.DelayFrom(now)
		if wait == 0 {
			return nil
		}
		r.CancelAt(now)
		return refuse(http.StatusTooManyRequests, "more requests than a client may make", "wait, and ask less often").after(max(wait, time.Second))
	}
	return refuse(http.StatusTooManyRequests, "more requests than a client may make", "wait, and ask less often").after(time.Second)
}

// stream counts one stream of the call's client; end gives it back.
func (cs *clients) stream(c *call) (end func(), err error) {
	cs.mu.Lock()
	defer cs.mu.Unlock()
	one := cs.of(c, time.Now())
	switch {
	case one.streams >= cs.limits.Mine:
		return nil, refuse(http.StatusTooManyRequests, "this client has as many streams open as it may", "close one").after(cs.limits.Stall)
	case cs.streams >= cs.limits.Streams:
		return nil, refuse(http.StatusServiceUnavailable, "as many streams are open as the service serves", "try again later").after(cs.limits.Stall)
	}
	cs.streams++
	one.streams++
	return func() {
		cs.mu.Lock()
		defer cs.mu.Unlock()
		cs.streams--
		one.streams--
	}, nil
}

// slot waits for one of the few places for work that takes the processor for
// long; give gives it back.
func (c *call) slot() (give func(), err error) {
	c.longer(c.api.limits.HeavyWait + c.api.limits.Answer)
	t := time.NewTimer(c.api.limits.HeavyWait)
	defer t.Stop()
	select {
	case c.api.heavy <- struct{}{}:
		return func() { <-c.api.heavy }, nil
	case <-t.C:
		return nil, refuse(http.StatusServiceUnavailable, "the service reads and plans as much as it does at a time", "try again in a moment").after(c.api.limits.HeavyWait)
	case <-c.r.Context().Done():
		return nil, c.r.Context().Err()
	}
}
