package alerts

import (
	"fmt"
	"math"
	"strings"
	"time"

	"beamward/closures"
)

// Key names one alarm: its kind, and the beam, source or other that it is
// about; empty for the site.
type Key struct {
	Kind    Kind
	Subject string
}

// condition is a cause that is there now.
type condition struct {
	key    Key
	detail string
	beams  []closures.BeamID
}

// Bounds of conditions.
const (
	manySilent     = 3             // sources at once: something that they share
	coverageEnds   = 2 * time.Hour // before the end of the last list
	refusalCounts  = 12 * time.Hour
	popupsWithin   = 30 * time.Minute
	popupsAre      = 3
	diskLow        = 0.10 // share free; dead-band to
	diskFine       = 0.12
	refusedMany    = 30.0 // a minute; dead-band to
	refusedFew     = 5.0
	mostInDetail   = 6
	mostConditions = 1000 // of one observation, whatever it says
)

// causes returns the conditions of an observation. Some go by what was before:
// a dead-band, and a cause that lasts until a person re-arms.
func (m *Machine) causes(o *Observation) []condition {
	var out []condition
	say := func(k Kind, subject, detail string, beams ...closures.BeamID) {
		if len(out) < mostConditions {
			out = append(out, condition{Key{k, clean(subject, mostName)}, clean(detail, mostDetail), beams})
		}
	}
	if o.Stopped {
		say(DecisionsStopped, "", "")
	} else {
		m.ofBeams(o, say)
		m.ofSources(o, say)
		m.ofPopups(o, say)
		m.ofAuthorities(o, say)
	}
	if o.Damaged {
		say(RecordDamaged, "", "")
	}
	// A figure that is not a number is as bad as the worst.
	if o.DiskKnown && (!(o.DiskFree >= diskLow) || m.had(Key{DiskLow, ""}) && !(o.DiskFree >= diskFine)) {
		say(DiskLow, "", fmt.Sprintf("%.0f %% free", 100*math.Min(math.Max(o.DiskFree, 0), 1)))
	}
	if len(o.NotReady) > 0 && !m.working {
		say(NotReady, "", named(o.NotReady))
	}
	for i := range o.Receivers {
		if r := &o.Receivers[i]; !r.FailingSince.IsZero() {
			say(ReceiverUnreachable, r.Name, "")
		}
	}
	return out
}

// named lists names, not more than people read.
func named[T ~string](names []T) string {
	var parts []string
	for i, n := range names {
		if i == mostInDetail {
			parts = append(parts, fmt.Sprintf("and %d more", len(names)-i))
			break
		}
		parts = append(parts, clean(string(n), mostName))
	}
	return strings.Join(parts, ", ")
}

type sayer func(k Kind, subject, detail string, beams ...closures.BeamID)

// ofBeams finds what beams tell of. A cause that asks for a person lasts until
// it is re-armed, so that it is one alarm from first to last.
func (m *Machine) ofBeams(o *Observation, say sayer) {
	var by, needs [closures.NumCodes][]closures.BeamID
	var lost []string
	var lostBeams []closures.BeamID
	for i := range o.Beams {
		b := &o.Beams[i]
		id := string(b.ID)
		for c := closures.Code(0); c < closures.NumCodes; c++ {
			if b.Codes.Has(c) {
				by[c] = append(by[c], b.ID)
			}
			if b.Needs.Has(c) {
				needs[c] = append(needs[c], b.ID)
			}
		}
		if b.Codes.Has(closures.CodeShutterFault) || b.Needs.Has(closures.CodeShutterFault) {
			say(ShutterFault, id, b.Why, b.ID)
		}
		if b.AimsDisagree {
			say(AimsDisagree, id, "", b.ID)
		}
		if b.AimUnknown {
			say(AimUnknown, id, "", b.ID)
		}
		if b.ShutterSilent {
			say(ShutterSilent, id, "", b.ID)
		}
		if b.Open && b.ReaderSilent {
			say(ReaderSilent, id, "", b.ID)
		}
		if b.Needs != 0 {
			say(RearmWaiting, id, "after "+strings.Join(b.Needs.Names(), ", "), b.ID)
		}
		if len(b.Lost) > 0 {
			lost, lostBeams = append(lost, b.Lost...), append(lostBeams, b.ID)
		}
	}
	for _, c := range [...]struct {
		kind Kind
		code closures.Code
	}{{Fault, closures.CodeFault}, {Clock, closures.CodeClock}, {Record, closures.CodeRecord}} {
		beams := by[c.code]
		if len(beams) == 0 && m.had(Key{c.kind, ""}) {
			beams = needs[c.code]
		}
		if len(beams) > 0 {
			say(c.kind, "", "", beams...)
		}
	}
	if len(lost) > 0 {
		say(AircraftLost, "", "aircraft "+named(lost), lostBeams...)
	}
	if o.Unlocated > 0 {
		say(AircraftUnlocated, "", fmt.Sprintf("%d heard", o.Unlocated))
	}
	m.ofInterlocks(o, say, needs)
}

// ofInterlocks finds interlocks that opened while a beam was on the sky and
// detectors that see an aircraft. People open doors by day: that is none.
func (m *Machine) ofInterlocks(o *Observation, say sayer, needs [closures.NumCodes][]closures.BeamID) {
	asks, detects := needs[closures.CodeInterlock], needs[closures.CodeDetectorAlarm]
	for i := range o.Sources {
		s := &o.Sources[i]
		key := Key{Interlock, clean(string(s.ID), mostName)}
		before := m.had(key)
		if s.Unsafe && (before || m.wasOpen || len(asks) > 0) || before && len(asks) > 0 {
			say(Interlock, string(s.ID), "", asks...)
		}
		key.Kind = DetectorAlarm
		if s.Alarm || m.had(key) && len(detects) > 0 {
			say(DetectorAlarm, string(s.ID), "", detects...)
		}
	}
}

func (m *Machine) ofSources(o *Observation, say sayer) {
	var silent []closures.Source
	for i := range o.Sources {
		s := &o.Sources[i]
		id := string(s.ID)
		if s.Silent {
			silent = append(silent, s.ID)
			if s.Required {
				say(SourceSilent, id, "")
			}
		}
		if s.Deaf && s.Required {
			say(ReceptionLost, id, "")
		}
		if s.RefusedKnown && (!(s.RefusedPerMinute < refusedMany) || m.had(Key{FactsRefused, clean(id, mostName)}) && !(s.RefusedPerMinute < refusedFew)) {
			say(FactsRefused, id, fmt.Sprintf("%.0f a minute", s.RefusedPerMinute))
		}
	}
	if len(silent) >= manySilent {
		say(SourcesSilent, "", named(silent))
	}
	for i := range o.Telescopes {
		if o.Telescopes[i].Silent {
			say(NeighbourSilent, string(o.Telescopes[i].ID), "")
		}
	}
	for i := range o.Posts {
		if o.Posts[i].Missing {
			say(WatchMissing, o.Posts[i].ID, "")
		}
	}
}

// ofAuthorities finds lists that end, wait or were refused, and what is due.
func (m *Machine) ofAuthorities(o *Observation, say sayer) {
	for i := range o.Authorities {
		a := &o.Authorities[i]
		if a.Required && !(a.Covered.Sub(m.at) >= coverageEnds) {
			detail := "no list covers the time now"
			if !a.Covered.IsZero() {
				detail = "covered until " + a.Covered.UTC().Format(time.RFC3339)
			}
			say(ListMissing, string(a.ID), detail)
		}
		if a.Waiting != "" {
			say(ListWaiting, string(a.ID), "list "+string(a.Waiting))
		}
		if a.RefusedAt.After(a.GoodAt) && m.at.Sub(a.RefusedAt) < refusalCounts {
			say(ListRefused, string(a.ID), "")
		}
		if a.Due {
			say(SubmissionDue, string(a.ID), "")
		}
	}
}

// ofPopups counts aircraft that were first reported too near: the count filter.
func (m *Machine) ofPopups(o *Observation, say sayer) {
	p := &m.popups
	if !p.known || o.Popups < p.count { // the first look, or the service started anew
		p.known, p.count = true, o.Popups
	}
	for ; p.count < o.Popups && o.Popups-p.count <= popupsAre; p.count++ {
		p.times = append(p.times, m.at)
	}
	if p.count < o.Popups { // many at once
		p.times = append(p.times, m.at, m.at, m.at)
		p.count = o.Popups
	}
	for len(p.times) > 0 && (m.at.Sub(p.times[0]) > popupsWithin || len(p.times) > 2*popupsAre) {
		p.times = p.times[1:]
	}
	if len(p.times) >= popupsAre {
		say(Popups, "", fmt.Sprintf("%d since the start", o.Popups))
	}
}

// had reports whether the cause of an alarm was there at the last step.
func (m *Machine) had(k Key) bool {
	a := m.find(k)
	return a != nil && a.raw
}
