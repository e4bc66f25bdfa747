package feed

import (
	"context"
	"encoding/hex"
	"math"
	"net"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry/encounter"
	"beamward/service/feed/asterix"
	"beamward/service/feed/modes"
)

func asterixOptions() asterix.Options {
	return asterix.Options{Source: "net-1", Edition: "2.4", Motion: encounter.Civil(), PositionError: 2000, VelocityError: 30, ClimbError: 10}
}

// fixedClock tells one wall time.
type fixedClock struct {
	wallClock
	at time.Time
}

func (f fixedClock) Wall() time.Time { return f.at }

// The published block of hpuhr/jASTERIX, src/test/test_cat021_2.1.cpp.
const publishedBlock = "150031f51b7b438200030108055f00214fba08bee11a4b65416f71416f3c15b80e020e46057800416f9115a4f1d1a22004"

func TestAsterixOverUDP(t *testing.T) {
	in := newInbox()
	a, err := ListenAsterix(AsterixOptions{Intake: in.take, Clock: fixedClock{newWallClock(), time.Date(2031, 2, 14, 9, 18, 24, 0, time.UTC)}, Decoder: asterixOptions(), Listen: "127.0.0.1:0"})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- a.Run(ctx) }()
	defer func() {
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	}()
	c, err := net.Dial("udp", a.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	b, err := hex.DecodeString(publishedBlock)
	if err != nil {
		t.Fatal(err)
	}
	c.Write(b[:40])
	until(t, "it is refused", func() bool { return a.Stats().Refused == 1 })
	c.Write(b)
	c.Write(b)
	if h := in.next(t); h.from != "net-1" {
		t.Errorf("%+v", h)
	} else if f, ok := h.body.(closures.Heard); !ok || !f.Connected {
		t.Errorf("%+v", h)
	}
	for range 2 {
		if f, ok := in.next(t).body.(closures.AircraftSeen); !ok || f.Aircraft != "1a4b65" || !f.Located || f.Source != "net-1" {
			t.Errorf("%+v", f)
		}
	}
	if n := a.Counts(); n.Blocks != 2 || n.BadBlocks != 1 || n.Records != 2 {
		t.Errorf("%+v", n)
	}
	until(t, "both are counted", func() bool { return a.Stats().Accepted == 2 })
	if got := a.Callsigns(); got["1a4b65"] != "EZS14ZH" {
		t.Errorf("%v", got)
	}
}

func TestAsterixOptionsThatCannotBe(t *testing.T) {
	good := AsterixOptions{Intake: newInbox().take, Clock: newWallClock(), Decoder: asterixOptions(), Listen: "127.0.0.1:0"}
	for name, change := range map[string]func(*AsterixOptions){
		"no source":  func(o *AsterixOptions) { o.Decoder.Source = "" },
		"no edition": func(o *AsterixOptions) { o.Decoder.Edition = "1.0" },
		"no intake":  func(o *AsterixOptions) { o.Intake = nil },
		"no address": func(o *AsterixOptions) { o.Listen = "nowhere:x:" },
	} {
		o := good
		change(&o)
		if _, err := ListenAsterix(o); err == nil {
			t.Errorf("%s: made", name)
		}
	}
}

// What an aircraft states of its quality means the same by either way: the
// tables stand in both decoders, since neither may know the other.
func TestBothDecodersGiveOneBound(t *testing.T) {
	const version, sil, stepM, slackM = 2, 3, 6.0, 6.0
	// NIC of the type codes without supplements.
	for tc, nic := range map[byte]byte{9: 11, 10: 10, 12: 7, 14: 5, 15: 4, 17: 1} {
		for nacp := range byte(12) {
			d, err := modes.NewDecoder(decoderOptions())
			if err != nil {
				t.Fatal(err)
			}
			at := time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC)
			squitter := func(me [7]byte) (closures.AircraftSeen, bool) {
				f, _ := modes.NewFrame(append([]byte{17<<3 | 5, 0xA0, 0xB1, 0xC2}, append(me[:], 0, 0, 0)...))
				r := f.Remainder()
				f, _ = modes.NewFrame(append([]byte{17<<3 | 5, 0xA0, 0xB1, 0xC2}, append(me[:], byte(r>>16), byte(r>>8), byte(r))...))
				return d.Decode(&f, at)
			}
			squitter([7]byte{31 << 3, 0, 0, 0, 0, version<<5 | nacp, sil << 4})
			// The position of the published pair above, in both formats.
			even, _ := hex.DecodeString(evenFrame[9:23])
			odd, _ := hex.DecodeString(oddFrame[9:23])
			even[0], odd[0] = tc<<3|even[0]&7, tc<<3|odd[0]&7
			squitter([7]byte(even))
			seen, ok := squitter([7]byte(odd))
			if !ok || !seen.Located {
				t.Fatalf("TC %d: %+v", tc, seen)
			}
			other, err := asterix.NewDecoder(asterixOptions())
			if err != nil {
				t.Fatal(err)
			}
			// 010, 131, 080, 073, 090, 210.
			block := []byte{21, 0, 0, 0x83, 0x19, 0x30, 0, 1}
			block = append(block, 0, 0, 0, 0, 0, 0, 0, 0, 0xA0, 0xB1, 0xC2, 0x15, 0x18, 0x00, nic<<1|1, sil<<5|nacp<<1, version<<3|2)
			block[2] = byte(len(block))
			out, err := other.Datagram(block, at, nil)
			if err != nil || len(out) != 1 {
				t.Fatalf("%+v, %v", out, err)
			}
			if a, b := float64(seen.Error)-stepM, float64(out[0].Error); math.Abs(a-b) > slackM {
				t.Errorf("NIC %d, NACp %d: %v m and %v m", nic, nacp, a, b)
			}
		}
	}
}
