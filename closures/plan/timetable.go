package plan

import (
	"slices"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Appointment is one coming pointing of a neighbour telescope, as its own
// schedule has it.
type Appointment struct {
	Telescope closures.TelescopeID
	Over      span.Span
	Aim       *closures.Aim // azimuth and elevation are those at the telescope
	Field     s1.Angle      // radius; zero: the rules'
	Exposing  closures.Tristate
}

// Timetable is what neighbours are going to do. Where it says nothing of a
// telescope, a plan takes its present aim and says so.
type Timetable struct {
	Appointments []Appointment
	Slip         time.Duration // how much sooner or later than stated they may come
}

// maxSlip bounds a timetable's slip.
const maxSlip = time.Hour

// Apply returns what is foreseen with the timetable in it, for a plan of a beam
// over a span. Each appointment counts from earlier by the slip and the margins
// until as much later, so that around a change both aims count. The error is a
// *closures.Error.
func (t Timetable) Apply(f *closures.Foreseen, beam closures.BeamID, over span.Span, nights []*sky.Night) (*closures.Foreseen, error) {
	b := f.Rules.Beam(beam)
	if b == nil {
		return nil, closures.Errorf(closures.NotFound, "name a configured beam", "timetable: beam %.64q is not configured", beam)
	}
	if t.Slip < 0 || t.Slip > maxSlip {
		return nil, closures.Errorf(closures.Invalid, "give from 0 to one hour", "timetable: its slip is out of bounds")
	}
	aside := t.Slip + f.Rules.MarginTime(b) + f.Rules.PlanClockError()
	next := *f
	next.Pointings = nil
	stated := map[closures.TelescopeID]span.Set{}
	for i := range t.Appointments {
		a := &t.Appointments[i]
		n := f.Rules.Neighbour(a.Telescope)
		if n == nil {
			return nil, closures.Errorf(closures.NotFound, "name a configured neighbour", "timetable: telescope %.64q of entry %d is not configured", a.Telescope, i+1)
		}
		if a.Over.Empty() {
			return nil, closures.Errorf(closures.Invalid, "until must be after from", "timetable: the span of entry %d is empty", i+1)
		}
		if !(a.Field >= 0 && a.Field <= 90*s1.Degree) {
			return nil, closures.Errorf(closures.Invalid, "give from 0 to 90 degrees", "timetable: the field of entry %d is out of bounds", i+1)
		}
		aim, ok := f.PreparedAt(n, a.Aim, nights)
		if !ok {
			return nil, closures.Errorf(closures.Invalid, "give a whole aim with finite numbers, whose instant the plan's nights hold", "timetable: the aim of entry %d cannot be used", i+1)
		}
		next.Pointings = append(next.Pointings, closures.Pointing{
			Telescope: a.Telescope, Aim: aim, Scheduled: true, During: a.Over.Widen(aside, aside),
			Seen: closures.AimSeen{Telescope: a.Telescope, Aim: aim, Field: a.Field, Exposing: a.Exposing},
		})
		stated[a.Telescope] = append(stated[a.Telescope], a.Over)
	}
	near := over.Widen(aside, aside)
	for _, p := range f.Pointings {
		taken := stated[p.Telescope]
		if taken == nil {
			next.Pointings = append(next.Pointings, p)
			continue
		}
		for _, gap := range span.Tidy(taken).Complement(near) {
			p.During = gap.Widen(aside, aside)
			next.Pointings = append(next.Pointings, p)
		}
	}
	slices.SortStableFunc(next.Pointings, func(x, y closures.Pointing) int { return x.During.From.Compare(y.During.From) })
	return &next, nil
}
