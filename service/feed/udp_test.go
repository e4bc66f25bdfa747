package feed

import (
	"context"
	"fmt"
	"net"
	"strings"
	"testing"

	"beamward/closures"
)

func startUDP(t *testing.T, in *inbox) (*UDP, net.Conn) {
	t.Helper()
	u, err := ListenUDP(UDPOptions{Options: Options{Bound: []Bound{{Name: "rx-1", Aircraft: true}}, Intake: in.take, Clock: newWallClock()}, Listen: "127.0.0.1:0"})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- u.Run(ctx) }()
	t.Cleanup(func() {
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	})
	c, err := net.Dial("udp", u.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return u, c
}

func TestUDPTakesLinesOfAircraft(t *testing.T) {
	in := newInbox()
	u, c := startUDP(t, in)
	fmt.Fprintf(c, "%s\n\n%s", aircraftLine("rx-1", "a1b2c3"), aircraftLine("rx-1", "a1b2c4"))
	if f, ok := in.next(t).body.(closures.Heard); !ok || !f.Connected {
		t.Errorf("got %+v", f)
	}
	for _, want := range []string{"a1b2c3", "a1b2c4"} {
		if f, ok := in.next(t).body.(closures.AircraftSeen); !ok || f.Aircraft != want {
			t.Errorf("got %+v", f)
		}
	}
	until(t, "all are counted", func() bool { return u.Stats().Accepted == 2 })
	if s := u.Stats(); s.Lines != 2 || s.Accepted != 2 || s.Open != 1 {
		t.Errorf("%+v", s)
	}
}

// BW-026: over UDP nothing that could open is taken, whatever it names.
func TestUDPTakesNothingElse(t *testing.T) {
	in := newInbox()
	u, c := startUDP(t, in)
	at := stamp(newWallClock().Wall())
	for _, line := range []string{
		interlockLine("rx-1"),
		fmt.Sprintf(`{"kind":"heard","source":"rx-1","at":%q,"scope":"reception","messages_per_min":100}`, at),
		fmt.Sprintf(`{"kind":"sighting","source":"rx-1","at":%q,"clear":true}`, at),
		fmt.Sprintf(`{"kind":"aim","beam":"rx-1","at":%q,"icrs":{"ra_deg":1,"dec_deg":2},"motion":"tracking"}`, at),
		aircraftLine("rx-2", "a1b2c3"),
		"\xff\xfe", "{}", strings.Repeat("x", 60000),
	} {
		fmt.Fprint(c, line)
	}
	until(t, "all are refused", func() bool { return u.Stats().Refused == 8 })
	in.none(t)
	for _, r := range u.Stats().Refusals[:3] {
		if !strings.Contains(r.Cause, "only reports of aircraft") {
			t.Errorf("%+v", r)
		}
	}
}

// A full intake costs facts, and they are counted; the word that reception
// starts again is not lost.
func TestUDPDropsWhenIntakeIsFull(t *testing.T) {
	in := newInbox()
	in.answer(errFull, 2)
	u, c := startUDP(t, in)
	for i := range 3 {
		fmt.Fprint(c, aircraftLine("rx-1", fmt.Sprint("a", i)))
	}
	if f, ok := in.next(t).body.(closures.Heard); !ok || !f.Connected {
		t.Errorf("got %+v", f)
	}
	if f, ok := in.next(t).body.(closures.AircraftSeen); !ok || f.Aircraft != "a2" {
		t.Errorf("got %+v", f)
	}
	if s := u.Stats(); s.Dropped != 2 || s.Refused != 0 {
		t.Errorf("%+v", s)
	}
}

func TestUDPIsForAircraftAlone(t *testing.T) {
	if _, err := ListenUDP(UDPOptions{Options: Options{Bound: []Bound{{Name: "catwalk"}}, Intake: newInbox().take, Clock: newWallClock()}, Listen: "127.0.0.1:0"}); err == nil {
		t.Error("made")
	}
}
