package closures

import (
	"slices"
	"time"

	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Boot is one start of the service.
type Boot struct {
	ID string
	At time.Time
}

// State is everything the decision rests on. It has one owner, which alone
// calls Step; Decide and the other methods only read.
type State struct {
	boot Boot
	at   time.Time // of the last step
	seq  uint64    // of the last fact

	rules   *Rules
	nights  []*sky.Night // in order of time, at most keepNights
	book    Book
	lists   Digest
	holds   []HoldPlaced // in order of identifier
	scene   Scene
	beams   []beam // in the order of the rules
	sheet   Sheet
	refused []Refused

	durable uint64 // rises with each change of what is durable
}

// Refused tells the owner why a fact had no effect.
type Refused struct {
	Seq uint64
	Err *Error
}

// keepNights is how many prepared nights are kept: yesterday's to tomorrow's.
const keepNights = 6

// Foresight is how far ahead a decision looks for closures to come.
const Foresight = 10 * time.Minute

// New starts a state: shuttered, with what outlived the last start. Positive
// knowledge does not.
func New(r *Rules, boot Boot, d Durable) (*State, error) {
	if err := r.Validate(); err != nil {
		return nil, err
	}
	s := &State{boot: boot, at: boot.At, rules: r}
	s.scene.boot = boot.At
	s.scene.Detectors = slices.Clone(d.Detectors)
	s.scene.Sightings = slices.Clone(d.Sightings)
	for _, e := range d.Lists {
		s.book = s.book.with(e)
	}
	s.holds = slices.Clone(d.Holds)
	slices.SortFunc(s.holds, byHoldID)
	s.setRules(r)
	for _, l := range d.Latches {
		if b := s.beam(l.Beam); b != nil {
			b.latch.need, b.longestShutter = b.latch.need|l.Need, l.ShutterTime
		}
	}
	s.scene.tracks.restore(d.Tracks, r)
	s.foresee()
	return s, nil
}

// Durable returns what must outlive a restart, and a number that rises with
// each change of it.
func (s *State) Durable() (Durable, uint64) {
	d := Durable{Lists: slices.Clone(s.book), Holds: slices.Clone(s.holds), Sightings: slices.Clone(s.scene.Sightings), Detectors: slices.Clone(s.scene.Detectors), Tracks: s.scene.tracks.durable()}
	for i := range s.beams {
		b := &s.beams[i]
		d.Latches = append(d.Latches, DurableLatch{Beam: b.rules.ID, Need: b.latch.need, ShutterTime: b.longestShutter})
	}
	return d, s.durable
}

// Foreseen returns all that a foreseeable check may see, as of the last step.
// It may be shared and is never changed.
func (s *State) Foreseen() *Foreseen { return s.scene.Foreseen }

// Book returns every list that is known. It is never changed.
func (s *State) Book() Book { return s.book }

// Rules returns the rules in force.
func (s *State) Rules() *Rules { return s.rules }

// Nights returns the prepared nights, in order of time.
func (s *State) Nights() []*sky.Night { return slices.Clone(s.nights) }

// Holds returns the holds that are not over, in order of identifier.
func (s *State) Holds() []HoldPlaced {
	return slices.DeleteFunc(slices.Clone(s.holds), func(h HoldPlaced) bool { return !h.Span().Until.After(s.at) })
}

// Refused returns the facts of the last step that had no effect, and why.
func (s *State) Refused() []Refused { return s.refused }

func (s *State) beam(id BeamID) *beam {
	for i := range s.beams {
		if s.beams[i].rules.ID == id {
			return &s.beams[i]
		}
	}
	return nil
}

// setRules puts rules in force and keeps what is known of the beams, sources
// and telescopes that stay.
func (s *State) setRules(r *Rules) {
	old := s.beams
	s.rules, s.beams = r, make([]beam, len(r.Beams))
	for i := range r.Beams {
		// A beam begins as if it had just been closed by the start.
		s.beams[i] = beam{rules: &r.Beams[i]}
		s.beams[i].latch.settle(r, Codes(0).With(CodeStarting), AllCodes, s.at)
		for j := range old {
			if old[j].rules.ID == r.Beams[i].ID {
				s.beams[i] = old[j]
				s.beams[i].rules = &r.Beams[i]
				s.beams[i].hits = nil
			}
		}
		if s.beams[i].longestShutter <= r.Beams[i].ShutterTime {
			s.beams[i].longestShutter = 0 // mended: the rules allow for what was measured
		}
	}
	s.scene.setRules(r)
}

// foresee makes the view of what is foreseeable anew, since holders of the
// last one rely on it not to change.
func (s *State) foresee() {
	s.lists = s.book.Digest()
	s.scene.Foreseen = &Foreseen{
		Rules: s.rules, Lists: s.book.Listed(), Holds: slices.Clone(s.holds),
		Pointings: slices.Clone(s.scene.pointings), Air: s.scene.air(s.rules).Over(s.rules.Site.Position.Height),
	}
	for i := range s.beams {
		s.beams[i].hits = nil
	}
}

// night returns the prepared night that holds at, or nil.
func (s *State) night(at time.Time) *sky.Night { return nightAt(s.nights, at) }

// nightsAbout returns the nights that a look over a span may need: leads and
// tails reach beyond it.
func (s *State) nightsAbout(over span.Span) []*sky.Night {
	return s.nightsFor(over.Widen(MaxLeadOrTail, MaxLeadOrTail))
}

// nightsFor returns the nights that touch a span.
func (s *State) nightsFor(over span.Span) []*sky.Night {
	for i, n := range s.nights {
		if BinOf(n).Overlaps(over) {
			j := i
			for j < len(s.nights) && BinOf(s.nights[j]).Overlaps(over) {
				j++
			}
			return s.nights[i:j]
		}
	}
	return nil
}
