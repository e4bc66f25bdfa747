package engine

import (
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"beamward/closures"
)

// Whatever devices say, each word is applied once and in order, and no turn
// holds two that contradict each other.
func TestNoTurnHoldsAContradiction(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var s counters
		e := &Engine{in: newIntake(&s), says: map[deviceSays]uint8{}}
		var said, applied []closures.Body
		at := time.Duration(0)
		turn := func() bool {
			b := e.in.take(time.Hour+at, len(e.deferred) == 0)
			e.part(&b)
			for i, p := range b.devices {
				applied = append(applied, p.body)
				who, state, ok := saysOf(p.body)
				for _, o := range b.devices[:i] {
					if w, st, _ := saysOf(o.body); ok && w == who && st != state {
						t.Fatalf("%v and %v in one turn", o.body, p.body)
					}
				}
			}
			e.in.giveBack(&b)
			return b.more
		}
		for range rapid.IntRange(1, 60).Draw(t, "words") {
			at += time.Millisecond
			yes := rapid.Bool().Draw(t, "yes")
			name := rapid.SampledFrom([]string{"a", "b"}).Draw(t, "name")
			var b closures.Body
			switch rapid.IntRange(0, 5).Draw(t, "kind") {
			case 0:
				b = closures.InterlockSeen{Source: closures.Source(name), Said: evening.Add(at), Safe: yes}
			case 1:
				b = closures.DetectorSeen{Source: closures.Source(name), Said: evening.Add(at), State: closures.DetectorState(rapid.IntRange(0, 2).Draw(t, "state"))}
			case 2:
				b = closures.ShutterSeen{Beam: closures.BeamID(name), Said: evening.Add(at), Position: closures.ShutterPosition(rapid.IntRange(0, 3).Draw(t, "position"))}
			case 3:
				b = closures.LaserSeen{Beam: closures.BeamID(name), Said: evening.Add(at), Emitting: yes}
			case 4:
				b = closures.Sighted{Source: closures.Source(name), Said: evening.Add(at), Clear: yes}
			default:
				b = closures.WeatherSeen{Source: closures.Source(name), Said: evening.Add(at)}
			}
			said = append(said, b)
			if _, err := e.in.offer(fact("x", at, b)); err != nil {
				t.Fatal(err)
			}
			if rapid.IntRange(0, 9).Draw(t, "turn") == 0 {
				turn()
			}
		}
		for turn() {
		}
		if !slices.Equal(said, applied) {
			t.Fatalf("applied\n%v\nof\n%v", applied, said)
		}
	})
}

// A device that chatters fills its lane and no more.
func TestChatterIsBounded(t *testing.T) {
	w := newSite(t, siteRules())
	at, _ := w.clock.Read()
	refused := 0
	for i := range 2*MaxDevices + 10 {
		if _, err := w.e.Offer("tcp", closures.InterlockSeen{Source: "catwalk", Said: at, Safe: i%2 == 0}); err != nil {
			refused++
		}
		if i%1000 == 0 {
			if _, err := w.e.turn(); err != nil {
				t.Fatal(err)
			}
		}
	}
	if waits := len(w.e.deferred) + len(w.e.in.devices); waits > MaxDevices+maxBatch || refused == 0 {
		t.Errorf("%d words wait, %d were refused", waits, refused)
	}
}
