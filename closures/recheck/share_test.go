package recheck_test

import (
	"fmt"
	"math/rand/v2"
	"testing"
	"time"

	"beamward/closures"
	"beamward/closures/recheck"
)

// Beside a state that knows lists and holds runs one that does not. Where the
// blind one is open and the other shuttered by them, the second opinion must
// object to the blind one's decision, but for what lies within its tolerances.
func TestCatchesWhatABlindDecisionOverlooks(t *testing.T) {
	var closed, caught int
	for seed := range uint64(60) {
		rng := rand.New(rand.NewPCG(seed, 17))
		r := busyRules()
		start := evening.Add(time.Duration(rng.Int64N(int64(5 * time.Hour))))
		blind, full := newWorld(t, r, start, openList(t)), newWorld(t, r, start, openList(t))
		aim := blind.anyAim(rng)
		blind.aim, full.aim = aim, aim
		var extra []closures.Body
		for i := range 1 + rng.IntN(2) {
			extra = append(extra, closures.ListOffered{List: full.anyList(rng, fmt.Sprint("l", i)), By: "test"})
		}
		if rng.IntN(4) == 0 {
			extra = append(extra, closures.HoldPlaced{ID: "h", Beam: "north", By: "ana", Placed: full.at, From: full.at.Add(20 * time.Second), Until: full.at.Add(40 * time.Second)})
		}
		for range 120 {
			d := blind.step(500 * time.Millisecond)
			o := full.step(500*time.Millisecond, extra...)
			extra = nil
			by := o.Codes & (closures.Codes(0).With(closures.CodeListedClosure).With(closures.CodeHold))
			if !d.Open || o.Open || by == 0 {
				continue
			}
			closed++
			if _, vetoed := recheck.Check(&d, full.s.Known(full.at), full.s.Foreseen(), r, full.at); vetoed {
				caught++
			}
		}
	}
	t.Logf("%d of %d overlooked closures were caught", caught, closed)
	if closed < 500 || caught*100 < closed*95 {
		t.Errorf("%d of %d overlooked closures were caught", caught, closed)
	}
}
