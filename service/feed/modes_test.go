package feed

import (
	"context"
	"fmt"
	"io"
	"net"
	"path/filepath"
	"strings"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"

	"beamward/closures"
	"beamward/geometry/earth"
	"beamward/geometry/encounter"
	"beamward/service/feed/modes"

	"github.com/golang/geo/s1"
)

// An invented aircraft at 51.572 N 130.130 E, in both formats.
const evenFrame, oddFrame = "*8D26FB9958375261A2BFBA2D00C8;", "*8D26FB99583755CEF006A73C9E54;"

func decoderOptions() modes.Options {
	return modes.Options{Source: "rx-1", Motion: encounter.Civil(), PositionError: 2000, VelocityError: 30, ClimbError: 10,
		Site: earth.Position{Lat: 51 * s1.Degree, Lon: 130 * s1.Degree}}
}

// leap is the machine's clock with a boot time that a test moves on.
type leap struct {
	wallClock
	by atomic.Int64
}

func (l *leap) Boot() time.Duration { return l.wallClock.Boot() + time.Duration(l.by.Load()) }

// receiver is what a Mode S feed calls.
type receiver struct {
	net.Listener
	m     *ModeS
	in    *inbox
	told  *notices
	clock *leap
}

func startModeS(t *testing.T) *receiver {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	r := &receiver{Listener: l, in: newInbox(), told: &notices{}, clock: &leap{wallClock: newWallClock()}}
	r.m, err = NewModeS(ModeSOptions{Intake: r.in.take, Clock: r.clock, Notice: r.told.tell, Decoder: decoderOptions(), Dial: l.Addr().String(), Jitter: func() float64 { return 0 }})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- r.m.Run(ctx) }()
	t.Cleanup(func() {
		cancel()
		l.Close()
		if err := <-done; err != nil {
			t.Error(err)
		}
	})
	return r
}

func (r *receiver) accept(t *testing.T) net.Conn {
	t.Helper()
	c, err := r.Accept()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return c
}

// aircraft takes facts up to the next report of an aircraft, and tells whether
// reception was said to start again before it.
func (r *receiver) aircraft(t *testing.T) (seen closures.AircraftSeen, began bool) {
	t.Helper()
	for {
		switch f := r.in.next(t).body.(type) {
		case closures.AircraftSeen:
			return f, began
		case closures.Heard:
			began = began || f.Connected
		}
	}
}

func TestModeSFromAReceiver(t *testing.T) {
	r := startModeS(t)
	c := r.accept(t)
	say(t, c, "*0000;", "junk\r", evenFrame+"\r", oddFrame)
	if seen, began := r.aircraft(t); seen.Aircraft != "26fb99" || seen.Source != "rx-1" || !began || !seen.Located || seen.AltitudeFrom != closures.PressureAltitude {
		t.Errorf("%+v, began %v", seen, began)
	}
	c.Close() // it is called again
	c = r.accept(t)
	say(t, c, callOf(t), callOf(t))
	if seen, began := r.aircraft(t); seen.Aircraft != "484fde" || seen.Located || !began {
		t.Errorf("%+v, began %v", seen, began)
	}
	if s := r.m.Stats(); s.Refused != 1 || s.Connections != 2 || s.Lines != 6 {
		t.Errorf("%+v", s)
	}
	if told := r.told.text(); !strings.Contains(told, "not connected") {
		t.Errorf("told %s", told)
	}
}

// Frames that waited while the process stood still have no time that could be
// told: they are thrown away with the connection.
func TestModeSThrowsAwayWhatWaited(t *testing.T) {
	r := startModeS(t)
	c := r.accept(t)
	say(t, c, evenFrame)
	until(t, "it is decoded", func() bool { return r.m.Counts().Frames == 1 })
	r.clock.by.Add(int64(1500 * time.Millisecond))
	say(t, c, oddFrame)
	if _, err := io.ReadAll(c); err == nil || r.m.Counts().Frames == 1 {
		// Closed: with the bytes unread the peer is reset, or sees the end.
		c = r.accept(t)
		say(t, c, oddFrame)
		if seen, began := r.aircraft(t); seen.Aircraft != "26fb99" || !began {
			t.Errorf("%+v", seen)
		}
		return
	}
	t.Error("the connection lives")
}

// Proof of reception comes each second, with the messages of the last minute;
// a link that only lives says that; one of only bad lines says nothing.
func TestModeSTellsThatItHears(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		in := newInbox()
		m, err := NewModeS(ModeSOptions{Intake: in.take, Clock: newWallClock(), Decoder: decoderOptions(), Dial: "127.0.0.1:1"})
		if err != nil {
			t.Fatal(err)
		}
		f := m.frames("test")
		heard := func(lines ...string) []closures.Heard {
			for _, l := range lines {
				if err := f.take(t.Context(), []byte(l), false); err != nil {
					t.Fatal(err)
				}
			}
			var out []closures.Heard
			for {
				select {
				case h := <-in.got:
					if f, ok := h.body.(closures.Heard); ok {
						out = append(out, f)
					}
				default:
					return out
				}
			}
		}
		bad := strings.Replace(evenFrame, "8D26", "8D27", 1)
		if got := heard(bad, "junk", bad); len(got) != 0 {
			t.Errorf("%+v", got)
		}
		time.Sleep(time.Second)
		if got := heard("*0000;"); len(got) != 2 || !got[0].Connected || got[1].Scope != closures.HeardLink || got[1].Connected {
			t.Errorf("%+v", got)
		}
		call := callOf(t)
		for i := range 70 {
			time.Sleep(time.Second)
			got := heard(call, call)
			if len(got) != 1 || got[0].Scope != closures.HeardReception {
				t.Fatalf("%d: %+v", i, got)
			}
			// The second of two frames is counted with the next second's.
			if want := float64(min(2*i+1, 120)); got[0].MessagesPerMinute < want-2 || got[0].MessagesPerMinute > want {
				t.Fatalf("%d: %v a minute, want %v", i, got[0].MessagesPerMinute, want)
			}
		}
	})
}

// callOf is a DF 11 of right parity, sent unasked.
func callOf(t *testing.T) string {
	t.Helper()
	b := []byte{5 | 11<<3, 0x48, 0x4F, 0xDE, 0, 0, 0}
	f, _ := modes.NewFrame(b)
	r := f.Remainder()
	return fmt.Sprintf("*%X%06X;", b[:4], r)
}

// Frames that intake has no room for are dropped, not kept: their time is that
// of their reading.
func TestModeSDoesNotWait(t *testing.T) {
	in := newInbox()
	in.answer(errFull, 3)
	m, err := NewModeS(ModeSOptions{Intake: in.take, Clock: newWallClock(), Decoder: decoderOptions(), Dial: "127.0.0.1:1"})
	if err != nil {
		t.Fatal(err)
	}
	f := m.frames("test")
	for range 6 {
		if err := f.take(t.Context(), []byte(callOf(t)), false); err != nil {
			t.Fatal(err)
		}
	}
	if s := m.Stats(); s.Dropped == 0 || s.Waited != 0 {
		t.Errorf("%+v", s)
	}
}

func TestModeSFromAFile(t *testing.T) {
	in := newInbox()
	path := filepath.Join(t.TempDir(), "frames")
	add(t, path, evenFrame+"\n"+oddFrame+"\n")
	m, err := NewModeS(ModeSOptions{Intake: in.take, Clock: newWallClock(), Decoder: decoderOptions(), File: path})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- m.Run(ctx) }()
	defer func() {
		cancel()
		<-done
	}()
	until(t, "it is open", func() bool { return m.Stats().Open == 1 })
	in.none(t) // what is there is past
	add(t, path, evenFrame+"\n"+oddFrame+"\n")
	for {
		if f, ok := in.next(t).body.(closures.AircraftSeen); ok {
			if !f.Located || f.Aircraft != "26fb99" {
				t.Errorf("%+v", f)
			}
			return
		}
	}
}

// The pauses between calls double up to their bound, spread by the jitter, and
// start again after frames came.
func TestRedialBacksOff(t *testing.T) {
	j := 0.0
	m := &ModeS{options: ModeSOptions{Jitter: func() float64 { return j }}}
	for _, c := range []struct {
		failed int
		jitter float64
		want   time.Duration
	}{{0, 0, 250 * time.Millisecond}, {0, 0.999, 749500 * time.Microsecond}, {1, 0, 500 * time.Millisecond}, {5, 0, 8 * time.Second}, {6, 0, 15 * time.Second}, {1000, 0.5, 30 * time.Second},
		{0, -1, 500 * time.Millisecond}, {0, 1, 500 * time.Millisecond}, {0, nan, 500 * time.Millisecond}} {
		j = c.jitter
		if got := m.pause(c.failed); got != c.want {
			t.Errorf("%+v: %v", c, got)
		}
	}
	m.options.Jitter = nil
	if got := m.pause(0); got != redialFirst {
		t.Errorf("%v", got)
	}
}

func TestModeSOptionsThatCannotBe(t *testing.T) {
	good := ModeSOptions{Intake: newInbox().take, Clock: newWallClock(), Decoder: decoderOptions(), Dial: "127.0.0.1:1"}
	for name, change := range map[string]func(*ModeSOptions){
		"no way in": func(o *ModeSOptions) { o.Dial = "" },
		"two":       func(o *ModeSOptions) { o.File = "x" },
		"no source": func(o *ModeSOptions) { o.Decoder.Source = "" },
		"no bounds": func(o *ModeSOptions) { o.Decoder.PositionError = 0 },
		"no intake": func(o *ModeSOptions) { o.Intake = nil },
	} {
		o := good
		change(&o)
		if _, err := NewModeS(o); err == nil {
			t.Errorf("%s: made", name)
		}
	}
}
