package closures

import "beamward/geometry/span"

// Shared holds what many questions about one beam and one span have in common,
// whatever the aim: it is worked out once for a plan of many targets. It is
// immutable.
type Shared struct {
	of    Question  // without an aim
	days  []Finding // of daylight
	least Margin
	ready [][]passage // for each pointing
}

// plainRate is how fast against the sky an aim may move and still use shared
// passages: more than any star's proper motion.
const plainRate = 1e-11

// Share works out what questions like q about aims that state no error have in
// common. q needs no aim.
func Share(f *Foreseen, q Question) *Shared {
	star := Aim{Frame: ICRS, RateRA: plainRate}
	q.Aim, q.Hits, q.Shared = &star, nil, nil
	s := &Shared{of: q, ready: make([][]passage, len(f.Pointings))}
	var sh Sheet
	daylight{}.Look(f, &q, &sh)
	s.days, s.least = sh.Found, sh.Answers[CodeDaylight].Least
	for i := range f.Pointings {
		p := &f.Pointings[i]
		n := f.Rules.Neighbour(p.Telescope)
		if n == nil || p.Aim == nil {
			continue
		}
		if ready, err := f.passages(nil, &q, n, p); err == nil {
			s.ready[i] = ready
		}
	}
	return s
}

// serves reports whether q differs from what was worked out by its aim alone.
func (s *Shared) serves(q *Question) bool {
	return s != nil && s.of.Beam == q.Beam && s.of.Over == q.Over && s.of.Edge == q.Edge && s.of.Slack == q.Slack && s.of.Now.Equal(q.Now)
}

// daylight answers its check, if it was worked out.
func (s *Shared) daylight(q *Question, sh *Sheet) bool {
	if !s.serves(q) {
		return false
	}
	first := sh.begin()
	sh.Found = append(sh.Found, s.days...)
	sh.finish(CodeDaylight, first, s.least)
	return true
}

// Daylight returns when the Sun is above the beam's limit.
func (s *Shared) Daylight() span.Set {
	var set span.Set
	for i := range s.days {
		set = append(set, s.days[i].Over)
	}
	return span.Tidy(set)
}

// passages returns the passages of a question's beam against a pointing, by its
// index, if they were worked out and serve its aim; else nil. They serve any
// part of the span.
func (s *Shared) passages(q *Question, pointing int) []passage {
	if s == nil || s.of.Beam != q.Beam || q.Aim.Frame != ICRS || q.Aim.Error != 0 || !(q.Aim.ownRate() <= plainRate) {
		return nil
	}
	return s.ready[pointing]
}
