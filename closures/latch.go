package closures

import "time"

// latch closes at once and opens late. After the last closure it keeps the
// beam shuttered for a time, and after causes that ask for a person until one
// re-arms.
type latch struct {
	closed time.Time // the last instant at which anything else closed
	need   Codes     // causes that ask for a person
}

// settle takes in what is closed at an instant, apart from the latch itself,
// and which of it may ask for a person.
func (l *latch) settle(r *Rules, closed, asks Codes, at time.Time) (changed bool) {
	closed = closed.Without(CodeReopening).Without(CodeRearm)
	if closed == 0 {
		return false
	}
	l.closed = at
	before := l.need
	l.need |= closed & asks &^ r.ByItself
	return l.need != before
}

// write gives the latch's two answers for an instant.
func (l *latch) write(b *BeamRules, at time.Time, sh *Sheet) {
	first := sh.begin()
	until := l.closed.Add(b.ReopenAfter)
	// Positive: clear only when the time has surely passed.
	if passed := !at.Before(until); !passed {
		f := Finding{Code: CodeReopening, Verdict: Violated, Detail: "the time after the last closure runs"}
		f.Over.From, f.Over.Until = l.closed, until
		sh.add(f)
	}
	sh.finish(CodeReopening, first, Margin{Value: at.Sub(until).Seconds(), Unit: Second})

	first = sh.begin()
	for c := Code(0); c < NumCodes; c++ {
		if l.need.Has(c) {
			sh.add(Finding{Code: CodeRearm, Source: Source(c.String()), Verdict: Violated, Detail: "a person must re-arm after this cause"})
		}
	}
	sh.finish(CodeRearm, first, Margin{})
}
