package simulate

import (
	"context"
	"fmt"
	"time"

	"beamward/closures"
)

// disturbs draws what goes wrong: people in danger, alarms, silence, an empty
// post, a clock that is set wrong, and what happens to the process.
func (n *night) disturbs() {
	for range n.often(5 * time.Minute) {
		from := n.some()
		n.then(from, func() { n.danger = n.now(); n.next["catwalk"] = time.Time{} })
		n.then(from.Add(n.lasting(300*time.Millisecond, 20*time.Second)), func() { n.danger = time.Time{} })
	}
	for range n.often(8 * time.Minute) {
		from, what := n.some(), closures.DetectorAlarm
		if n.rng.IntN(3) == 0 {
			what = closures.DetectorBlind
		}
		n.then(from, func() { n.blind = what; n.next["thermal-1"] = time.Time{} })
		n.then(from.Add(n.lasting(2*time.Second, 20*time.Second)), func() { n.blind = closures.DetectorClear })
	}
	for range n.often(4 * time.Minute) {
		name := [...]string{"rx-1", "rx-2", "catwalk", "thermal-1", "ridge-2", "north", "south"}[n.rng.IntN(7)]
		lasts := n.lasting(2*time.Second, 25*time.Second)
		n.then(n.some(), func() { n.silent[name] = n.now().Add(lasts) })
	}
	if n.rng.IntN(3) == 0 {
		from := n.some()
		n.then(n.start, func() { n.staffed = from })
		lasts := n.lasting(10*time.Second, time.Minute)
		n.then(from.Add(lasts), func() {
			n.staffed = n.start.Add(n.opt.Length + time.Hour)
			n.next["east-lot"] = time.Time{}
		})
	}
	if n.rng.IntN(2) == 0 {
		n.misset()
	}
	n.ends()
	if n.rng.IntN(2) == 0 {
		at := n.some()
		n.at(at, n.reloads(leads[1]))
		n.at(at.Add(n.lasting(time.Minute, n.opt.Length/3)), n.reloads(leads[2]))
	}
}

// misset sets the machine's clock wrong for a time, as the kernel then says.
func (n *night) misset() {
	from := n.some()
	by := n.lasting(200*time.Millisecond, 5*time.Minute)
	if n.rng.IntN(2) == 0 {
		by = -by
	}
	n.then(from, func() {
		n.clock.Step(by)
		n.clock.Discipline(true, false, time.Second)
		n.judge.told.clockBad = n.now()
	})
	n.then(from.Add(n.lasting(5*time.Second, 40*time.Second)), func() {
		n.clock.Step(-by)
		n.clock.Discipline(true, true, time.Millisecond)
		n.judge.told.clockBad = time.Time{}
	})
}

// ends kills the process and starts it again, stops it for a while, or puts
// the machine to sleep. Some kills come between a person's word and its answer.
func (n *night) ends() {
	for i := range n.often(6 * time.Minute) {
		down := n.lasting(200*time.Millisecond, 15*time.Second)
		unanswered := n.rng.IntN(2) == 0
		when := n.some()
		switch n.rng.IntN(4) {
		case 0:
			n.then(when, func() {
				n.stall = n.now().Add(down)
				n.busy = n.stall.Add(soon)
			})
		case 1:
			n.then(when, func() { n.sleep(down) })
		default:
			n.at(when, func(context.Context) (bool, error) {
				if !n.reaches() {
					return true, nil
				}
				if unanswered {
					h := closures.HoldPlaced{ID: closures.HoldID(fmt.Sprintf("cut-%d", i)), Beam: closures.EveryBeam, Reason: "cut off", By: "operator", Until: n.now().Add(time.Minute)}
					placed := h
					placed.Placed = n.now()
					if err := n.daemon.tell(context.Background(), "operator", placed, false); err != nil {
						return false, err
					}
					n.at(n.now().Add(retry), n.holds(h)) // nobody answered, so it is placed again
				}
				n.kept()
				n.daemon.kill()
				n.daemon, n.view = nil, nil
				n.result.Kills++
				n.at(n.now().Add(down), func(ctx context.Context) (bool, error) { return false, n.wake(ctx) })
				return false, nil
			})
		}
	}
}

// kept counts what people rely on over a kill.
func (n *night) kept() {
	for _, h := range n.judge.told.holds {
		if h.until.IsZero() || n.now().Before(h.until) {
			n.result.Restored++
		}
	}
	for i := range n.judge.told.sightings {
		if s := &n.judge.told.sightings[i]; n.now().Before(s.Said.Add(s.For)) {
			n.result.Restored++
		}
	}
}

// sleep puts the machine to sleep: nobody reads a permit meanwhile, and the
// readers' clocks go on.
func (n *night) sleep(d time.Duration) {
	n.clock.Suspend(d)
	n.advance(0)
	n.busy = n.now().Add(soon)
}
