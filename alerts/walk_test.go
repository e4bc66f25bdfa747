package alerts

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"beamward/closures"
)

// wander changes an observation at random, as nights do and as they do not.
func wander(rng *rand.Rand, o *Observation, at time.Time) {
	flip := func(b *bool) { *b = rng.IntN(2) == 0 }
	switch rng.IntN(22) {
	case 0, 1, 2, 3:
		flip(&o.Sources[rng.IntN(len(o.Sources))].Silent)
	case 4:
		flip(&o.Sources[rng.IntN(len(o.Sources))].Deaf)
	case 5:
		flip(&o.Sources[2].Unsafe)
	case 6:
		flip(&o.Sources[3].Alarm)
	case 7, 8:
		b := &o.Beams[rng.IntN(len(o.Beams))]
		c := closures.Code(rng.IntN(int(closures.NumCodes)))
		b.Codes ^= codes(c)
		b.Open = b.Codes == 0
	case 9:
		b := &o.Beams[rng.IntN(len(o.Beams))]
		b.Needs = codes([]closures.Code{closures.CodeStarting, closures.CodeClock, closures.CodeFault, closures.CodeShutterFault, closures.CodeInterlock}[rng.IntN(5)])
	case 10, 11:
		o.Beams[rng.IntN(len(o.Beams))].Needs = 0
	case 12:
		flip(&o.Beams[0].AimUnknown)
	case 13:
		flip(&o.Beams[0].AimsDisagree)
	case 14:
		o.DiskKnown, o.DiskFree = true, 0.2*rng.Float64()
	case 15:
		flip(&o.Damaged)
	case 16:
		o.Popups += uint64(rng.IntN(3))
	case 17:
		o.Receivers = []Receiver{{Name: "mail"}}
		if rng.IntN(2) == 0 {
			o.Receivers[0].FailingSince = at
		}
	case 18:
		o.Working = rng.IntN(5) > 0
	case 19:
		o.Stopped = rng.IntN(4) == 0
	case 20:
		o.Posts = []Post{{ID: "east-lot", Missing: rng.IntN(2) == 0}}
	case 21:
		o.Authorities = []Authority{{ID: "desk", Required: true, Covered: at.Add(time.Duration(rng.IntN(4)) * time.Hour), Waiting: closures.ListID([]string{"", "l"}[rng.IntN(2)])}}
	}
}

// A random walk of observations, people's commands, restarts and times. After
// every step the machine is held against what an alarm's state means, and every
// transition against the standard's table.
func TestRandomWalks(t *testing.T) {
	walks, steps := uint64(40), 2500
	if os.Getenv("BEAMWARD_LONG") != "" {
		walks = 300
	}
	to, total, restarts := map[[2]string]string{}, 0, 0
	for _, line := range lines(standard) {
		to[[2]string{line[0], line[1]}] = line[2]
	}
	visited := map[string]int{}
	for seed := range walks {
		rng := rand.New(rand.NewPCG(seed, 1))
		r := newRoom(t, everyone())
		annoyed := map[Key]bool{} // a person's unshelving may raise it more often
		last := map[Key]State{}
		check := func(out Output) {
			t.Helper()
			raisedMessages := map[Key]int{}
			for _, m := range out.Messages {
				if m.What == Raised {
					raisedMessages[Key{m.Kind, m.Subject}]++
				}
			}
			for _, c := range out.Changes {
				total++
				k := c.Alarm.Key
				visited[c.From.String()+" "+c.Event.String()]++
				if c.From != last[k] {
					t.Fatalf("seed %d: %v was %v and goes from %v", seed, k, last[k], c.From)
				}
				want := to[[2]string{c.From.String(), c.Event.String()}]
				if got := c.Alarm.State.String(); want == "" || want != "as-it-is" && want != got {
					t.Fatalf("seed %d: %v goes from %v by %v to %v", seed, k, c.From, c.Event, got)
				}
				last[k] = c.Alarm.State
				if c.Alarm.State == Unacknowledged && raisedMessages[k] == 0 {
					t.Fatalf("seed %d: %v was raised and nobody told", seed, k)
				}
			}
			r.take(out)
			for _, a := range r.m.alarms {
				held := r.at.Sub(a.turned)
				switch {
				case a.row.Safety && (a.state == Shelved || a.state == OutOfService):
					t.Fatalf("seed %d: safety alarm %v is %v", seed, a.key, a.state)
				case a.state == Shelved && r.at.After(a.until.Add(90*time.Second)):
					t.Fatalf("seed %d: %v is shelved past its time", seed, a.key)
				case a.state == Normal && a.active, a.state == Returned && a.active, a.state == Acknowledged && !a.active, a.state == Unacknowledged && !a.active:
					t.Fatalf("seed %d: %v is %v, active %v", seed, a.key, a.state, a.active)
				case a.active && !a.raw && held > slowest+a.row.Off+time.Minute:
					t.Fatalf("seed %d: %v is active for %v without a cause", seed, a.key, held)
				case a.raw && !a.active && held > a.row.On+time.Minute:
					t.Fatalf("seed %d: %v has a cause for %v and is not active", seed, a.key, held)
				}
				if a.state != last[a.key] {
					t.Fatalf("seed %d: %v is %v and no change said so (%v)", seed, a.key, a.state, last[a.key])
				}
			}
		}
		for range steps {
			wander(rng, &r.o, r.at)
			r.at = r.at.Add(time.Duration(rng.Int64N(int64(40 * time.Second))))
			check(r.m.Step(r.at, &r.o))
			// A root that stands untouched hides what rests on it.
			for _, a := range r.m.alarms {
				if (a.state == Unacknowledged || a.state == Acknowledged) && a.raw {
					if parent, hidden := r.m.parentOf(a); hidden {
						t.Fatalf("seed %d: %v stands beside its parent %s", seed, a.key, parent)
					}
				}
			}
			if len(r.m.alarms) > 0 && rng.IntN(4) == 0 {
				k := r.m.alarms[rng.IntN(len(r.m.alarms))].key
				var out Output
				var err *closures.Error
				before := r.m.find(k).state
				switch rng.IntN(6) {
				case 0, 1:
					out, err = r.m.Acknowledge(r.at, k, "ana")
				case 2:
					out, err = r.m.Shelve(r.at, k, "ana", "noise", time.Duration(1+rng.IntN(3600))*time.Second)
				case 3:
					out, err = r.m.Unshelve(r.at, k, "ana")
					annoyed[k] = true
				case 4:
					out, err = r.m.Remove(r.at, k, "ana", "work")
				case 5:
					out, err = r.m.Restore(r.at, k, "ana")
					annoyed[k] = true
				}
				if err != nil && len(out.Changes) > 0 || err != nil && r.m.find(k).state != before {
					t.Fatalf("seed %d: %v was refused and changed", seed, k)
				}
				if err == nil && len(out.Changes) > 0 && out.Changes[0].Alarm.State == Shelved {
					annoyed[k] = true
				}
				check(out)
			}
			if rng.IntN(200) == 0 {
				restarts++
				kept := r.m.Snapshot()
				m, dropped, err := Restored(everyone(), kept)
				if err != nil || len(dropped) > 0 {
					t.Fatalf("seed %d: %v, dropped %v\n%s", seed, err, dropped, kept)
				}
				if again := m.Snapshot(); !bytes.Equal(again, kept) {
					t.Fatalf("seed %d: kept\n%s\nand again\n%s", seed, kept, again)
				}
				if a, b := fmt.Sprint(m.Alarms(), m.Flood()), fmt.Sprint(r.m.Alarms(), r.m.Flood()); a != b {
					t.Fatalf("seed %d: restored as\n%s\nwas\n%s", seed, a, b)
				}
				r.m = m
			}
		}
		var quiet []Message
		ids := map[string]bool{}
		for _, m := range r.sent {
			if ids[m.ID] {
				t.Fatalf("seed %d: two messages have the id %s", seed, m.ID)
			}
			ids[m.ID] = true
			if !annoyed[Key{m.Kind, m.Subject}] {
				quiet = append(quiet, m)
			}
		}
		noChatter(t, quiet)
	}
	t.Logf("%d transitions, %d restarts", total, restarts)
	for pair := range to {
		if visited[pair[0]+" "+pair[1]] == 0 {
			t.Errorf("no walk came by %v", pair)
		}
	}
}
