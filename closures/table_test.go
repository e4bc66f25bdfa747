package closures

import (
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// The whole decision table: every code at each of its three verdicts, and all
// others clear, is 21 x 3 rows; all subsets of violated codes are 2^21. Only
// the row of all clear opens. BW-001
func TestDecisionTable(t *testing.T) {
	var all [NumCodes]Verdict
	for i := range all {
		all[i] = Clear
	}
	if !Fold(&all) {
		t.Fatal("all clear is shuttered")
	}
	for bits := uint32(1); bits < 1<<NumCodes; bits++ {
		v := all
		for c := 0; c < int(NumCodes); c++ {
			if bits&(1<<c) != 0 {
				v[c] = Verdict(bits>>3) % 2 // Unknown or Violated
			}
		}
		if Fold(&v) {
			t.Fatalf("open with %v", Codes(bits).Names())
		}
	}
	for c := range all {
		for bad := Verdict(0); bad < 8; bad++ { // also values that are none
			v := all
			v[c] = bad
			if Fold(&v) != (bad == Clear) {
				t.Errorf("%v at %d: open %v", Code(c), bad, Fold(&v))
			}
		}
	}
}

// busyRules have one of everything, so that each code has what makes it flip.
func busyRules() *Rules {
	r := siteRules()
	r.Beams[0].Limits.SunBelow = -12 * s1.Degree
	r.Aircraft = AircraftRules{
		Configured: true, KeepOutHalfAngle: 2 * s1.Degree, KeepOutRadius: 300, KeepOutCeiling: 20000,
		HorizontalAccel: 22, VerticalAccel: 4, SpeedMax: 350, ClimbMax: 30, Unlocated: UnlocatedShutter,
		LostAfter: time.Minute, WatchRange: 200e3, DetectionRange: 60e3,
	}
	r.Sources = append(r.Sources,
		SourceRules{ID: "rx-1", Kind: AircraftSource, StaleAfter: 10 * time.Second, Required: true, Latency: time.Second, WarmUp: time.Second, PositionError: 200, VerticalError: 100, VelocityError: 10, VerticalVelocityErr: 5},
		SourceRules{ID: "thermal-1", Kind: DetectorSource, StaleAfter: 5 * time.Second, Required: true},
		SourceRules{ID: "mast", Kind: WeatherSource, StaleAfter: 5 * time.Second, Required: true},
		SourceRules{ID: "spotter-east", Kind: SightingSource, StaleAfter: 15 * time.Minute},
	)
	r.Watches = []WatchRules{{Post: "east-lot", Minimum: 1, Shift: 4 * time.Hour, Required: true}}
	r.Neighbours = []NeighbourRules{{ID: "ridge-2", Offset: r3.Vector{X: 140, Y: -60, Z: 3}, Aperture: 8, Field: 0.3 * s1.Degree, StaleAfter: time.Hour, ForgetAfter: 2 * time.Hour}}
	return r
}

// ridge is where the neighbour points.
func (w *world) ridge(dir r3.Vector) AimSeen {
	return AimSeen{Telescope: "ridge-2", Said: w.at, From: "", Aim: &Aim{Frame: ICRS, Direction: dir, Reference: w.at, Motion: Tracking, Error: 10 * geometry.Arcsecond}, Exposing: Yes}
}

// dawn is the instant after evening at which the Sun's centre rises through an
// elevation.
func dawn(t *testing.T, el float64) time.Time {
	r := siteRules()
	for at := evening; ; at = at.Add(time.Second) {
		n, err := sky.Prepare(r.Site.Position, at, r.Site.UT1)
		if err != nil {
			t.Fatal(err)
		}
		if _, sun := geometry.ToHorizon(n.Sun(at)); sun.Degrees() > el {
			return at
		}
	}
}

// Each code flips the decision alone: from an open beam one fact, or the want
// of one, shutters it with that code and no other (but for the latch, which
// follows every closure). BW-002
func TestEachCodeFlipsAlone(t *testing.T) {
	at := func(w *world, d time.Duration) time.Time { return w.at.Add(d) }
	only := func(kind func(Body) bool) func(*world) []Body {
		return func(w *world) []Body { w.quiet = kind; return nil }
	}
	window := func(w *world) []Body {
		l, err := Index(&ListText{
			ID: "extra", Authority: "orbital-desk", Issued: w.at, Covers: span.Span{From: at(w, -time.Hour), Until: at(w, time.Hour)}, UnlistedOpen: true,
			Regions: []Region{{ID: "r", Shape: ICRSCone, Direction: w.dir, Radius: s1.Degree}},
			Windows: []Window{{Region: 0, From: at(w, 0).UnixNano(), Until: at(w, 10*time.Second).UnixNano()}}, Digest: Digest{2},
		})
		if err != nil {
			w.t.Fatal(err)
		}
		return []Body{ListOffered{List: l, By: "test"}}
	}
	plane := func(w *world) []Body {
		n := w.s.night(w.at)
		// An aircraft on the beam, 9 km up it.
		p := earth.FromECEF(earth.FrameAt(w.r.Site.Position).ECEF(n.Horizon(w.dir, w.at).Mul(9000)))
		return []Body{AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "abc123", Located: true, Position: p, AltitudeFrom: AboveEllipsoid, Speed: 200, Track: 0, Climb: 0, Error: 100, VerticalError: 50, VelocityError: 5, VerticalVelError: 3}}
	}
	nothing := func(*world) []Body { return nil }
	for _, c := range []struct {
		code  Code
		rules func(*Rules)
		start time.Time // zero: evening
		do    func(*world) []Body
		run   time.Duration // until it must be shuttered
	}{
		{code: CodeListedClosure, do: window},
		{code: CodeNotCovered, do: func(w *world) []Body {
			return []Body{ListWithdrawn{Authority: "orbital-desk", ID: "2031-045-A", By: "a"}}
		}},
		{code: CodeAircraft, do: plane},
		{code: CodeSighting, do: func(w *world) []Body {
			return []Body{Sighted{Source: "spotter-east", Said: w.at, For: time.Minute}}
		}},
		{code: CodeDetectorAlarm, do: func(w *world) []Body {
			return []Body{DetectorSeen{Source: "thermal-1", Said: w.at.Add(time.Millisecond), State: DetectorAlarm}}
		}},
		{code: CodeFieldCrossing, do: func(w *world) []Body { return []Body{w.ridge(w.dir)} }},
		{code: CodeHold, do: func(w *world) []Body {
			return []Body{HoldPlaced{ID: "h1", Beam: EveryBeam, By: "ana", Reason: "people on the roof", Placed: w.at}}
		}},
		{code: CodeInterlock, do: func(w *world) []Body {
			return []Body{InterlockSeen{Source: "catwalk", Said: w.at.Add(time.Millisecond)}}
		}},
		{code: CodeWatchMissing, do: func(w *world) []Body {
			return []Body{WatchKept{Post: "east-lot", Said: w.at.Add(time.Millisecond), Until: w.at}}
		}},
		{code: CodeElevationLimit, rules: func(r *Rules) { r.Beams[0].Limits.ElevationMax = 65.3 * s1.Degree }, do: nothing, run: 20 * time.Minute},
		{code: CodeDaylight, start: dawn(t, -12).Add(-time.Minute), do: nothing, run: 2 * time.Minute},
		{code: CodeAimUnknown, do: only(func(b Body) bool { _, is := b.(AimSeen); return is && b.(AimSeen).Beam != "" }), run: 4 * time.Second},
		{code: CodeSlewing, do: func(w *world) []Body {
			return []Body{AimSeen{Beam: "north", Said: w.at.Add(time.Millisecond), From: "encoder", Aim: &Aim{Frame: ICRS, Direction: w.dir, Reference: w.at, Motion: Slewing}}}
		}},
		{code: CodeSourceSilent, do: only(func(b Body) bool { h, is := b.(Heard); return is && h.Source == "mast" }), run: 6 * time.Second},
		{code: CodeClock, do: func(w *world) []Body { return []Body{ClockState{Synchronised: false}} }},
		{code: CodeRecord, do: func(w *world) []Body { return []Body{RecordState{Half: true}} }},
		{code: CodeShutterFault, do: func(w *world) []Body {
			return []Body{LaserSeen{Beam: "north", Said: w.at, Emitting: true}, ShutterSeen{Beam: "north", Said: w.at.Add(-2 * time.Second), Position: ShutterClosed}}
		}},
		{code: CodeFault, do: func(w *world) []Body { return []Body{Veto{Beam: "north"}} }},
	} {
		t.Run(c.code.String(), func(t *testing.T) {
			r := busyRules()
			if c.rules != nil {
				c.rules(r)
			}
			start := evening
			if !c.start.IsZero() {
				start = c.start
			}
			w := newWorldAt(t, r, start, openList(t))
			w.step(0, w.ridge(overheadICRS(t, r, start, 330, 50)))
			w.mustOpen()
			w.at = w.at.Add(100 * time.Millisecond)
			d := w.step(0, c.do(w)...)
			for waited := time.Duration(0); waited < c.run && d.Open; waited += 500 * time.Millisecond {
				d = w.step(500 * time.Millisecond)
			}
			if d.Open {
				t.Fatal("still open")
			}
			if got := d.Codes.Without(CodeReopening).Without(CodeRearm); got != Codes(0).With(c.code) {
				t.Errorf("shuttered by %v: %s", d.Codes.Names(), reasons(d))
			}
		})
	}
	t.Run("starting", func(t *testing.T) {
		w := newWorld(t, busyRules(), openList(t))
		if d := w.last[0]; !d.Codes.Has(CodeStarting) {
			t.Errorf("at the start: %v", d.Codes.Names())
		}
	})
	t.Run("reopening", func(t *testing.T) {
		w := newWorld(t, siteRules(), openList(t))
		w.mustOpen()
		w.step(100*time.Millisecond, Veto{Beam: "north"})
		if d := w.step(100 * time.Millisecond); d.Codes != Codes(0).With(CodeReopening) {
			t.Errorf("after a veto: %s", reasons(d))
		}
	})
	t.Run("rearm", func(t *testing.T) {
		r := siteRules()
		r.ByItself = AllCodes.Without(CodeFault)
		w := newWorld(t, r, openList(t))
		w.mustOpen()
		w.step(100*time.Millisecond, Veto{Beam: "north"})
		if d := w.run(10 * time.Second); d.Codes != Codes(0).With(CodeRearm) {
			t.Errorf("10 s after a veto: %s", reasons(d))
		}
		if d := w.step(100*time.Millisecond, Rearmed{Beam: "north", By: "ana"}); !d.Open {
			t.Errorf("after re-arming: %s", reasons(d))
		}
	})
}
