package feed

import (
	"bytes"
	"strconv"
	"sync"
	"sync/atomic"
	"time"
)

// Stats is what a feed has done since its start.
type Stats struct {
	Since       time.Time // of the start of Run; zero: it does not run yet
	Open        int       // connections, or files, that are open now
	Connections uint64    // all that were opened
	TurnedAway  uint64    // connections that were not let in
	Bytes       uint64
	Lines       uint64 // lines, frames or records that came, blank ones left out
	Accepted    uint64 // facts that intake took
	Refused     uint64 // lines that were refused
	Waited      uint64 // facts that had to wait for a full intake
	Dropped     uint64 // facts that a full intake cost
	LastLine    time.Time
	LastFact    time.Time // that was accepted
	Trouble     string    // why nothing can come at present; empty: none is known
	Refusals    []Refusal // the last ones, oldest first
}

// Refusal is one line that was refused. All its text is printable ASCII.
type Refusal struct {
	At    time.Time
	From  string // the sender's address, or the file
	Line  uint64 // its number within the connection or file, from 1
	Cause string
	Text  string // its beginning; empty where it might hold a secret
}

const (
	keptRefusals = 20
	shownBytes   = 80
)

// counters are a feed's Stats while it works.
type counters struct {
	clock Clock

	connections, turnedAway, bytes, lines, accepted, refused, waited, dropped atomic.Uint64
	open                                                                      atomic.Int64
	lastLine, lastFact                                                        atomic.Int64 // Unix nanoseconds; 0: none

	mu       sync.Mutex
	since    time.Time
	trouble  string
	refusals []Refusal // a ring
	next     int
}

func (c *counters) start() {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.since = c.clock.Wall()
}

// setTrouble says why nothing can come; empty: it can again. It reports whether
// that is news.
func (c *counters) setTrouble(why string) bool {
	c.mu.Lock()
	defer c.mu.Unlock()
	news := c.trouble != why
	c.trouble = why
	return news
}

func (c *counters) line(n int, at time.Time) {
	c.lines.Add(1)
	c.bytes.Add(uint64(n))
	c.lastLine.Store(at.UnixNano())
}

func (c *counters) took(at time.Time) {
	c.accepted.Add(1)
	c.lastFact.Store(at.UnixNano())
}

// refuse counts a refusal and keeps it.
func (c *counters) refuse(at time.Time, from string, line uint64, cause string, text []byte) {
	c.refused.Add(1)
	r := Refusal{At: at, From: from, Line: line, Cause: printable([]byte(cause), 4*shownBytes), Text: shown(text)}
	c.mu.Lock()
	defer c.mu.Unlock()
	if len(c.refusals) < keptRefusals {
		c.refusals = append(c.refusals, r)
		return
	}
	c.refusals[c.next] = r
	c.next = (c.next + 1) % keptRefusals
}

func (c *counters) stats() Stats {
	s := Stats{
		Open: int(c.open.Load()), Connections: c.connections.Load(), TurnedAway: c.turnedAway.Load(),
		Bytes: c.bytes.Load(), Lines: c.lines.Load(), Accepted: c.accepted.Load(), Refused: c.refused.Load(),
		Waited: c.waited.Load(), Dropped: c.dropped.Load(), LastLine: instant(c.lastLine.Load()), LastFact: instant(c.lastFact.Load()),
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	s.Since, s.Trouble = c.since, c.trouble
	s.Refusals = make([]Refusal, 0, len(c.refusals))
	s.Refusals = append(s.Refusals, c.refusals[c.next:]...)
	s.Refusals = append(s.Refusals, c.refusals[:c.next]...)
	return s
}

func instant(ns int64) time.Time {
	if ns == 0 {
		return time.Time{}
	}
	return time.Unix(0, ns).UTC()
}

// shown is the beginning of a line as people may see it: nothing of one that
// names a token.
func shown(text []byte) string {
	if bytes.Contains(bytes.ToLower(text), []byte("token")) {
		return ""
	}
	return printable(text, shownBytes)
}

// printable escapes what is not printable ASCII, and cuts.
func printable(text []byte, most int) string {
	cut := len(text) > most
	if cut {
		text = text[:most]
	}
	s := strconv.QuoteToASCII(string(text))
	s = s[1 : len(s)-1]
	if cut {
		s += "..."
	}
	return s
}
