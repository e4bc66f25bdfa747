package recheck_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/span"
)

// anyAim is an aim of any frame near an azimuth and elevation.
func (w *world) anyAim(rng *rand.Rand) *closures.Aim {
	az, el := 360*rng.Float64(), 32+50*rng.Float64()
	d := geometry.FromHorizon(s1.Angle(az)*s1.Degree, s1.Angle(el)*s1.Degree)
	star := w.night.ICRS(d, w.at)
	a := &closures.Aim{Frame: closures.ICRS, Direction: star, Reference: w.at, Error: 5 * geometry.Arcsecond, Motion: closures.Tracking}
	switch rng.IntN(7) {
	case 0:
		a.RateRA, a.RateDec = rng.NormFloat64()*1e-6, rng.NormFloat64()*1e-6
	case 1:
		a.PMRA, a.PMDec = rng.NormFloat64()*1e-5, rng.NormFloat64()*1e-5
	case 2:
		a.Frame, a.Direction, a.Motion = closures.Horizon, d, closures.Fixed
	case 3:
		a.Frame, a.Direction, a.Refracted = closures.Horizon, d, true // tracking: made fixed to the stars
	case 4:
		a.Frame, a.Direction, a.Motion = closures.Horizon, d, closures.Parked
	case 5:
		a.Frame = closures.OfDate
	case 6:
		a.Frame, a.Reference = closures.Table, time.Time{}
		for i := range 5 {
			v := star.Add(r3.Vector{X: 0.002 * float64(i) * rng.Float64()}).Normalize()
			a.Points = append(a.Points, closures.AimPoint{At: w.at.Add(time.Duration(i-1) * 10 * time.Minute), Direction: v})
		}
	}
	return a
}

// anyList says something about the sky near an aim, or far from it.
func (w *world) anyList(rng *rand.Rand, name string) *closures.List {
	toward := w.night.ICRS(geometry.FromHorizon(s1.Angle(6.28*rng.Float64()), s1.Angle(0.6+0.8*rng.Float64())), w.at)
	if d, _, ok := w.aim.InSky(w.night, w.at); ok && rng.IntN(3) > 0 {
		toward = d
	}
	text := closures.ListText{ID: closures.ListID(name), UnlistedOpen: rng.IntN(4) > 0, Digest: closures.Digest{byte(rng.IntN(256)), byte(rng.IntN(256))}}
	text.Covers = span.Span{From: w.at.Add(-time.Duration(rng.IntN(7200)) * time.Second), Until: w.at.Add(time.Duration(30+rng.IntN(3600)) * time.Second)}
	if !text.UnlistedOpen {
		text.Regions = append(text.Regions, closures.Region{ID: "dome", Shape: closures.WholeSky, Throughout: closures.ThroughoutOpen})
	}
	for i := range 1 + rng.IntN(4) {
		r := closures.Region{ID: fmt.Sprint("r", i), Shape: closures.ICRSCone, Radius: s1.Angle(0.02+2*rng.Float64()) * s1.Degree}
		off := r.Radius.Radians() * 2 * rng.Float64()
		if rng.IntN(3) == 0 { // at the edge, errors and all
			off = r.Radius.Radians() + (rng.Float64()-0.3)*1e-3
		}
		r.Direction = toward.Add(toward.Ortho().Mul(math.Tan(off))).Normalize()
		switch rng.IntN(6) {
		case 0:
			az, el := geometry.ToHorizon(w.night.Horizon(r.Direction, w.at))
			side := s1.Angle(0.01 + 0.2*rng.Float64())
			r.Shape, r.Observed = closures.HorizonBox, rng.IntN(2) == 0
			r.Box = geometry.Box{AzFrom: mod(az - side), AzTo: mod(az + side), ElFrom: el - side/2, ElTo: min(el+side/3, math.Pi/2)}
		case 1:
			r.Shape = closures.TrackCone
			for j := range 3 {
				r.Points = append(r.Points, closures.AimPoint{At: w.at.Add(time.Duration(j-1) * 15 * time.Minute), Direction: r.Direction.Add(r3.Vector{Y: 0.01 * float64(j)}).Normalize()})
			}
		}
		open := rng.IntN(3) == 0
		n := rng.IntN(4)
		if n == 0 {
			r.Throughout = closures.ThroughoutOpen
		}
		for range n {
			from := w.at.Add(time.Duration(rng.IntN(400)-60) * time.Second)
			long := time.Duration(1+rng.IntN(60)) * time.Second
			if open {
				from, long = w.at.Add(-time.Minute+time.Duration(rng.IntN(60))*time.Second), time.Duration(1+rng.IntN(600))*time.Second
			}
			if from.Before(text.Covers.Until) && from.Add(long).After(text.Covers.From) {
				text.Windows = append(text.Windows, closures.Window{Region: int32(len(text.Regions)), Open: open, From: from.UnixNano(), Until: from.Add(long).UnixNano()})
			} else {
				r.Throughout = closures.ThroughoutOpen
			}
		}
		for j := range text.Windows {
			if text.Windows[j].Region == int32(len(text.Regions)) {
				r.Throughout = closures.NotThroughout
			}
		}
		text.Regions = append(text.Regions, r)
	}
	return index(w.t, text)
}

func mod(a s1.Angle) s1.Angle { return s1.Angle(math.Mod(a.Radians()+4*math.Pi, 2*math.Pi)) }

// In ordinary use the second opinion agrees with every open decision: random
// aims of every frame, lists of every shape, holds, aircraft about the beam and
// the edges of the limits, each at the edges of its closures.
func TestNeverVetoesFalsely(t *testing.T) {
	stories := uint64(60)
	if os.Getenv("BEAMWARD_LONG") != "" {
		stories = 2000
	}
	opened := 0
	for seed := range stories {
		rng := rand.New(rand.NewPCG(seed, 3))
		r := busyRules()
		r.Neighbours[0].Field = s1.Angle(3*rng.Float64()) * s1.Degree
		w := newWorld(t, r, evening.Add(time.Duration(rng.Int64N(int64(20*time.Hour)))), openList(t))
		w.aim = w.anyAim(rng)
		frame := earth.FrameAt(r.Site.Position)
		var facts []closures.Body
		for i := range rng.IntN(3) {
			facts = append(facts, closures.ListOffered{List: w.anyList(rng, fmt.Sprint("l", i)), By: "test"})
		}
		if rng.IntN(3) == 0 {
			facts = append(facts, closures.HoldPlaced{ID: "h", Beam: "north", By: "ana", Placed: w.at, From: w.at.Add(time.Duration(rng.IntN(60)) * time.Second), Until: w.at.Add(90 * time.Second), Region: &w.anyList(rng, "h").Text().Regions[0]})
		}
		if rng.IntN(4) == 0 {
			w.ridge = w.anyAim(rng)
		}
		p := geometry.FromHorizon(s1.Angle(6.28*rng.Float64()), s1.Angle(0.5)).Mul(8e3 + 30e3*rng.Float64())
		course, speed := s1.Angle(6.28*rng.Float64()), 60+280*rng.Float64()
		for i := range 250 {
			step := 100 * time.Millisecond
			switch {
			case i%5 == 1:
				step = time.Duration(rng.Int64N(int64(3 * time.Second / 2)))
			case i == 200: // the sky moves on
				w.step(1900 * time.Millisecond)
				w.at = w.at.Add(time.Duration(rng.IntN(1800)) * time.Second)
			}
			p = p.Add(r3.Vector{X: speed * math.Sin(course.Radians()), Y: speed * math.Cos(course.Radians())}.Mul(step.Seconds()))
			if i%8 == 0 && seed%3 > 0 {
				s := closures.AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "abc123", Located: true, Position: earth.FromECEF(frame.ECEF(p)), AltitudeFrom: closures.AltitudeFrom(rng.IntN(4)),
					Speed: geometry.Speed(speed), Track: course, Climb: 0, Error: 50, VerticalError: 50, VelocityError: 5, VerticalVelError: 5}
				facts = append(facts, s)
			}
			w.step(step, facts...)
			facts = nil
		}
		opened += w.opened
	}
	t.Logf("%d open decisions in %d stories", opened, stories)
	if opened < 50*int(stories)/10 {
		t.Errorf("only %d open decisions: nothing was shown", opened)
	}
}

// A whole night at the pace of a decision a second, with a target after
// another, is open whenever it was decided to be.
func TestAgreesThroughANight(t *testing.T) {
	r := busyRules()
	start := time.Date(2031, 2, 13, 18, 0, 0, 0, time.UTC)
	w := newWorld(t, r, start, index(t, closures.ListText{ID: "all", UnlistedOpen: true, Covers: span.Span{From: start.Add(-time.Hour), Until: start.Add(13 * time.Hour)}}))
	rng := rand.New(rand.NewPCG(1, 9))
	for i := range 14 * 900 {
		if i%600 == 0 {
			w.night = prepare(t, r, w.at)
			w.aim = icrs(t, r, w.at, 360*rng.Float64(), 28+62*rng.Float64())
			w.step(0, closures.NightReady{Night: w.night})
		}
		w.step(4 * time.Second)
		w.step(time.Second)
	}
	t.Logf("%d open decisions", w.opened)
	if w.opened < 300 {
		t.Error("hardly ever open")
	}
}
