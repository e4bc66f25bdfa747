package closures

import (
	"testing"
	"time"
)

func TestKnownIsACopyOfWhatIsKnown(t *testing.T) {
	r := siteRules()
	r.ByItself = AllCodes.Without(CodeInterlock)
	w := newWorld(t, r, openList(t))
	w.step(time.Second, ShutterSeen{Beam: "north", Said: w.at, Position: ShutterClosed}, WeatherSeen{Source: "mast", Said: w.at})
	k := w.s.Known(w.at)
	b := k.Beams[0]
	if b.Beam != "north" || b.AimUsed == nil || b.Aim.From != "encoder" || b.Shutter.Position != ShutterClosed || b.ShutterHeard != w.at {
		t.Errorf("beam: %+v", b)
	}
	if s := k.Sources[0]; s.Source != "catwalk" || s.Silent || !s.Receives || !s.Warm || !s.Interlock.Safe || s.Limit != 5*time.Second {
		t.Errorf("source: %+v", s)
	}
	v := w.s.DurableVersion()
	if _, same := w.s.Durable(); same != v {
		t.Errorf("version %d beside %d", v, same)
	}
	w.step(time.Second, InterlockSeen{Source: "catwalk", Said: w.at.Add(time.Second), Safe: false})
	if w.s.DurableVersion() == v {
		t.Error("a latch that needs a person now did not raise the version")
	}
	if k.Beams[0].Need != 0 || !k.Sources[0].Interlock.Safe {
		t.Error("a copy changed with the state")
	}
	if k := w.s.Known(w.at); !k.Beams[0].Need.Has(CodeInterlock) || k.Sources[0].Interlock.Safe {
		t.Errorf("the next copy does not know: %+v", k)
	}
}

func TestKnownAircraft(t *testing.T) {
	w := newWorld(t, soundRules())
	seen := AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "4b1803", Located: true, Position: w.r.Site.Position, AltitudeFrom: AboveEllipsoid, Speed: 100, Track: 0, Climb: 0}
	seen.Position.Height += 5000
	w.step(time.Second, seen, AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "4b1804"})
	k := w.s.Known(w.at)
	if len(k.Aircraft) != 2 {
		t.Fatalf("aircraft: %+v", k.Aircraft)
	}
	for _, a := range k.Aircraft {
		over := a.Aircraft == "4b1803"
		if a.Located != over || a.Inside != over || a.Source != "rx-1" || a.Heard != w.at {
			t.Errorf("%+v", a)
		}
	}
	if k.Popups != 1 {
		t.Errorf("%d popups, want the one overhead", k.Popups)
	}
}

// Traffic that passes by far away must not make what is durable be written
// again and again.
func TestDroppingAFarTrackKeepsTheVersion(t *testing.T) {
	w := newWorld(t, soundRules())
	far := AircraftSeen{Source: "rx-1", Said: w.at, Aircraft: "4b1803", Located: true, Position: w.r.Site.Position, AltitudeFrom: AboveEllipsoid, Speed: 100}
	far.Position.Lat += 80e3 / 6371e3 // beyond detection_range
	w.step(time.Second, far)
	v := w.s.DurableVersion()
	if k := w.s.Known(w.at); len(k.Aircraft) != 1 || k.Aircraft[0].Inside {
		t.Fatalf("aircraft: %+v", k.Aircraft)
	}
	w.step(2 * w.r.Aircraft.LostAfter)
	if k := w.s.Known(w.at); len(k.Aircraft) != 0 {
		t.Fatalf("not dropped: %+v", k.Aircraft)
	}
	if got := w.s.DurableVersion(); got != v {
		t.Errorf("version %d, was %d", got, v)
	}
}
