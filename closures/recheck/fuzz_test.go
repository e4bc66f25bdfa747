package recheck

import (
	"encoding/binary"
	"math"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/span"
)

// bytes deals out a fuzzer's bytes as values of every kind, wild ones too.
type bytes struct{ b []byte }

func (s *bytes) u64() uint64 {
	var w [8]byte
	n := copy(w[:], s.b)
	s.b = s.b[n:]
	return binary.LittleEndian.Uint64(w[:])
}

func (s *bytes) pick(n int) int { return int(s.u64()>>7) & 0xffff % max(n, 1) }

func (s *bytes) number() float64 {
	switch s.pick(6) {
	case 0:
		return math.Float64frombits(s.u64())
	case 1:
		return math.NaN()
	case 2:
		return math.Inf(s.pick(3) - 1)
	}
	return float64(int64(s.u64())>>44) * 1e-5
}

func (s *bytes) time() time.Time {
	switch s.pick(8) {
	case 0:
		return time.Time{}
	case 1:
		return time.Unix(int64(s.u64()), 0)
	}
	return time.Unix(1928800000+int64(s.pick(400))-200, 0)
}

func (s *bytes) span() time.Duration { return time.Duration(int64(s.u64()) >> (20 + 8*s.pick(4))) }

func (s *bytes) vector() r3.Vector {
	v := r3.Vector{X: s.number(), Y: s.number(), Z: s.number()}
	if s.pick(4) > 0 && v.Norm() > 0 {
		return v.Normalize()
	}
	return v
}

func (s *bytes) aim() *closures.Aim {
	if s.pick(9) == 0 {
		return nil
	}
	a := &closures.Aim{Frame: closures.AimFrame(s.pick(6)), Direction: s.vector(), Reference: s.time(), Error: s1.Angle(s.number()), Motion: closures.Motion(1 + s.pick(5)), Refracted: s.pick(2) == 0}
	if s.pick(2) == 0 {
		a.RateRA, a.RateDec, a.PMRA, a.PMDec = s.number(), s.number(), s.number(), s.number()
	}
	for range s.pick(4) {
		a.Points = append(a.Points, closures.AimPoint{At: s.time(), Direction: s.vector()})
	}
	return a
}

func (s *bytes) region() closures.Region {
	r := closures.Region{ID: "r", Shape: closures.Shape(s.pick(6)), Direction: s.vector(), Radius: s1.Angle(s.number()), Throughout: closures.Throughout(s.pick(3)), Observed: s.pick(2) == 0,
		Box: geometry.Box{AzFrom: s1.Angle(s.number()), AzTo: s1.Angle(s.number()), ElFrom: s1.Angle(s.number()), ElTo: s1.Angle(s.number())}}
	for range s.pick(4) {
		r.Points = append(r.Points, closures.AimPoint{At: s.time(), Direction: s.vector()})
	}
	return r
}

// No value of any field makes a look panic, nor a shuttered decision vetoed.
func FuzzCheck(f *testing.F) {
	for i := range 12 {
		seed := make([]byte, 600)
		for j := range seed {
			seed[j] = byte(j*(i*7+3) + i)
		}
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		s := &bytes{data}
		at := time.Unix(1928800000, 0).UTC()
		rules := &closures.Rules{Permit: closures.PermitRules{Lease: 2 * time.Second, ConsumerClockError: s.span()}}
		rules.Site.Position.Lat, rules.Site.Position.Lon, rules.Site.Position.Height = s1.Angle(s.number()), s1.Angle(s.number()), geometry.Length(s.number())
		rules.Beams = []closures.BeamRules{{ID: "b", ShutterTime: time.Second, Asterism: s1.Angle(s.number()), Launches: []closures.Launch{{Offset: s.vector()}},
			Limits: closures.Limits{ElevationMin: s1.Angle(s.number()), ElevationMax: s1.Angle(s.number()), SunBelow: s1.Angle(s.number())}, Aim: closures.AimRules{StaleAfter: time.Hour, Error: s1.Angle(s.number())}}}
		rules.Authorities = []closures.AuthorityRules{{ID: "a", Required: s.pick(2) == 0, Lead: s.span(), Tail: s.span()}}
		rules.Neighbours = []closures.NeighbourRules{{ID: "n", Offset: s.vector(), Field: s1.Angle(s.number()), StaleAfter: time.Hour, IgnoreSilent: s.pick(2) == 0}}
		rules.Aircraft = closures.AircraftRules{Configured: true, KeepOutHalfAngle: s1.Angle(s.number()), KeepOutRadius: geometry.Length(s.number()), KeepOutCeiling: geometry.Length(s.number()), SpeedMax: 350, ClimbMax: 30, Unlocated: closures.UnlocatedAlarm}
		used := s.aim()
		said := used
		if s.pick(3) == 0 {
			said = s.aim()
		}
		k := &closures.Known{At: at, Beams: []closures.BeamKnown{{Beam: "b", AimUsed: used, Aim: closures.AimSeen{Beam: "b", Said: at, Aim: said}, AimHeard: at}}}
		for range s.pick(4) {
			seen := closures.AircraftSeen{Said: s.time(), Located: s.pick(4) > 0, Speed: geometry.Speed(s.number()), Track: s1.Angle(s.number()), Climb: geometry.Speed(s.number()), AltitudeFrom: closures.AltitudeFrom(s.pick(5))}
			seen.Position.Lat, seen.Position.Lon, seen.Position.Height = s1.Angle(s.number()), s1.Angle(s.number()), geometry.Length(s.number())
			k.Aircraft = append(k.Aircraft, closures.AircraftKnown{Seen: seen, Located: true})
		}
		if s.pick(2) == 0 {
			k.Sightings = []closures.Sighted{{Said: s.time(), HasDirection: true, Direction: s.vector(), Spread: s1.Angle(s.number()), For: s.span()}}
		}
		fs := &closures.Foreseen{Rules: rules, Pointings: []closures.Pointing{{Telescope: "n", Aim: s.aim(), Heard: s.time()}}}
		if s.pick(2) == 0 {
			r := s.region()
			fs.Holds = []closures.HoldPlaced{{ID: "h", Beam: "*", From: s.time(), Until: s.time(), Region: &r}}
		}
		for i := range s.pick(3) {
			text := &closures.ListText{ID: closures.ListID('a' + rune(i)), Authority: "a", Issued: at, UnlistedOpen: s.pick(2) == 0, Covers: span.Span{From: at.Add(-time.Hour), Until: at.Add(time.Hour)}}
			for j := range 1 + s.pick(3) {
				r := s.region()
				r.ID += string('a' + rune(j))
				text.Regions = append(text.Regions, r)
				if r.Throughout == closures.NotThroughout {
					from := s.time().UnixNano()
					text.Windows = append(text.Windows, closures.Window{Region: int32(j), Open: s.pick(2) == 0, From: from, Until: from + int64(s.span())})
				}
			}
			if l, err := closures.Index(text); err == nil {
				fs.Lists = append(fs.Lists, closures.Listed{List: l})
			} else if s.pick(9) == 0 {
				fs.Lists = append(fs.Lists, closures.Listed{})
			}
		}
		d := &closures.Decision{Beam: "b", At: at, Open: true}
		if s.pick(2) == 0 {
			d.OpenUntil, d.ClosesAt = s.time(), s.time()
		}
		var c Checker
		_ = c.judge(d, k, fs, rules, at)
		_ = c.judge(d, k, fs, rules, at) // from memory
		a, first := c.Check(d, k, fs, rules, at)
		if b, again := Check(d, k, fs, rules, at); a != b || first != again {
			t.Fatalf("what is kept changes the answer: %v %v, %v %v", a, first, b, again)
		}
		d.Open = false
		if _, vetoed := c.Check(d, k, fs, rules, at); vetoed {
			t.Fatal("a shuttered decision is vetoed")
		}
	})
}

// A mistake in the asking is a veto, and so is a panic.
func TestFailsShuttered(t *testing.T) {
	d := &closures.Decision{Open: true}
	if _, vetoed := Check(d, nil, nil, nil, time.Time{}); !vetoed {
		t.Error("nothing given, and no veto")
	}
	if _, vetoed := Check(nil, nil, nil, nil, time.Time{}); vetoed {
		t.Error("no decision, and a veto")
	}
	rules := &closures.Rules{Permit: closures.PermitRules{Lease: 1}, Beams: []closures.BeamRules{{ShutterTime: 1, Aim: closures.AimRules{StaleAfter: 1}}}, Authorities: []closures.AuthorityRules{{Required: true}}}
	k := &closures.Known{Beams: []closures.BeamKnown{{AimUsed: &closures.Aim{Frame: closures.Horizon, Direction: r3.Vector{Z: 1}, Motion: closures.Fixed}, AimHeard: time.Unix(0, 0), Aim: closures.AimSeen{Said: time.Unix(0, 0)}}}}
	k.At, d.At = time.Unix(0, 0), time.Unix(0, 0)
	k.Beams[0].Aim.Aim = k.Beams[0].AimUsed
	f := &closures.Foreseen{Rules: rules, Lists: []closures.Listed{{List: &closures.List{}}}} // a list with nothing in it panics
	if v, vetoed := Check(d, k, f, rules, d.At); !vetoed || v.Detail != "second opinion: it failed" {
		t.Errorf("veto %v %q", vetoed, v.Detail)
	}
}
