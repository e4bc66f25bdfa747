package alerts

import "testing"

// The transitions as ISA-18.2 / IEC 62682 give them (states A, B, C, D, G, H
// and I of the standard's diagram, as secondary sources print it), written
// again in words: from, event, to. "as it is" is unacknowledged while active,
// else normal; what is not here must be refused or change nothing.
const standard = `
normal                  raise        unacknowledged
unacknowledged          acknowledge  acknowledged
unacknowledged          return       returned-unacknowledged
acknowledged            return       normal
returned-unacknowledged acknowledge  normal
returned-unacknowledged raise        unacknowledged
normal                  shelve       shelved
unacknowledged          shelve       shelved
acknowledged            shelve       shelved
returned-unacknowledged shelve       shelved
suppressed              shelve       shelved
normal                  suppress     suppressed
unacknowledged          suppress     suppressed
acknowledged            suppress     suppressed
returned-unacknowledged suppress     suppressed
normal                  remove       out-of-service
unacknowledged          remove       out-of-service
acknowledged            remove       out-of-service
returned-unacknowledged remove       out-of-service
shelved                 remove       out-of-service
suppressed              remove       out-of-service
shelved                 unshelve     as-it-is
suppressed              unsuppress   as-it-is
out-of-service          restore      as-it-is
`

// refused are the pairs that a person is told make no sense.
const refused = `
normal                  acknowledge
shelved                 acknowledge
suppressed              acknowledge
out-of-service          acknowledge
out-of-service          shelve
normal                  unshelve
unacknowledged          unshelve
acknowledged            unshelve
returned-unacknowledged unshelve
suppressed              unshelve
out-of-service          unshelve
normal                  restore
unacknowledged          restore
acknowledged            restore
returned-unacknowledged restore
shelved                 restore
suppressed              restore
`

func TestEveryStateAndEvent(t *testing.T) {
	to, no := map[[2]string]string{}, map[[2]string]bool{}
	for _, line := range lines(standard) {
		to[[2]string{line[0], line[1]}] = line[2]
	}
	for _, line := range lines(refused) {
		no[[2]string{line[0], line[1]}] = true
	}
	pairs := 0
	for s := Normal; s < numStates; s++ {
		for e := Raise; e < numEvents; e++ {
			for bits := range 8 {
				active, parent, safety := bits&1 != 0, bits&2 != 0, bits&4 != 0
				pairs++
				key := [2]string{s.String(), e.String()}
				want, ok := s, !no[key]
				if name, there := to[key]; there {
					if name == "as-it-is" {
						want = Normal
						if active {
							want = Unacknowledged
						}
						if parent && e != Unsuppress {
							want = Suppressed
						}
					} else {
						want, _ = ParseState(name)
					}
				}
				if safety && (e == Shelve || e == Remove) {
					want, ok = s, false
				}
				got, gotOK := Next(s, e, active, parent, safety)
				if got != want || gotOK != ok {
					t.Errorf("%v %v (active %v, parent %v, safety %v): %v %v, want %v %v", s, e, active, parent, safety, got, gotOK, want, ok)
				}
			}
		}
	}
	if pairs != 7*9*8 {
		t.Errorf("%d pairs", pairs)
	}
	if got, ok := Next(numStates, Raise, true, false, false); ok || got != numStates {
		t.Error("a state that is none has a transition")
	}
	if _, ok := Next(Normal, numEvents, true, false, false); ok {
		t.Error("an event that is none has a transition")
	}
}

func TestNamesOfStates(t *testing.T) {
	for s := Normal; s < numStates; s++ {
		if got, ok := ParseState(s.String()); !ok || got != s {
			t.Errorf("%v reads back as %v", s, got)
		}
	}
	if _, ok := ParseState("no-state"); ok {
		t.Error("no-state is a state")
	}
}
