package engine

import (
	"crypto/sha256"
	"hash"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// How often the tally of all decisions and, whether it changed or not, what a
// restart needs are put on record.
const (
	tallyEvery = time.Minute
	keptEvery  = time.Minute
)

// entry numbers and appends one entry of the engine's own.
func (e *Engine) entry(entries []Entry, at time.Time, what What) []Entry {
	e.seq++
	return append(entries, Entry{Seq: e.seq, At: at, What: what})
}

// beginEntries opens a turn's entries: with the start of a new state, where
// there is one, and what it started from.
func (e *Engine) beginEntries() []Entry {
	entries := make([]Entry, 0, 8)
	if e.begun == nil {
		return entries
	}
	entries = e.entry(entries, e.at, *e.begun)
	entries = e.entry(entries, e.at, Kept{e.kept})
	e.begun, e.keptDue, e.keptAt = nil, false, e.boot
	e.tally.reset(e.boot)
	return entries
}

// closing ends a turn's entries with what is due.
func (e *Engine) closing(entries []Entry, wall time.Time, boot time.Duration) []Entry {
	if boot-e.tally.since >= tallyEvery && e.tally.Count > 0 {
		entries = e.entry(entries, wall, e.tally.take(boot))
	}
	if e.keptDue || boot-e.keptAt >= keptEvery {
		if !e.keptDue { // tracks have moved on without a change of version
			e.kept, e.version = e.state.Durable()
		}
		entries = e.entry(entries, wall, Kept{e.kept})
		e.keptDue, e.keptAt = false, boot
	}
	return entries
}

// record queues a turn's entries and answers those who wait for its facts.
// Where entries are lost every beam is shuttered at once, and what is durable
// is put on record again with the next that fit. It returns the newest view.
func (e *Engine) record(entries []Entry, urgent bool, v *View) *View {
	for i := range entries {
		entries[i].Urgent = urgent
	}
	recorded := entries[len(entries)-1].Seq
	told := e.condition.Gap || e.lost
	err := e.opt.Record.Append(entries)
	e.lost = err != nil
	if err != nil {
		recorded = 0
		e.torn, e.keptDue = true, true
		e.stats.lost.Add(uint64(len(entries)))
		if !told {
			e.opt.Report(err)
		}
		clear(e.gates)
		clear(e.recorded)
		for i := range v.Beams {
			if v.Beams[i].Decision.Open {
				v = e.shutter(v.At, v.Boot, closures.CodeRecord, "the record refused an entry")
				break
			}
		}
	} else if e.keptNow(entries) {
		for _, w := range e.waiters {
			if w.upTo == 0 {
				w.upTo = recorded
			}
		}
	}
	e.answer(e.waits, e.state.Refused(), recorded)
	return v
}

// keptNow reports whether the entries hold what a restart needs.
func (e *Engine) keptNow(entries []Entry) bool {
	for i := range entries {
		if _, ok := entries[i].What.(Kept); ok {
			return true
		}
	}
	return false
}

// tally sums all decisions between two Tallied entries.
type tally struct {
	Tallied
	since time.Duration
	sum   hash.Hash
	buf   []byte
}

func (t *tally) reset(boot time.Duration) { *t = tally{since: boot, sum: sha256.New(), buf: t.buf} }

func (t *tally) add(d *closures.Decision) {
	if t.sum == nil {
		return
	}
	if t.Count == 0 {
		t.From = d.Seq
	}
	t.To = d.Seq
	t.Count++
	t.buf = wire.AppendDecision(t.buf[:0], d)
	_, _ = t.sum.Write(t.buf)
}

func (t *tally) take(boot time.Duration) Tallied {
	out := t.Tallied
	t.sum.Sum(out.Sum[:0])
	t.reset(boot)
	return out
}
