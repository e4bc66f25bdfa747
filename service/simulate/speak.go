package simulate

import (
	"errors"
	"time"

	"beamward/closures"
)

// speak has every source whose time has come say its word. What is silent at
// the time does not reach the daemon.
func (n *night) speak(now time.Time) {
	t := &n.judge.told
	for _, s := range n.scopes {
		if !n.due(s.name, now, time.Second) {
			continue
		}
		stale := aimStale
		if s.name == "ridge-2" {
			stale = neighbourStale
			if s.slewing() {
				continue // it looks at nothing and says nothing until it is there
			}
			if t.pointing != s.number {
				t.pointing, t.pointedAt = s.number, now
			}
		} else if was := t.slews[closures.BeamID(s.name)]; s.slewing() != !was.IsZero() {
			t.slews[closures.BeamID(s.name)] = time.Time{}
			if s.slewing() {
				t.slews[closures.BeamID(s.name)] = now
			}
		}
		n.offer(s.name, stale, now, s.aim(now))
	}
	if n.due("catwalk", now, time.Second) {
		safe := n.danger.IsZero() || n.opt.Broken == FaultSafe
		if safe {
			t.interlock.since = time.Time{}
		} else if t.interlock.since.IsZero() {
			t.interlock.since = now
		}
		n.offer("catwalk", interlockStale, now, closures.InterlockSeen{Source: "catwalk", Said: now, Safe: safe})
	}
	if n.due("thermal-1", now, time.Second) {
		if n.blind == closures.DetectorClear {
			t.alarm = time.Time{}
		} else if t.alarm.IsZero() {
			t.alarm = now
		}
		n.offer("thermal-1", detectorStale, now, closures.DetectorSeen{Source: "thermal-1", Said: now, State: n.blind})
	}
	if now.Before(n.staffed) && n.due("east-lot", now, 30*time.Second) {
		t.watch = n.staffed
		n.offer("east-lot", time.Hour, now, closures.WatchKept{Post: "east-lot", Said: now, By: []string{"A. Night"}, Until: n.staffed})
	}
	n.receive(now)
	for _, l := range n.lasers {
		if n.due("laser "+string(l.beam), now, time.Second) {
			for _, b := range l.says(now) {
				n.offer("laser "+string(l.beam), time.Hour, now, b)
			}
		}
	}
}

// receive is what the two receivers of aircraft say. Each report is late by a
// part of its source's latency and stamped anywhere between.
func (n *night) receive(now time.Time) {
	for _, r := range [...]struct {
		name    string
		every   time.Duration
		latency time.Duration
	}{{"rx-1", time.Second, time.Second}, {"rx-2", 5 * time.Second, 5 * time.Second}} {
		if !n.due(r.name, now, r.every) {
			continue
		}
		n.offer(r.name, receiverStale, now, closures.Heard{Source: closures.Source(r.name), Said: now, Scope: closures.HeardReception, MessagesPerMinute: 900})
		for _, f := range n.flights {
			late := time.Duration(0.9 * n.rng.Float64() * float64(r.latency))
			was := now.Add(-late)
			said := was.Add(time.Duration(n.rng.Float64() * float64(late)))
			if n.opt.Broken == FaultLate {
				was = was.Add(-time.Minute)
			}
			if seen, heard := f.report(closures.Source(r.name), was, said, n.rng); heard && (r.name == "rx-1" || f.network) {
				n.offer(r.name, receiverStale, now, seen)
			}
		}
	}
}

// due reports whether a source speaks now, and sets when it does next.
func (n *night) due(name string, now time.Time, every time.Duration) bool {
	if now.Before(n.next[name]) {
		return false
	}
	if now.Before(n.silent[name]) {
		return false
	}
	n.next[name] = now.Add(every)
	return true
}

// offer gives a source's word to the daemon; only what it takes counts as told.
func (n *night) offer(source string, stale time.Duration, now time.Time, body closures.Body) {
	_, err := n.daemon.engine.Offer(closures.Source(source), body)
	var e *closures.Error
	if errors.As(err, &e) {
		return
	}
	n.judge.told.hear(source, stale, now)
}
