package engine

import (
	"beamward/closures"
)

// Restore brings what the newest Kept entry holds up to the end of the record.
// The tail is the entries after it, in order; a start needs nothing older. It
// is pure and gives facts to a state of its own.
//
// It errs towards closed: a cause that asks for a person and shows in a
// decision of the tail stays until somebody re-arms, while a re-arming is only
// believed from a Kept entry.
func Restore(r *closures.Rules, kept closures.Durable, tail []Entry) (closures.Durable, error) {
	if len(tail) == 0 {
		return kept, nil
	}
	s, err := closures.New(r, closures.Boot{ID: "restore", At: tail[0].At}, kept)
	if err != nil {
		return closures.Durable{}, err
	}
	need := map[closures.BeamID]closures.Codes{}
	shutter := map[closures.BeamID]closures.DurableLatch{}
	for _, l := range kept.Latches {
		need[l.Beam] = l.Need
		shutter[l.Beam] = l
	}
	var batch []closures.Fact
	for i := range tail {
		switch w := tail[i].What.(type) {
		case Decided:
			d := &w.Decision
			need[d.Beam] |= d.Codes.Without(closures.CodeReopening).Without(closures.CodeRearm) &^ r.ByItself
		case Admitted:
			if _, tick := w.Fact.Body.(closures.Tick); tick && len(batch) > 0 {
				s.Step(batch, w.Fact.At, nil)
				batch = batch[:0]
			} else if outlives(w.Fact.Body) {
				batch = append(batch, w.Fact)
			}
		}
	}
	s.Step(batch, tail[len(tail)-1].At, nil)
	d, _ := s.Durable()
	d.Latches = nil
	for i := range r.Beams {
		id := r.Beams[i].ID
		d.Latches = append(d.Latches, closures.DurableLatch{Beam: id, Need: need[id], ShutterTime: shutter[id].ShutterTime})
	}
	return d, nil
}

// outlives reports whether a fact changes what a restart needs.
func outlives(b closures.Body) bool {
	switch b.(type) {
	case closures.HoldPlaced, closures.HoldReleased, closures.ListOffered, closures.ListConfirmed, closures.ListWithdrawn,
		closures.Sighted, closures.DetectorSeen, closures.AircraftSeen, closures.TrackReleased:
		return true
	}
	return false
}
