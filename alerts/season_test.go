package alerts

import (
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"beamward/closures"
)

// situation is something that goes wrong in a night: how often in a hundred
// nights, for how long, and what it changes while it lasts. Those that share a
// cause are one situation.
type situation struct {
	name     string
	per100   int
	least    time.Duration
	most     time.Duration
	do, undo func(*rand.Rand, *Observation)
}

func all(o *Observation, f func(*Beam)) {
	for i := range o.Beams {
		f(&o.Beams[i])
	}
}

// The mix is invented: it says what a season might hold, so that the figures
// can be judged, and is not from any site.
var mix = []situation{
	{"a source blips", 300, 2 * time.Second, 12 * time.Second, func(r *rand.Rand, o *Observation) { o.Sources[0].Silent = true }, func(r *rand.Rand, o *Observation) { o.Sources[0].Silent = false }},
	{"a receiver fails", 40, 5 * time.Minute, time.Hour, func(r *rand.Rand, o *Observation) { o.Sources[1].Silent = true }, func(r *rand.Rand, o *Observation) { o.Sources[1].Silent = false }},
	{"a bad feed flaps", 30, 20 * time.Minute, time.Hour, nil, func(r *rand.Rand, o *Observation) { o.Sources[0].Silent = false }},
	{"a sender is wrong", 20, 10 * time.Minute, time.Hour, func(r *rand.Rand, o *Observation) {
		o.Sources[0].RefusedKnown, o.Sources[0].RefusedPerMinute = true, 200
	}, func(r *rand.Rand, o *Observation) { o.Sources[0].RefusedPerMinute = 0 }},
	{"the network fails", 10, time.Minute, 20 * time.Minute, func(r *rand.Rand, o *Observation) {
		for i := range o.Sources {
			o.Sources[i].Silent = true
		}
		all(o, func(b *Beam) { b.AimUnknown, b.ShutterSilent = true, true })
		o.Telescopes[0].Silent = true
	}, func(r *rand.Rand, o *Observation) {
		for i := range o.Sources {
			o.Sources[i].Silent = false
		}
		all(o, func(b *Beam) { b.AimUnknown, b.ShutterSilent = false, false })
		o.Telescopes[0].Silent = false
	}},
	{"the clock steps", 4, 20 * time.Second, 2 * time.Minute, func(r *rand.Rand, o *Observation) {
		all(o, func(b *Beam) { b.Codes, b.Needs = b.Codes.With(closures.CodeClock), b.Needs.With(closures.CodeClock) })
	}, func(r *rand.Rand, o *Observation) {
		all(o, func(b *Beam) {
			b.Codes, b.Needs = b.Codes.Without(closures.CodeClock), b.Needs.Without(closures.CodeClock)
		})
	}},
	{"an interlock opens", 20, time.Minute, 20 * time.Minute, func(r *rand.Rand, o *Observation) {
		o.Sources[2].Unsafe = true
		all(o, func(b *Beam) {
			b.Codes, b.Needs = b.Codes.With(closures.CodeInterlock), b.Needs.With(closures.CodeInterlock)
		})
	}, func(r *rand.Rand, o *Observation) {
		o.Sources[2].Unsafe = false
		all(o, func(b *Beam) {
			b.Codes, b.Needs = b.Codes.Without(closures.CodeInterlock), b.Needs.Without(closures.CodeInterlock)
		})
	}},
	{"a detector sees an aircraft", 60, 20 * time.Second, 3 * time.Minute, func(r *rand.Rand, o *Observation) { o.Sources[3].Alarm = true }, func(r *rand.Rand, o *Observation) { o.Sources[3].Alarm = false }},
	{"an aircraft is lost", 60, 20 * time.Second, 5 * time.Minute, func(r *rand.Rand, o *Observation) { o.Beams[0].Lost = []string{"4b1803"} }, func(r *rand.Rand, o *Observation) { o.Beams[0].Lost = nil }},
	{"a telescope's computer restarts", 30, 2 * time.Minute, 20 * time.Minute, func(r *rand.Rand, o *Observation) { o.Beams[1].AimUnknown = true }, func(r *rand.Rand, o *Observation) { o.Beams[1].AimUnknown = false }},
	{"the neighbour is silent", 30, time.Minute, 2 * time.Hour, func(r *rand.Rand, o *Observation) { o.Telescopes[0].Silent = true }, func(r *rand.Rand, o *Observation) { o.Telescopes[0].Silent = false }},
	{"a list ends", 20, 10 * time.Minute, time.Hour, func(r *rand.Rand, o *Observation) { o.Authorities[0].Covered = time.Time{} }, func(r *rand.Rand, o *Observation) { o.Authorities[0].Covered = evening.Add(1e5 * time.Hour) }},
	{"a list waits", 40, 2 * time.Minute, time.Hour, func(r *rand.Rand, o *Observation) { o.Authorities[0].Waiting = "l" }, func(r *rand.Rand, o *Observation) { o.Authorities[0].Waiting = "" }},
	{"a spotter leaves", 40, 30 * time.Second, 15 * time.Minute, func(r *rand.Rand, o *Observation) { o.Posts[0].Missing = true }, func(r *rand.Rand, o *Observation) { o.Posts[0].Missing = false }},
	{"low traffic pops up", 100, time.Second, 2 * time.Second, func(r *rand.Rand, o *Observation) { o.Popups += uint64(1 + r.IntN(3)) }, nil},
	{"mail is down", 10, time.Minute, 3 * time.Hour, func(r *rand.Rand, o *Observation) {
		o.Receivers = []Receiver{{Name: "mail", FailingSince: evening}}
	}, func(r *rand.Rand, o *Observation) { o.Receivers = nil }},
	{"the shutter sticks", 3, time.Minute, 30 * time.Minute, func(r *rand.Rand, o *Observation) {
		b := &o.Beams[0]
		b.Codes, b.Needs = b.Codes.With(closures.CodeShutterFault), b.Needs.With(closures.CodeShutterFault)
	}, func(r *rand.Rand, o *Observation) {
		b := &o.Beams[0]
		b.Codes, b.Needs = b.Codes.Without(closures.CodeShutterFault), b.Needs.Without(closures.CodeShutterFault)
	}},
	{"a routine closure", 4000, 20 * time.Second, 3 * time.Minute, func(r *rand.Rand, o *Observation) {
		o.Beams[0].Codes = o.Beams[0].Codes.With(closures.Code(r.IntN(6)))
	}, func(r *rand.Rand, o *Observation) { o.Beams[0].Codes &^= 0x3f }},
}

// A season of nights of ten hours with that mix, and people who answer within
// ten minutes: on the average at most one alarm in ten minutes, at most ten in
// any ten minutes, none that chatters, and about one a situation.
func TestSeason(t *testing.T) {
	nights := 40
	if os.Getenv("BEAMWARD_LONG") != "" {
		nights = 400
	}
	const step = 5 * time.Second
	rng := rand.New(rand.NewPCG(31, 2))
	alarms, situations, peak, most := 0, 0, 0, 0
	for range nights {
		r := newRoom(t, everyone())
		r.o.Telescopes = []Telescope{{ID: "ridge-2"}}
		r.o.Posts = []Post{{ID: "east-lot"}}
		r.o.Authorities = []Authority{{ID: "desk", Required: true, Covered: evening.Add(1e5 * time.Hour)}}
		type planned struct {
			*situation
			from, until time.Time
			on          bool
		}
		var plan []planned
		for i := range mix {
			for range 4 {
				if rng.IntN(400) < mix[i].per100 || mix[i].per100 > 400 {
					from := evening.Add(time.Duration(rng.Int64N(int64(9 * time.Hour))))
					plan = append(plan, planned{&mix[i], from, from.Add(mix[i].least + time.Duration(rng.Int64N(int64(mix[i].most-mix[i].least)))), false})
					if mix[i].per100 < 400 {
						situations++
					}
				}
			}
		}
		for r.at.Before(evening.Add(10 * time.Hour)) {
			r.at = r.at.Add(step)
			for i := range plan {
				p := &plan[i]
				now := !r.at.Before(p.from) && r.at.Before(p.until)
				switch {
				case now && p.do == nil:
					r.o.Sources[0].Silent = r.at.Unix()/70%2 == 0
				case now && !p.on:
					p.do(rng, &r.o)
				case !now && p.on && p.undo != nil:
					p.undo(rng, &r.o)
				}
				p.on = now
			}
			all(&r.o, func(b *Beam) { b.Open = b.Codes == 0 })
			r.take(r.m.Step(r.at, &r.o))
			for _, a := range r.m.Alarms() {
				if (a.State == Unacknowledged || a.State == Returned) && rng.IntN(100) == 0 {
					r.ack(a.Kind, a.Subject)
				}
			}
		}
		var raises []time.Time
		for i := range r.sent {
			if r.sent[i].What == Raised {
				raises = append(raises, r.sent[i].At)
			}
		}
		alarms += len(raises)
		most = max(most, len(raises))
		for i := range raises {
			n := 0
			for _, o := range raises[i:] {
				if o.Sub(raises[i]) <= 10*time.Minute {
					n++
				}
			}
			peak = max(peak, n)
		}
		noChatter(t, r.sent)
	}
	tens := float64(nights) * 60
	t.Logf("%d nights: %d situations, %d alarms; %.3f in ten minutes, at most %d in any ten minutes, %d in the busiest night", nights, situations, alarms, float64(alarms)/tens, peak, most)
	if float64(alarms)/tens > 1 || peak > 10 {
		t.Errorf("people cannot follow: %.3f in ten minutes, peak %d", float64(alarms)/tens, peak)
	}
	if alarms > situations {
		t.Errorf("%d alarms of %d situations", alarms, situations)
	}
	if alarms == 0 {
		t.Error("no alarms at all")
	}
}
