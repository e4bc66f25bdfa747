package closures

import (
	"testing"
	"time"

	"beamward/geometry/earth"
)

// A track that was lost inside the detection range outlives a restart with all
// of its reach: also when its last word gave no position, or its reports
// contradict each other.
func TestLostTracksOutliveARestart(t *testing.T) {
	r := busyRules()
	w := newWorld(t, r, openList(t))
	w.step(0, w.ridge(overheadICRS(t, r, evening, 330, 50)))
	w.mustOpen()
	frame := earth.FrameAt(r.Site.Position)
	beam := w.s.night(w.at).Horizon(w.dir, w.at)
	on := AircraftSeen{
		Source: "rx-1", Said: w.at, Aircraft: "4b1803", Located: true, Position: earth.FromECEF(frame.ECEF(beam.Mul(9000))),
		AltitudeFrom: AboveEllipsoid, Speed: 60, Climb: 0, Error: 50, VerticalError: 50, VelocityError: 3, VerticalVelError: 3,
	}
	elsewhere := on
	elsewhere.Position = earth.FromECEF(frame.ECEF(beam.Mul(9000).Add(beam.Ortho().Mul(30e3))))
	elsewhere.Said = w.at.Add(100 * time.Millisecond)
	mute := AircraftSeen{Source: "rx-1", Said: w.at.Add(200 * time.Millisecond), Aircraft: "4b1803"}
	w.step(100*time.Millisecond, on)
	w.step(100*time.Millisecond, elsewhere)
	d := w.step(100*time.Millisecond, mute)
	if d.Open || !d.Codes.Has(CodeAircraft) {
		t.Fatalf("not closed by the aircraft: %s", reasons(d))
	}
	kept, _ := w.s.Durable()
	if len(kept.Tracks) != 2 {
		t.Fatalf("%d reports are durable, want the two that count", len(kept.Tracks))
	}
	again, err := New(r, Boot{ID: "next", At: w.at}, kept)
	if err != nil {
		t.Fatal(err)
	}
	next := &world{t: t, s: again, r: r, at: w.at, seq: w.seq, dir: w.dir}
	var facts []Body
	for _, n := range w.s.Nights() {
		facts = append(facts, NightReady{n})
	}
	d = next.step(time.Second, append(facts, Started{})...)
	if !d.Codes.Has(CodeAircraft) {
		t.Errorf("after a restart the aircraft is forgotten: %s", reasons(d))
	}
}

// A drill can only close: it keeps no source alive, proves no reception, and
// takes no true aircraft's place.
func TestDrillsOnlyClose(t *testing.T) {
	r := busyRules()
	r.Sources[1].MinMessagesPerMin = 1
	w := newWorld(t, r, openList(t))
	w.step(0, w.ridge(overheadICRS(t, r, evening, 330, 50)))
	w.mustOpen()
	frame := earth.FrameAt(r.Site.Position)
	drill := AircraftSeen{
		Source: "rx-1", Aircraft: "4b1803", Located: true, Position: earth.FromECEF(frame.ECEF(w.s.night(w.at).Horizon(w.dir, w.at).Ortho().Mul(80e3))),
		AltitudeFrom: AboveEllipsoid, Speed: 60, Climb: 0, Error: 50, VerticalError: 50, VelocityError: 3, VerticalVelError: 3, Drill: true,
	}
	w.quiet = func(b Body) bool { h, is := b.(Heard); return is && h.Source == "rx-1" }
	var d Decision
	for range 150 {
		drill.Said = w.at
		d = w.step(100*time.Millisecond, drill)
	}
	if d.Open || !d.Codes.Has(CodeSourceSilent) {
		t.Errorf("drills keep a silent source alive: %s", reasons(d))
	}
	w.quiet = nil
	w.run(8 * time.Second)
	on := drill
	on.Drill, on.Said = false, w.at
	on.Position = earth.FromECEF(frame.ECEF(w.s.night(w.at).Horizon(w.dir, w.at).Mul(9000)))
	drill.Said = w.at.Add(50 * time.Millisecond)
	if d = w.step(100*time.Millisecond, on, drill); !d.Codes.Has(CodeAircraft) {
		t.Errorf("a drill takes a true aircraft's place: %s", reasons(d))
	}
	if n := len(w.s.Known(w.at).Aircraft); n != 2 {
		t.Errorf("%d tracks, want the drill's and the true one's", n)
	}
}
