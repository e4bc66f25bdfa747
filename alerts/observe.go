package alerts

import (
	"time"

	"beamward/closures"
)

// Observe reads an observation from a published view: its rules, one decision
// a beam, what is known, and what is foreseeable, at the instant of the view. A
// nil part means that the view tells nothing, which is Stopped.
func Observe(r *closures.Rules, decisions []*closures.Decision, k *closures.Known, f *closures.Foreseen, at time.Time) Observation {
	if r == nil || k == nil || f == nil {
		return Observation{Stopped: true}
	}
	o := Observation{Popups: k.Popups}
	for _, d := range decisions {
		if d == nil {
			return Observation{Stopped: true}
		}
		o.Beams = append(o.Beams, beamOf(r, d, k, at))
	}
	for i := range k.Sources {
		s := &k.Sources[i]
		seen := Source{ID: s.Source, Required: s.Required, Silent: s.Silent}
		seen.Deaf = s.Kind == closures.AircraftSource && !s.Silent && !s.Receives
		seen.Unsafe = s.Kind == closures.InterlockSource && !s.Interlock.Said.IsZero() && !s.Interlock.Safe
		for j := range k.Detectors {
			if k.Detectors[j].Source == s.Source && k.Detectors[j].State == closures.DetectorAlarm {
				seen.Alarm = true
			}
		}
		o.Sources = append(o.Sources, seen)
	}
	for i := range r.Neighbours {
		n := &r.Neighbours[i]
		if n.Yields == closures.YieldsTheirs {
			continue
		}
		t := Telescope{ID: n.ID, Silent: true}
		for j := range f.Pointings {
			if p := &f.Pointings[j]; p.Telescope == n.ID && p.Aim != nil && at.Sub(p.Seen.Said) <= n.StaleAfter && at.Sub(p.Heard) <= n.StaleAfter {
				t.Silent = false
			}
		}
		o.Telescopes = append(o.Telescopes, t)
	}
	for i := range r.Watches {
		if w := &r.Watches[i]; w.Required {
			o.Posts = append(o.Posts, Post{ID: w.Post, Missing: hasReason(decisions, closures.CodeWatchMissing, closures.Source(w.Post))})
		}
	}
	for i := range r.Authorities {
		o.Authorities = append(o.Authorities, authorityOf(&r.Authorities[i], f, at))
	}
	if r.Aircraft.Unlocated == closures.UnlocatedAlarm {
		for i := range k.Aircraft {
			if !k.Aircraft[i].Located {
				o.Unlocated++
			}
		}
	}
	return o
}

func hasReason(decisions []*closures.Decision, c closures.Code, from closures.Source) bool {
	for _, d := range decisions {
		for i := range d.Reasons {
			if d.Reasons[i].Code == c && d.Reasons[i].Source == from {
				return true
			}
		}
	}
	return false
}

func beamOf(r *closures.Rules, d *closures.Decision, k *closures.Known, at time.Time) Beam {
	b := Beam{ID: d.Beam, Open: d.Open, Codes: d.Codes, OpenUntil: d.OpenUntil, ClosesAt: d.ClosesAt}
	for i := range d.Reasons {
		f := &d.Reasons[i]
		if i == 0 {
			b.Why = f.Detail
		}
		switch f.Code {
		case closures.CodeAimUnknown:
			if f.Verdict == closures.Violated {
				b.AimsDisagree = true
			} else {
				b.AimUnknown = true
			}
		case closures.CodeAircraft:
			if lost(r, k, f, at) {
				b.Lost = append(b.Lost, f.Ref)
			}
		}
	}
	rules := r.Beam(d.Beam)
	for i := range k.Beams {
		if o := &k.Beams[i]; o.Beam == d.Beam {
			b.Needs = o.Need
			heard := !o.ShutterHeard.IsZero()
			b.ShutterSilent = rules != nil && heard && !rules.FeedbackRequired && at.Sub(o.ShutterHeard) > rules.FeedbackStale
		}
	}
	return b
}

// lost reports whether a finding is about an aircraft that its source no longer
// hears.
func lost(r *closures.Rules, k *closures.Known, f *closures.Finding, at time.Time) bool {
	src := r.Source(f.Source)
	for i := range k.Aircraft {
		if a := &k.Aircraft[i]; a.Aircraft == f.Ref && a.Source == f.Source {
			return src == nil || at.Sub(a.Heard) > src.StaleAfter
		}
	}
	return false
}

// authorityOf follows the lists in force from an instant on to the first gap.
func authorityOf(a *closures.AuthorityRules, f *closures.Foreseen, at time.Time) Authority {
	o := Authority{ID: a.ID, Required: a.Required}
	until := at
	for grew := true; grew; {
		grew = false
		for i := range f.Lists {
			l := &f.Lists[i]
			if l.List == nil || l.Authority() != a.ID {
				continue
			}
			if l.Waiting {
				o.Waiting = l.ID()
				continue
			}
			if c := l.Covers(); !c.From.After(until) && c.Until.After(until) {
				until, grew = c.Until, true
			}
		}
	}
	if until.After(at) {
		o.Covered = until
	}
	return o
}
