package engine

import (
	"fmt"
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"beamward/closures"
)

func fact(from closures.Source, at time.Duration, b closures.Body) pending {
	return pending{from: from, body: b, wall: evening.Add(at), boot: time.Hour + at}
}

func bodies(b *batch) (out []closures.Body) {
	for _, lane := range [...][]pending{b.people, b.devices, b.latest} {
		for _, p := range lane {
			if !p.gone {
				out = append(out, p.body)
			}
		}
	}
	return out
}

// The dumb twin of intake: it keeps everything and sorts it out at the end.
func sortedOut(all []pending) (out []closures.Body) {
	var latest []pending
	for _, l := range []lane{lanePeople, laneDevices} {
		for _, p := range all {
			if kindOf(p.body).lane() == l {
				out = append(out, p.body)
			}
		}
	}
	for _, p := range all {
		if kindOf(p.body).lane() != laneLatest {
			continue
		}
		same := func(o pending) bool { return subjectOf(o.from, o.body) == subjectOf(p.from, p.body) }
		i := slices.IndexFunc(latest, same)
		switch {
		case i < 0:
			latest = append(latest, p)
		case saidBy(p.body).Before(saidBy(latest[i].body)):
			latest[i].body = carry(latest[i].body, p.body)
		default:
			p.body = carry(p.body, latest[i].body)
			latest = append(slices.Delete(latest, i, i+1), p)
		}
	}
	for _, p := range latest {
		out = append(out, p.body)
	}
	return out
}

func anyBody(t *rapid.T, at time.Time) closures.Body {
	said := at.Add(-time.Duration(rapid.IntRange(0, 3).Draw(t, "age")) * time.Millisecond)
	name := rapid.SampledFrom([]string{"a", "b"}).Draw(t, "name")
	yes := rapid.Bool().Draw(t, "yes")
	switch rapid.IntRange(0, 5).Draw(t, "kind") {
	case 0:
		return closures.AircraftSeen{Source: closures.Source(name), Said: said, Aircraft: rapid.SampledFrom([]string{"400001", "400002"}).Draw(t, "aircraft"), Located: yes}
	case 1:
		return closures.AimSeen{Beam: closures.BeamID(name), Said: said, From: rapid.SampledFrom([]string{"encoder", "command"}).Draw(t, "from")}
	case 2:
		return closures.Heard{Source: closures.Source(name), Said: said, Connected: yes}
	case 3:
		return closures.InterlockSeen{Source: closures.Source(name), Said: said, Safe: yes}
	case 4:
		return closures.HoldPlaced{ID: closures.HoldID(fmt.Sprint(name, at.UnixNano())), Beam: "*"}
	}
	return closures.DetectorSeen{Source: closures.Source(name), Said: said, State: closures.DetectorAlarm}
}

func TestIntakeKeepsTheNewestOfEach(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var s counters
		in := newIntake(&s)
		var all []pending
		var accepted, superseded int
		at := time.Duration(0)
		for range rapid.IntRange(1, 120).Draw(t, "facts") {
			at += time.Millisecond
			p := fact(rapid.SampledFrom([]closures.Source{"x", "y"}).Draw(t, "sender"), at, anyBody(t, evening.Add(at)))
			switch done, err := in.offer(p); {
			case err != nil:
				t.Fatal(err)
			case done == Superseded:
				superseded++
				fallthrough
			default:
				accepted++
			}
			all = append(all, p)
			if rapid.IntRange(0, 30).Draw(t, "take") == 0 {
				takeAll(t, in, &all, at)
			}
		}
		takeAll(t, in, &all, at)
		var a, sup uint64
		for k := range s.accepted {
			a, sup = a+s.accepted[k].Load(), sup+s.superseded[k].Load()
		}
		if int(a) != accepted || int(sup) != superseded {
			t.Fatalf("counted %d and %d superseded, want %d and %d", a, sup, accepted, superseded)
		}
	})
}

func takeAll(t *rapid.T, in *intake, all *[]pending, at time.Duration) {
	b := in.take(time.Hour+at, true)
	if b.more {
		t.Fatal("something is left")
	}
	if got, want := bodies(&b), sortedOut(*all); !slices.Equal(got, want) {
		t.Fatalf("took\n%v\nwant\n%v", got, want)
	}
	in.giveBack(&b)
	*all = (*all)[:0]
}

func TestIntakeIsBounded(t *testing.T) {
	var s counters
	in := newIntake(&s)
	for i := range MaxPeople + 1 {
		_, err := in.offer(fact("x", 0, closures.Rearmed{Beam: "north", By: "ana"}))
		if (err != nil) != (i == MaxPeople) || err != nil && codeOf(err) != closures.Busy {
			t.Fatalf("word %d of people: %v", i, err)
		}
	}
	for i := range MaxDevices + 1 {
		_, err := in.offer(fact("x", 0, closures.InterlockSeen{Source: "catwalk", Said: evening}))
		if (err != nil) != (i == MaxDevices) {
			t.Fatalf("word %d of devices: %v", i, err)
		}
	}
	aircraft := func(i int) pending {
		return fact("x", 0, closures.AircraftSeen{Source: "rx-1", Said: evening, Aircraft: fmt.Sprint(i)})
	}
	for i := range MaxLatest + 1 {
		_, err := in.offer(aircraft(i))
		if (err != nil) != (i == MaxLatest) {
			t.Fatalf("aircraft %d: %v", i, err)
		}
	}
	if done, err := in.offer(aircraft(7)); done != Superseded || err != nil {
		t.Fatalf("a newer report of a known one: %v %v", done, err)
	}
	people, facts := 0, 0
	for more := true; more; {
		b := in.take(time.Hour, true)
		got := bodies(&b)
		if len(b.people)+len(b.devices)+len(b.latest) > maxBatch {
			t.Fatal("a batch over its bound")
		}
		for _, p := range got {
			if _, ok := p.(closures.Rearmed); ok {
				if people != facts {
					t.Fatal("a person's word came after another")
				}
				people++
			}
			facts++
		}
		more = b.more
		in.giveBack(&b)
	}
	if facts != MaxPeople+MaxDevices+MaxLatest {
		t.Fatalf("took %d facts", facts)
	}
	if s.refused[kindRearm].Load() != 1 || s.refused[kindInterlock].Load() != 1 || s.refused[kindAircraft].Load() != 1 {
		t.Error("refusals are not counted")
	}
}

func TestWhatSupersedesIsNeverLessClosed(t *testing.T) {
	at := evening
	aim := func(m closures.Motion) closures.Body {
		return closures.AimSeen{Beam: "north", Said: at, From: "encoder", Aim: &closures.Aim{Motion: m}}
	}
	for name, c := range map[string]struct {
		first, second closures.Body
		kept          int
	}{
		"a position by none":          {closures.AircraftSeen{Aircraft: "1", Located: true}, closures.AircraftSeen{Aircraft: "1"}, 2},
		"the air by the ground":       {closures.AircraftSeen{Aircraft: "1", Located: true}, closures.AircraftSeen{Aircraft: "1", Located: true, OnGround: true}, 2},
		"a true one by a drill":       {closures.AircraftSeen{Aircraft: "1", Located: true}, closures.AircraftSeen{Aircraft: "1", Located: true, Drill: true}, 2},
		"a slew by tracking":          {aim(closures.Slewing), aim(closures.Tracking), 2},
		"a telescope by a beam":       {closures.AimSeen{Beam: "a", From: "x"}, closures.AimSeen{Telescope: "a", From: "x"}, 2},
		"an unsafe word by a safe":    {closures.InterlockSeen{Source: "c"}, closures.InterlockSeen{Source: "c", Safe: true}, 2},
		"an alarm by clear":           {closures.DetectorSeen{Source: "c", State: closures.DetectorAlarm}, closures.DetectorSeen{Source: "c", State: closures.DetectorClear}, 2},
		"one aircraft by itself":      {closures.AircraftSeen{Aircraft: "1", Located: true}, closures.AircraftSeen{Aircraft: "1", Located: true}, 1},
		"another source's":            {closures.AircraftSeen{Source: "a", Aircraft: "1"}, closures.AircraftSeen{Source: "b", Aircraft: "1"}, 2},
		"tracking by itself":          {aim(closures.Tracking), aim(closures.Tracking), 1},
		"a connection by a heartbeat": {closures.Heard{Source: "a", Connected: true}, closures.Heard{Source: "a"}, 1},
	} {
		var s counters
		in := newIntake(&s)
		for _, b := range []closures.Body{c.first, c.second} {
			if _, err := in.offer(fact("x", 0, b)); err != nil {
				t.Fatal(err)
			}
		}
		b := in.take(time.Hour, true)
		got := bodies(&b)
		if len(got) != c.kept {
			t.Errorf("%s: %d kept, want %d", name, len(got), c.kept)
		}
		if h, ok := got[0].(closures.Heard); ok && !h.Connected {
			t.Errorf("%s: the connection is forgotten", name)
		}
	}
}

func TestFarAircraftOnceASecond(t *testing.T) {
	r := withAircraft(siteRules())
	var s counters
	in := newIntake(&s)
	in.setRules(r)
	near, far := r.Site.Position, r.Site.Position
	near.Lat += 0.5 / 57.3 // some 55 km
	far.Lat += 2 / 57.3    // some 220 km, beyond watch_range
	seen := func(at time.Duration, who string, located bool) closures.AircraftSeen {
		p := far
		if who == "near" {
			p = near
		}
		return closures.AircraftSeen{Source: "rx-1", Said: evening.Add(at), Aircraft: who, Located: located, Position: p}
	}
	admitted := map[string][]time.Duration{}
	for at := time.Duration(0); at < 5*time.Second; at += 100 * time.Millisecond {
		for _, who := range []string{"near", "far", "nowhere"} {
			if _, err := in.offer(fact("x", at, seen(at, who, who != "nowhere"))); err != nil {
				t.Fatal(err)
			}
		}
		b := in.take(time.Hour+at, true)
		for _, body := range bodies(&b) {
			a := body.(closures.AircraftSeen)
			admitted[a.Aircraft] = append(admitted[a.Aircraft], at)
			if a.Said != evening.Add(at) {
				t.Fatalf("%s: an old report was admitted", a.Aircraft)
			}
		}
		in.giveBack(&b)
	}
	if len(admitted["near"]) != 50 || len(admitted["nowhere"]) != 50 {
		t.Errorf("near ones are held back: %d and %d of 50", len(admitted["near"]), len(admitted["nowhere"]))
	}
	if got := admitted["far"]; len(got) != 5 {
		t.Errorf("the far one was admitted at %v, want once a second", got)
	}
	// The last report of one that falls silent is not lost.
	at := 5*time.Second + 10*time.Millisecond
	last := seen(at, "far", true)
	_, _ = in.offer(fact("x", at, last))
	b := in.take(time.Hour+at+time.Second, true)
	if got := bodies(&b); len(got) != 1 || got[0] != closures.Body(last) {
		t.Errorf("the last report: %v", got)
	}
	// And one that comes near is not held back.
	at += 2 * time.Second
	_, _ = in.offer(fact("x", at, seen(at, "far", true)))
	came := seen(at+1, "far", true)
	came.Position = near
	_, _ = in.offer(fact("x", at+1, came))
	b = in.take(time.Hour+at, true)
	if got := bodies(&b); len(got) != 1 || got[0] != closures.Body(came) {
		t.Errorf("coming near: %v", got)
	}
}
