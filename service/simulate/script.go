package simulate

import (
	"bytes"
	"context"
	"fmt"
	"maps"
	"math"
	"slices"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/geometry"
	"beamward/geometry/span"
)

// event is something that happens in a night. One that asks to be done again
// comes later: people try again while the daemon does not answer.
type event struct {
	at time.Time
	do func(ctx context.Context) (again bool, err error)
}

// retry is after what time people try again.
const retry = 3 * time.Second

// happen does what is due.
func (n *night) happen(ctx context.Context) error {
	for len(n.events) > 0 && !n.events[0].at.After(n.now()) {
		e := n.events[0]
		n.events = n.events[1:]
		n.busy = n.now().Add(soon)
		again, err := e.do(ctx)
		if err != nil {
			return err
		}
		if again {
			n.at(n.now().Add(retry), e.do)
		}
	}
	return nil
}

// at puts an event into the script, which stays in order of time.
func (n *night) at(when time.Time, do func(ctx context.Context) (bool, error)) {
	i, _ := slices.BinarySearchFunc(n.events, when, func(e event, t time.Time) int {
		if e.at.After(t) {
			return 1
		}
		return -1 // equal ones keep the order in which they came
	})
	n.events = slices.Insert(n.events, i, event{when, do})
}

// then is an event that only changes the world.
func (n *night) then(when time.Time, do func()) {
	n.at(when, func(context.Context) (bool, error) { do(); return false, nil })
}

// Draws of the night.

func (n *night) uniform(low, high float64) float64 { return low + (high-low)*n.rng.Float64() }

func (n *night) lasting(low, high time.Duration) time.Duration {
	return time.Duration(n.uniform(float64(low), float64(high))).Truncate(10 * time.Millisecond)
}

// some is an instant of the night after everything has begun to speak.
func (n *night) some() time.Time {
	return n.start.Add(n.lasting(80*time.Second, n.opt.Length))
}

// often is how many times something happens that happens once in so long.
func (n *night) often(once time.Duration) int {
	mean := float64(n.opt.Length) / float64(once)
	return int(mean + n.rng.Float64())
}

// write makes the night from its seed.
func (n *night) write() error {
	n.staffed = n.start.Add(n.opt.Length + time.Hour)
	for i, b := range n.cfg.Rules.Beams {
		for j := range 4 {
			el := n.uniform(46, 78)
			if i == 0 && j == 3 {
				el = n.uniform(31, 34) // it may set while the night lasts
			}
			d := geometry.FromHorizon(s1.Angle(n.uniform(0, 360))*s1.Degree, s1.Angle(el)*s1.Degree)
			stands := n.start.Add(n.opt.Length * time.Duration(j) / 4) // one after the other, as a night is planned
			n.targets[fmt.Sprintf("%s-%d", b.ID, j)] = n.sky(stands).ICRS(d, stands)
		}
		n.scopes = append(n.scopes, &scope{name: string(b.ID), to: n.targets[string(b.ID)+"-0"], target: string(b.ID) + "-0", off: wrongBy(n.rng, 33*arcsec*n.rng.Float64())})
		behind := [...]time.Duration{clockWrong, 0, -clockWrong}[n.rng.IntN(3)]
		n.lasers = append(n.lasers, &laser{beam: b.ID, shutter: b.ShutterTime, behind: behind, deaf: n.opt.Broken == FaultIgnoreUntil})
	}
	n.scopes = append(n.scopes, &scope{name: "ridge-2", to: n.near("north-1", 4), target: "q-0", off: wrongBy(n.rng, 55*arcsec*n.rng.Float64())})
	n.slews()
	n.flies()
	n.disturbs()
	n.orders()
	return n.authorities()
}

// near is a place some degrees from a target.
func (n *night) near(target string, degrees float64) r3.Vector {
	v := n.targets[target]
	off := wrongBy(n.rng, degrees*degree*n.rng.Float64())
	e1 := v.Ortho()
	return v.Add(e1.Mul(off.X)).Add(v.Cross(e1).Mul(off.Y)).Normalize()
}

// slews turns the telescopes now and then; the neighbour often to where one of
// the beams points.
func (n *night) slews() {
	for i := range n.often(2 * time.Minute) {
		s := n.scopes[i%len(n.scopes)]
		when := n.some()
		if s.name != "ridge-2" {
			target := fmt.Sprintf("%s-%d", s.name, n.rng.IntN(4))
			n.then(when, func() { s.ask(target, n.targets[target], n.now()) })
			continue
		}
		beam := n.scopes[n.rng.IntN(2)]
		degrees := n.uniform(0, 3)
		n.then(when, func() {
			where := n.near(beam.target, degrees)
			s.ask(beam.target, where, n.now())
		})
	}
}

// flies sends aircraft over the site, most of them through or past a beam.
func (n *night) flies() {
	for i := range n.often(3 * time.Minute) {
		up := n.overhead(n.targets[n.scopes[n.rng.IntN(2)].target], n.start)
		height := n.uniform(1500, 10000)
		f := &flight{
			address: fmt.Sprintf("a%05d", i), from: n.start.Add(n.lasting(0, n.opt.Length)), speed: n.uniform(60, 250), track: n.uniform(0, 2*math.Pi),
			network: n.rng.IntN(2) == 0,
		}
		f.at = up.Mul(height / up.Z)
		sin, cos := math.Sincos(n.uniform(0, 2*math.Pi))
		past := n.uniform(0, 5000) * n.rng.Float64()
		f.at = f.at.Add(r3.Vector{X: past * sin, Y: past * cos})
		if n.rng.IntN(2) == 0 { // the turn begins before the beam
			f.rate, f.turns = n.uniform(-3, 3)*degree, n.lasting(5*time.Second, 40*time.Second)
			before := n.uniform(0, 30) * f.speed
			sin, cos := math.Sincos(f.track)
			f.at = f.at.Sub(r3.Vector{X: before * sin, Y: before * cos})
		}
		n.flights = append(n.flights, f)
	}
}

// list makes a closure list as its reader would.
func (n *night) list(t *closures.ListText) (*closures.List, error) {
	var text bytes.Buffer
	if err := listfile.Canonical(&text, t); err != nil {
		return nil, err
	}
	l, _, err := listfile.Load(&text, listfile.JSON, listfile.Limits{})
	if err == nil {
		n.lists[l.ID()] = l
	}
	return l, err
}

// windows draws closed windows for a region, within what the list covers.
func (n *night) windows(region int32, covers span.Span) []closures.Window {
	var out []closures.Window
	for range n.often(4 * time.Minute) {
		from := n.start.Add(n.lasting(0, n.opt.Length))
		until := from.Add(n.lasting(time.Second, 40*time.Second))
		if until.After(covers.Until) {
			continue
		}
		out = append(out, closures.Window{Region: region, From: from.UnixNano(), Until: until.UnixNano()})
	}
	return out
}

// authorities writes the lists, and when they come, are confirmed, replaced and
// withdrawn.
func (n *night) authorities() error {
	covers := span.Span{From: n.start.Add(-time.Hour).Truncate(time.Second), Until: n.start.Add(n.opt.Length + time.Hour).Truncate(time.Second)}
	if n.rng.IntN(4) == 0 { // coverage that ends in the night
		covers.Until = n.start.Add(n.opt.Length * 9 / 10).Truncate(time.Second)
	}
	base := closures.ListText{ID: "2031-046-A", Authority: "orbital-desk", Issued: n.start.Add(-3 * time.Hour).Truncate(time.Second), Covers: covers, UnlistedOpen: n.rng.IntN(3) > 0}
	for _, name := range slices.Sorted(maps.Keys(n.targets)) {
		r := closures.Region{ID: name, Shape: closures.ICRSCone, Direction: n.targets[name], Radius: s1.Angle(n.uniform(0.03, 0.6)) * s1.Degree}
		w := n.windows(int32(len(base.Regions)), covers)
		if len(w) == 0 {
			r.Throughout = closures.ThroughoutOpen
		}
		base.Regions, base.Windows = append(base.Regions, r), append(base.Windows, w...)
	}
	open := int32(len(base.Regions))
	base.Regions = append(base.Regions, closures.Region{ID: "hours", Shape: closures.ICRSCone, Direction: n.targets["south-1"], Radius: s1.Degree})
	third := n.opt.Length / 3
	base.Windows = append(base.Windows, closures.Window{Region: open, Open: true, From: n.start.UnixNano(), Until: n.start.Add(third).UnixNano()},
		closures.Window{Region: open, Open: true, From: n.start.Add(third + 2*time.Minute).UnixNano(), Until: covers.Until.UnixNano()})
	// Something moves past where north points.
	at, way := n.start.Add(n.lasting(2*time.Minute, n.opt.Length*3/4)), n.near("north-0", 0.2)
	side := way.Ortho()
	track := closures.Region{ID: "mover", Shape: closures.TrackCone, Radius: s1.Degree / 4}
	for i := -3; i <= 3; i++ {
		track.Points = append(track.Points, closures.AimPoint{At: at.Add(time.Duration(i) * 30 * time.Second).Truncate(time.Second), Direction: way.Add(side.Mul(float64(i) * 0.02)).Normalize()})
	}
	base.Windows = append(base.Windows, closures.Window{Region: int32(len(base.Regions)), From: track.Points[0].At.UnixNano(), Until: track.Points[6].At.UnixNano()})
	base.Regions = append(base.Regions, track)
	box := closures.Region{ID: "low", Shape: closures.HorizonBox, Box: geometry.Box{AzFrom: s1.Angle(n.uniform(0, 359)) * s1.Degree, ElFrom: 30 * s1.Degree, ElTo: 70 * s1.Degree}}
	box.Box.AzTo = s1.Angle(math.Mod(box.Box.AzFrom.Degrees()+60, 360)) * s1.Degree
	w := n.windows(int32(len(base.Regions)), covers)
	if len(w) == 0 {
		box.Throughout = closures.ThroughoutOpen
	}
	base.Regions, base.Windows = append(base.Regions, box), append(base.Windows, w...)

	tighter := base
	tighter.ID, tighter.Issued, tighter.Replaces = "2031-046-B", base.Issued.Add(time.Minute), []closures.ListID{base.ID}
	tighter.Windows = append(slices.Clone(base.Windows), n.windows(0, covers)...)
	looser := tighter
	looser.ID, looser.Issued, looser.Replaces = "2031-046-C", tighter.Issued.Add(time.Minute), []closures.ListID{tighter.ID}
	looser.Windows = slices.DeleteFunc(slices.Clone(tighter.Windows), func(w closures.Window) bool { return w.Region == 2 && !w.Open })
	looser.Regions = slices.Clone(tighter.Regions)
	looser.Regions[2].Throughout = closures.ThroughoutOpen
	last := base
	last.ID, last.Issued = "2031-046-D", looser.Issued.Add(time.Minute)
	survey := closures.ListText{
		ID: "S-9", Authority: "survey-office", Issued: base.Issued, Covers: covers, UnlistedOpen: true,
		Regions: []closures.Region{{ID: "plate", Shape: closures.ICRSCone, Direction: n.targets["south-2"], Radius: 2 * s1.Degree}},
		Windows: append(n.windows(0, covers), closures.Window{From: n.start.UnixNano(), Until: n.start.Add(time.Minute).UnixNano()}),
	}
	for _, t := range []*closures.ListText{&base, &tighter, &looser, &last, &survey} {
		if _, err := n.list(t); err != nil {
			return fmt.Errorf("list %s: %w", t.ID, err)
		}
	}
	n.at(n.start.Add(5*time.Second), n.brings(base.ID))
	n.at(n.start.Add(12*time.Second), n.confirms(base.ID))
	n.at(n.start.Add(n.lasting(0, n.opt.Length)), n.brings(survey.ID))
	if n.rng.IntN(4) > 0 {
		t := n.lasting(n.opt.Length/8, n.opt.Length/3)
		n.at(n.start.Add(t), n.brings(tighter.ID))
		if n.rng.IntN(3) > 0 {
			t += n.lasting(time.Minute, n.opt.Length/4)
			n.at(n.start.Add(t), n.brings(looser.ID))
			n.at(n.start.Add(t+n.lasting(5*time.Second, time.Minute)), n.confirms(looser.ID))
			if n.rng.IntN(2) == 0 {
				t += n.lasting(2*time.Minute, n.opt.Length/4)
				n.at(n.start.Add(t), n.withdraws(looser.ID))
				n.at(n.start.Add(t+30*time.Second), n.brings(last.ID))
				n.at(n.start.Add(t+50*time.Second), n.confirms(last.ID))
			}
		}
	}
	return nil
}
