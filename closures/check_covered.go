package closures

import (
	"beamward/geometry/span"
)

// notCovered is the check that every required authority has said something
// about the time: closed is whatever no list in force covers.
type notCovered struct{}

func (notCovered) Code() Code { return CodeNotCovered }

func (notCovered) Look(f *Foreseen, q *Question, sh *Sheet) {
	first := sh.begin()
	whole := [1]span.Span{}
	for i := range f.Rules.Authorities {
		a := &f.Rules.Authorities[i]
		near := q.Over.Widen(a.Tail, a.Lead)
		var covered []span.Span
		for j := range f.Lists {
			l := &f.Lists[j]
			if l.Authority() == a.ID && l.opens(q.Beam.ID) {
				covered = append(covered, l.Covers())
			}
		}
		whole[0] = near
		for _, s := range span.AppendSubtract(nil, whole[:], span.Make(covered...)) {
			over := s.Widen(a.Lead, a.Tail)
			if over.Intersect(q.Over).Empty() {
				continue
			}
			if !a.Required {
				sh.Cautions = append(sh.Cautions, Caution{Code: CodeNotCovered, Source: Source(a.ID), Detail: "an authority that is not required has no list for the time to come"})
				break
			}
			sh.add(Finding{Code: CodeNotCovered, Source: Source(a.ID), Verdict: Violated, Over: over, Detail: "no list in force covers the time"})
		}
	}
	sh.sortFrom(first)
	sh.finish(CodeNotCovered, first, Margin{})
}
