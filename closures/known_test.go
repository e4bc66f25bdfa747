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
