package asterix

import (
	"encoding/hex"
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/encounter"
)

func octets(t testing.TB, text string) []byte {
	t.Helper()
	b, err := hex.DecodeString(strings.ReplaceAll(text, " ", ""))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// The records that open decoders publish with their tests: A by
// hpuhr/jASTERIX, src/test/test_cat021_2.1.cpp (edition 2.1), a whole block; B
// by mokhtarimokhtar/goasterix, a record alone.
const (
	blockA  = "150031f51b7b438200030108055f00214fba08bee11a4b65416f71416f3c15b80e020e46057800416f9115a4f1d1a22004"
	recordB = "c51d3101432304 0001 0140 2bb73efa65ba 000001 384176 3adab9f5 00 02 00 08 cb 540d0d0d 0508f00162"
)

func blockOf(records ...[]byte) []byte {
	b := []byte{category, 0, 0}
	for _, r := range records {
		b = append(b, r...)
	}
	b[1], b[2] = byte(len(b)>>8), byte(len(b))
	return b
}

func options() Options {
	return Options{Source: "net-1", Edition: "2.4", Geoid: 18, Motion: encounter.Civil(), PositionError: 2000, VelocityError: 30, ClimbError: 10}
}

func newDecoder(t testing.TB) *Decoder {
	t.Helper()
	d, err := NewDecoder(options())
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func same(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.17g, want %.17g", what, got, want)
	}
}

func TestPublishedRecordA(t *testing.T) {
	b := octets(t, blockA)
	if len(b) != 49 {
		t.Fatalf("%d octets", len(b))
	}
	r, n, err := readRecord(b[3:])
	if err != nil || n != 46 {
		t.Fatalf("%d octets, %v", n, err)
	}
	if r.SAC != 0 || r.SIC != 3 || r.Track != 1375 || !r.HasTrack || r.Address != 0x1A4B65 || !r.HasAddress || r.NACv != 0 || r.NIC != 7 || !r.HasQuality || r.HasNACp ||
		r.Version != 0 || !r.HasVersion || r.Mode3A != 0o7106 || r.Callsign != "EZS14ZH " || r.Ground || r.Simulated || r.Test || r.AddressType != 0 {
		t.Errorf("%+v", r)
	}
	same(t, "latitude", r.LatDeg, 46.844201087951660, 1e-15*64)
	same(t, "longitude", r.LonDeg, 12.298529148101807, 1e-15*16)
	same(t, "time of reception of the position", r.PositionReceivedAt, 33502.8828125, 0)
	same(t, "time of reception of the velocity", r.VelocityReceivedAt, 33502.46875, 0)
	same(t, "time of sending", r.SentAt, 33503.1328125, 0)
	same(t, "geometric height", r.GeometricFt, 34750, 0)
	same(t, "flight level", r.FlightLevel, 350, 0)
	same(t, "service period", r.ServicePeriod, 2, 0)

	received := time.Date(2031, 2, 14, 9, 18, 24, 0, time.UTC)
	seen, err := newDecoder(t).Datagram(b, received, nil)
	if err != nil || len(seen) != 1 {
		t.Fatalf("%v, %v", seen, err)
	}
	s := seen[0]
	if s.Aircraft != "1a4b65" || s.Source != "net-1" || !s.Located || !s.Said.Equal(time.Date(2031, 2, 14, 9, 18, 22, 882812500, time.UTC)) || s.AltitudeFrom != closures.PressureAltitude || s.OnGround || s.Drill {
		t.Errorf("%+v", s)
	}
	same(t, "height", float64(s.Position.Height), 35000*0.3048, 1e-9)
	same(t, "error", float64(s.Error), 185*math.Sqrt(7.0/3)+180.0/(1<<23)*metreDegree+350.0/128, 1e-9) // NUCp 7
	if !math.IsNaN(float64(s.Speed)) || !math.IsNaN(float64(s.Climb)) || !math.IsNaN(float64(s.VerticalError)) {
		t.Errorf("%+v", s)
	}
}

func TestPublishedRecordB(t *testing.T) {
	b := octets(t, recordB)
	r, n, err := readRecord(b)
	if err != nil || n != len(b) {
		t.Fatalf("%d octets of %d, %v", n, len(b), err)
	}
	if r.SAC != 0 || r.SIC != 1 || r.Address != 1 || r.NIC != 0 || r.NACv != 0 || r.Version != 0 {
		t.Errorf("%+v", r)
	}
	// The raw values are 2864958 and -367174.
	same(t, "latitude", r.LatDeg, 61.47532939910889, 1e-13)
	same(t, "longitude", r.LonDeg, -7.87869930267334, 1e-13)
	same(t, "time of reception of the position", r.PositionReceivedAt, 28802.9195999996736646, 1e-11) // 28802.921875, made finer
	same(t, "service period", r.ServicePeriod, 4, 0)
	same(t, "amplitude", r.AmplitudeDBm, -53, 0)
	for i, age := range r.Ages {
		switch i {
		case ageTargetDescriptor, ageQuality, ageAmplitude:
			same(t, "age", age, 1.3, 1e-12)
		default:
			if !math.IsNaN(age) {
				t.Errorf("age %d: %v", i, age)
			}
		}
	}
	seen, err := newDecoder(t).Datagram(blockOf(b, b), time.Date(2031, 2, 14, 8, 0, 4, 0, time.UTC), nil)
	if err != nil || len(seen) != 2 || seen[1].Aircraft != "000001" || !seen[1].Located || seen[1].AltitudeFrom != closures.NoAltitude || !(seen[1].Error >= 2000) {
		t.Errorf("%+v, %v", seen, err)
	}
}

// make21 builds a record from its items.
func make21(items map[item][]byte) []byte {
	var fspec [7]byte
	var data []byte
	last := 0
	for i, l := range profile {
		b, has := items[l.item]
		if !has || l.rule == none || l.item == 0 {
			continue
		}
		fspec[i/7] |= 0x80 >> (i % 7)
		data = append(data, b...)
		last = i / 7
	}
	for i := range last {
		fspec[i] |= 1
	}
	return append(fspec[:last+1:last+1], data...)
}

func number(v int64, n int) []byte {
	b := make([]byte, n)
	for i := range b {
		b[n-1-i] = byte(v >> (8 * i))
	}
	return b
}

func daytimeOf(s float64) []byte { return number(int64(math.Round(s*128)), 3) }

// plane is a whole record of edition 2.4 with fine items.
func plane() map[item][]byte {
	return map[item][]byte{
		10: {1, 2}, 40: {0}, 80: {0xA0, 0xB1, 0xC2}, 71: daytimeOf(3600), 72: daytimeOf(3600.25), 77: daytimeOf(3600.5),
		131: append(number(int64(math.Round(-31.2/180*(1<<30))), 4), number(int64(math.Round(-4.1/180*(1<<30))), 4)...),
		140: number(5000, 2), 145: number(1200, 2), 90: {2<<5 | 8<<1 | 1, 3<<5 | 9<<1 | 1, 2 << 1}, 210: {2<<3 | 2},
		160: append(number(1000, 2), number(1<<14, 2)...), 155: number(-160&0x7FFF, 2), 157: number(160, 2),
		170: {0x15, 0xa4, 0xf1, 0xd1, 0xa2, 0x20},
		295: {0x02 | 1, 0x02 | 1, 0x80 | 0x40, 3, 2, 1, 4}, // geometric height, baro rate, geometric rate, vector
	}
}

var plane0100 = time.Date(2031, 2, 14, 1, 0, 1, 0, time.UTC)

func oneOf(t *testing.T, d *Decoder, items map[item][]byte, received time.Time) closures.AircraftSeen {
	t.Helper()
	seen, err := d.Datagram(blockOf(make21(items)), received, nil)
	if err != nil || len(seen) != 1 {
		t.Fatalf("%+v, %v, %+v", seen, err, d.Counts())
	}
	return seen[0]
}

func TestAWholeRecord(t *testing.T) {
	s := oneOf(t, newDecoder(t), plane(), plane0100)
	if !s.Located || !s.Said.Equal(plane0100.Add(-time.Second)) || s.AltitudeFrom != closures.AboveEllipsoid {
		t.Fatalf("%+v", s)
	}
	same(t, "latitude", s.Position.Lat.Degrees(), -31.2, 1e-7)
	same(t, "longitude", s.Position.Lon.Degrees(), -4.1, 1e-7)
	same(t, "height", float64(s.Position.Height), 31250*foot, 1e-9)
	same(t, "error", float64(s.Error), 185+180.0/(1<<30)*metreDegree+350.0/128, 1e-9)
	same(t, "vertical error", float64(s.VerticalError), 2.72*45+6.25*foot+0.4*30, 1e-9)
	same(t, "speed", float64(s.Speed), 1000*0.2197265625*knot, 1e-9)
	same(t, "track", s.Track.Degrees(), 90, 1e-12)
	// 0.25 s by the times, 0.4 s of age, 0.1 s of its step and 0.5 s to the sending.
	same(t, "velocity error", float64(s.VelocityError), 2.32*3+0.22*knot+1e-4*float64(s.Speed)+22*1.0, 1e-9)
	same(t, "climb", float64(s.Climb), 1000*fpm, 1e-12)
	same(t, "climb error", float64(s.VerticalVelError), 2.72*4.5+6.25*fpm+4*0.7, 1e-9)
	if got := newDecoder(t); got.Callsigns() == nil {
		t.Error("no callsigns")
	}
}

func TestCallsigns(t *testing.T) {
	d := newDecoder(t)
	oneOf(t, d, plane(), plane0100)
	if got := d.Callsigns(); len(got) != 1 || got["a0b1c2"] != "EZS14ZH" {
		t.Errorf("%v", got)
	}
}

// What is changed in a whole record, and what must follow.
func TestRecords(t *testing.T) {
	for name, c := range map[string]struct {
		change func(map[item][]byte)
		holds  func(closures.AircraftSeen) bool
	}{
		"no fine position": {func(m map[item][]byte) {
			delete(m, 131)
			m[130] = append(number(int64(math.Round(-31.2/180*(1<<23))), 3), number(-190000, 3)...)
		}, func(s closures.AircraftSeen) bool {
			return s.Located && math.Abs(s.Position.Lat.Degrees()+31.2) < 3e-5 && float64(s.Error) > 190
		}},
		"no position":           {func(m map[item][]byte) { delete(m, 131) }, func(s closures.AircraftSeen) bool { return !s.Located && math.IsNaN(s.Position.Lat.Radians()) }},
		"on the ground":         {func(m map[item][]byte) { m[40] = []byte{1, 0x40} }, func(s closures.AircraftSeen) bool { return s.OnGround && s.Located }},
		"simulated":             {func(m map[item][]byte) { m[40] = []byte{1, 0x20} }, func(s closures.AircraftSeen) bool { return s.Drill }},
		"a test":                {func(m map[item][]byte) { m[40] = []byte{1, 0x10} }, func(s closures.AircraftSeen) bool { return s.Drill }},
		"a duplicate address":   {func(m map[item][]byte) { m[40] = []byte{1 << 5}; m[161] = number(77, 2) }, func(s closures.AircraftSeen) bool { return s.Aircraft == "dup-a0b1c2-77" }},
		"a vehicle":             {func(m map[item][]byte) { m[40] = []byte{2 << 5} }, func(s closures.AircraftSeen) bool { return s.Aircraft == "vehicle-a0b1c2" }},
		"an anonymous address":  {func(m map[item][]byte) { m[40] = []byte{3 << 5} }, func(s closures.AircraftSeen) bool { return s.Aircraft == "anon-a0b1c2" }},
		"an address of no kind": {func(m map[item][]byte) { m[40] = []byte{7 << 5} }, func(s closures.AircraftSeen) bool { return s.Aircraft == "other-a0b1c2" }},
		"a track alone":         {func(m map[item][]byte) { delete(m, 80); m[161] = number(77, 2) }, func(s closures.AircraftSeen) bool { return s.Aircraft == "track-1-2-77" }},
		"no geometric height": {func(m map[item][]byte) { delete(m, 140) }, func(s closures.AircraftSeen) bool {
			return s.AltitudeFrom == closures.PressureAltitude && math.IsNaN(float64(s.VerticalError))
		}},
		"a height past its scale": {func(m map[item][]byte) { m[140] = number(0x7FFF, 2) }, func(s closures.AircraftSeen) bool { return s.AltitudeFrom == closures.PressureAltitude }},
		"no height": {func(m map[item][]byte) { delete(m, 140); delete(m, 145) }, func(s closures.AircraftSeen) bool {
			return s.AltitudeFrom == closures.NoAltitude && math.IsNaN(float64(s.Position.Height)) && math.IsNaN(float64(s.Climb))
		}},
		"no vertical quality":   {func(m map[item][]byte) { m[90] = m[90][:2]; m[90][1] &^= 1 }, func(s closures.AircraftSeen) bool { return s.AltitudeFrom == closures.PressureAltitude }},
		"height of unknown age": {func(m map[item][]byte) { m[295] = []byte{1, 0x02 | 1, 0xC0, 2, 1, 4} }, func(s closures.AircraftSeen) bool { return s.AltitudeFrom == closures.PressureAltitude }},
		"the same, no other": {func(m map[item][]byte) { m[295] = []byte{1, 0x02 | 1, 0xC0, 2, 1, 4}; delete(m, 145) }, func(s closures.AircraftSeen) bool {
			return s.AltitudeFrom == closures.AboveEllipsoid && float64(s.VerticalError) > 2.72*45+300
		}},
		"an old height": {func(m map[item][]byte) { m[295] = []byte{0x02 | 1, 0x02 | 1, 0xC0, 101, 2, 1, 4} }, func(s closures.AircraftSeen) bool { return s.AltitudeFrom == closures.PressureAltitude }},
		"a flight level of age": {func(m map[item][]byte) { delete(m, 140); m[295] = []byte{1, 0x80, 20} }, func(s closures.AircraftSeen) bool {
			return math.Abs(float64(s.VerticalError)-(100+0.08*30000*foot+2.1*30)) < 1e-6
		}},
		"an old flight level": {func(m map[item][]byte) { delete(m, 140); m[295] = []byte{1, 0x80, 101} }, func(s closures.AircraftSeen) bool { return s.AltitudeFrom == closures.NoAltitude }},
		"no velocity": {func(m map[item][]byte) { delete(m, 160) }, func(s closures.AircraftSeen) bool {
			return math.IsNaN(float64(s.Speed)) && math.IsNaN(float64(s.VelocityError))
		}},
		"faster than its scale": {func(m map[item][]byte) { m[160][0] |= 0x80 }, func(s closures.AircraftSeen) bool { return math.IsNaN(float64(s.Speed)) }},
		"a velocity of unknown age": {func(m map[item][]byte) { delete(m, 72); delete(m, 295) }, func(s closures.AircraftSeen) bool {
			return math.IsNaN(float64(s.Speed)) && math.IsNaN(float64(s.Climb))
		}},
		"an old velocity": {func(m map[item][]byte) { m[72] = daytimeOf(3589) }, func(s closures.AircraftSeen) bool { return math.IsNaN(float64(s.Speed)) }},
		"by baro rate": {func(m map[item][]byte) { delete(m, 157) }, func(s closures.AircraftSeen) bool {
			return math.Abs(float64(s.Climb)+1000*fpm) < 1e-9 && float64(s.VerticalVelError) > 10
		}},
		"climbs faster than its scale": {func(m map[item][]byte) { m[155][0] |= 0x80; m[157][0] |= 0x80 }, func(s closures.AircraftSeen) bool { return math.IsNaN(float64(s.Climb)) }},
		"no quality":                   {func(m map[item][]byte) { delete(m, 90) }, func(s closures.AircraftSeen) bool { return float64(s.Error) > 2000 && float64(s.VelocityError) > 30 }},
		"integrity not known":          {func(m map[item][]byte) { m[90][1] &^= 3 << 5 }, func(s closures.AircraftSeen) bool { return float64(s.Error) > 2000 }},
		"accuracy not known":           {func(m map[item][]byte) { m[90][1] &^= 15 << 1 }, func(s closures.AircraftSeen) bool { return float64(s.Error) > 2000 }},
		"accuracy poor":                {func(m map[item][]byte) { m[90][1] = 3<<5 | 6<<1 | 1 }, func(s closures.AircraftSeen) bool { return float64(s.Error) > 2.32*556 }},
		"no version": {func(m map[item][]byte) { delete(m, 210) }, func(s closures.AircraftSeen) bool {
			return math.Abs(float64(s.Error)-185*math.Sqrt(7.0/3)) < 3 && s.AltitudeFrom == closures.PressureAltitude
		}},
		"version not supported": {func(m map[item][]byte) { m[210][0] |= 0x40 }, func(s closures.AircraftSeen) bool { return float64(s.Error) > 185*1.5 }},
		"version 0, NUCp":       {func(m map[item][]byte) { m[210] = []byte{2}; m[90] = []byte{6 << 1} }, func(s closures.AircraftSeen) bool { return math.Abs(float64(s.Error)-370*math.Sqrt(7.0/3)) < 3 }},
		"version 1, VEPU": {func(m map[item][]byte) { m[210] = []byte{1<<3 | 2} }, func(s closures.AircraftSeen) bool {
			return math.Abs(float64(s.VerticalError)-(2.72*45+6.25*foot+12+18)) < 1e-6
		}},
	} {
		d, m := newDecoder(t), plane()
		c.change(m)
		if s := oneOf(t, d, m, plane0100); !c.holds(s) {
			t.Errorf("%s: %+v", name, s)
		}
	}
	// Edition 2.0 has no geometric vertical accuracy: those bits are spare.
	o := options()
	o.Edition = "2.0"
	d, err := NewDecoder(o)
	if err != nil {
		t.Fatal(err)
	}
	if s := oneOf(t, d, plane(), plane0100); s.AltitudeFrom != closures.PressureAltitude {
		t.Errorf("edition 2.0: %+v", s)
	}
}

// Seconds of the day fall on the day that brings them nearest to the
// reception, about 00:00 UTC on either side of it.
func TestTimesAboutMidnight(t *testing.T) {
	midnight := time.Date(2031, 2, 15, 0, 0, 0, 0, time.UTC)
	for _, c := range []struct {
		seconds  float64
		received time.Duration // after midnight
		want     time.Duration
	}{
		{86399.5, 200 * time.Millisecond, -500 * time.Millisecond},
		{0, 0, 0},
		{0.25, -100 * time.Millisecond, 250 * time.Millisecond}, // the station's clock is a little ahead
		{86399.9921875, 0, -7812500 * time.Nanosecond},
		{86400, time.Second, 0}, // a leap second
		{86399, -500 * time.Millisecond, -time.Second},
		{1, 2 * time.Second, time.Second},
		{43200, 12 * time.Hour, 12 * time.Hour},
		{86000, time.Hour, -400 * time.Second},
	} {
		if got := place(c.seconds, midnight.Add(c.received)); !got.Equal(midnight.Add(c.want)) {
			t.Errorf("%v s received at %v: %v", c.seconds, c.received, got)
		}
		// Whatever the zone the clock's reading is in.
		if got := place(c.seconds, midnight.Add(c.received).In(time.FixedZone("", -5*3600))); !got.Equal(midnight.Add(c.want)) || got.Location() != time.UTC {
			t.Errorf("%v s in another zone: %v", c.seconds, got)
		}
	}
	// Whole records across midnight, the velocity on the other side.
	m := plane()
	m[71], m[72], m[77] = daytimeOf(86399.875), daytimeOf(0.125), daytimeOf(0.25)
	s := oneOf(t, newDecoder(t), m, midnight.Add(time.Second))
	if !s.Said.Equal(midnight.Add(-125*time.Millisecond)) || !(math.Abs(float64(s.VelocityError)-(2.32*3+0.22*knot+1e-4*float64(s.Speed)+22*0.875)) < 1e-9) {
		t.Errorf("%+v", s)
	}
	// The part of a second takes the whole one with it.
	for _, c := range []struct {
		whole, want float64
		part        uint32
	}{{86399, 86400.5, 1<<30 | 1<<29}, {0, -0.5, 2<<30 | 1<<29}, {5.75, 5.5, 1 << 29}} {
		at := c.whole
		if err := refine(&at, number(int64(c.part), 4)); err != nil || at != c.want {
			t.Errorf("%+v: %v, %v", c, at, err)
		}
	}
	m = plane()
	delete(m, 71)
	m[73], m[74] = daytimeOf(0.01), number(2<<30|1<<29, 4)
	if s := oneOf(t, newDecoder(t), m, midnight.Add(time.Second)); !s.Said.Equal(midnight.Add(-500 * time.Millisecond)) {
		t.Errorf("%+v", s)
	}
}

// Times that cannot be, or that cannot be told, make no report; old ones keep
// their own time.
func TestOddTimes(t *testing.T) {
	none := func(name string, change func(map[item][]byte), count func(Counts) uint64) {
		t.Helper()
		d, m := newDecoder(t), plane()
		change(m)
		seen, err := d.Datagram(blockOf(make21(m)), plane0100, nil)
		if err != nil || len(seen) != 0 || count(d.Counts()) != 1 {
			t.Errorf("%s: %+v, %v, %+v", name, seen, err, d.Counts())
		}
	}
	none("ahead", func(m map[item][]byte) { m[71] = daytimeOf(3601.51) }, func(c Counts) uint64 { return c.Ahead })
	none("far ahead", func(m map[item][]byte) { m[71] = daytimeOf(43200) }, func(c Counts) uint64 { return c.Ahead })
	none("no time", func(m map[item][]byte) { delete(m, 71); delete(m, 72); delete(m, 77) }, func(c Counts) uint64 { return c.NoTime })
	none("no name", func(m map[item][]byte) { delete(m, 80) }, func(c Counts) uint64 { return c.Nameless })
	d, m := newDecoder(t), plane()
	m[71] = daytimeOf(0)
	if s := oneOf(t, d, m, plane0100); !s.Said.Equal(plane0100.Truncate(24*time.Hour)) || d.Counts().Late != 1 {
		t.Errorf("%+v, %+v", s, d.Counts())
	}
	for name, change := range map[string]func(map[item][]byte){
		"latitude":  func(m map[item][]byte) { m[131] = append(number(1<<29+1, 4), 0, 0, 0, 0) },
		"height":    func(m map[item][]byte) { m[140] = number(-300, 2) },
		"level":     func(m map[item][]byte) { delete(m, 140); m[145] = number(6001, 2) },
		"low level": func(m map[item][]byte) { delete(m, 140); m[145] = number(-61, 2) },
	} {
		d, m := newDecoder(t), plane()
		change(m)
		if oneOf(t, d, m, plane0100); d.Counts().BadValue != 1 {
			t.Errorf("%s: %+v", name, d.Counts())
		}
	}
}

// Unknown and unused items are passed over by their rules of length, in every
// combination with what follows them.
func TestItemsArePassedOver(t *testing.T) {
	extra := map[item][]byte{
		15: {1}, 150: {1, 2}, 151: {3, 4}, 230: {1, 1}, 152: {2, 2}, 200: {1}, 165: {1, 2}, 20: {1},
		220: {0xF0, 1, 1, 2, 2, 3, 3, 4}, 146: {1, 2}, 148: {1, 2}, 110: append([]byte{0xC0, 1, 0, 2}, make([]byte, 30)...), 16: {2}, 8: {1},
		271: {1, 0}, 132: {200}, 250: append([]byte{2}, make([]byte, 16)...), 260: make([]byte, 7), 400: {1}, 70: {1, 2}, 161: {0, 9},
		73: daytimeOf(3600), 74: {0, 0, 0, 0}, 75: daytimeOf(3600), 76: {0, 0, 0, 0}, 130: {0, 0, 0, 0, 0, 0},
	}
	want := oneOf(t, newDecoder(t), plane(), plane0100)
	all := plane()
	for i, b := range extra {
		m := plane()
		m[i], all[i] = b, b
		if i == 74 || i == 76 { // they refine the item before
			m[i-1] = extra[i-1]
		}
		if got := oneOf(t, newDecoder(t), m, plane0100); got.Position != want.Position || got.Speed != want.Speed || !got.Said.Equal(want.Said) {
			t.Errorf("item %d: %+v", i, got)
		}
	}
	if got := oneOf(t, newDecoder(t), all, plane0100); got.Position != want.Position || got.Speed != want.Speed {
		t.Errorf("all: %+v", got)
	}
	// Reserved and special fields count themselves.
	r := make21(all)
	n := 0
	for r[n]&1 == 1 {
		n++
	}
	long := append([]byte{}, r[:n]...)
	long = append(long, r[n]|1)
	for len(long) < 6 {
		long = append(long, 1)
	}
	long = append(long, 0x06)
	long = append(long, r[n+1:]...)
	long = append(long, 3, 0xFF, 0xFF, 1)
	seen, err := newDecoder(t).Datagram(blockOf(long, make21(plane())), plane0100, nil)
	if err != nil || len(seen) != 2 || seen[0].Position != want.Position || seen[1].Position != want.Position {
		t.Errorf("%+v, %v", seen, err)
	}
}

// Blocks that are wrong are refused whole; what stands beside them counts.
func TestMalformedBlocks(t *testing.T) {
	good := make21(plane())
	// with announces items by their place in the profile, from 1.
	with := func(data string, places ...int) []byte {
		fspec := make([]byte, (places[len(places)-1]+6)/7)
		for i := range len(fspec) - 1 {
			fspec[i] = 1
		}
		for _, p := range places {
			fspec[(p-1)/7] |= 0x80 >> ((p - 1) % 7)
		}
		return append(fspec, octets(t, data)...)
	}
	for name, c := range map[string]struct {
		block []byte
		want  error
	}{
		"empty head":                       {[]byte{21}, errHead},
		"half a head":                      {[]byte{21, 0}, errHead},
		"a length of nothing":              {[]byte{21, 0, 0}, errLength},
		"a length less than its head":      {[]byte{21, 0, 2, 0x80}, errLength},
		"no record":                        {[]byte{21, 0, 3}, errLength},
		"longer than the datagram":         {[]byte{21, 0, 200, 0x80, 1, 2}, errLength},
		"all ones":                         {[]byte(strings.Repeat("\xFF", 64)), errLength},
		"an empty record":                  {blockOf([]byte{0}), errEmpty},
		"an empty record of two octets":    {blockOf([]byte{1, 0}), errEmpty},
		"an empty record after a good one": {blockOf(good, []byte{0}), errEmpty},
		"items announced without end":      {blockOf([]byte{1, 1, 1, 1, 1, 1, 1, 1, 0}), errUnknown},
		"announcement cut":                 {blockOf([]byte{0x81}), errShort},
		"an item that is not there":        {blockOf(with("00", 43)), errUnknown},
		"item 010 cut":                     {blockOf(with("01", 1)), errShort},
		"item 040 cut":                     {blockOf(with("01", 2)), errShort},
		"item 040 without end":             {blockOf(with(strings.Repeat("01", 40), 2)), errEndless},
		"item 131 cut":                     {blockOf(with("00112233445566", 7)), errShort},
		"item 250 cut":                     {blockOf(with("02"+strings.Repeat("00", 15), 39)), errShort},
		"item 250 without its count":       {blockOf(with("", 39)), errShort},
		"item 110 without its head":        {blockOf(with("", 34)), errShort},
		"item 110 with a part it has not":  {blockOf(with("2000", 34)), errPart},
		"item 110 with points cut":         {blockOf(with("4001", 34)), errShort},
		"item 220 with a part it has not":  {blockOf(with("08", 31)), errPart},
		"item 220 of two octets":           {blockOf(with("0180", 31)), errPart},
		"item 220 cut":                     {blockOf(with("8001", 31)), errShort},
		"item 295 with a part it has not":  {blockOf(with("0101010800", 42)), errPart},
		"item 295 of five octets":          {blockOf(with("0101010180ff", 42)), errPart},
		"item 295 cut":                     {blockOf(with("80", 42)), errShort},
		"a reserved field of no length":    {blockOf(with("00", 48)), errSelf},
		"a reserved field cut":             {blockOf(with("0501", 48)), errShort},
		"a reserved field missing":         {blockOf(with("", 48)), errShort},
		"a time past the day":              {blockOf(with("ffffff", 5)), errDaytime},
		"a part of no second":              {blockOf(with("00000000", 13)), errFraction},
		"a part of a second reserved":      {blockOf(with("000000c0000000", 12, 13)), errFraction},
		"an octet too many":                {blockOf(good, []byte{0x80}), errShort},
		"an octet too few":                 {blockOf(good[:len(good)-1]), errShort},
	} {
		d := newDecoder(t)
		seen, err := d.Datagram(c.block, plane0100, nil)
		var bad *BlockError
		if !errors.Is(err, c.want) || !errors.As(err, &bad) || len(seen) != 0 || d.Counts().BadBlocks != 1 {
			t.Errorf("%s: %+v, %v, %+v", name, seen, err, d.Counts())
			continue
		}
		// Beside good blocks.
		seen, err = d.Datagram(append(blockOf(good), c.block...), plane0100, nil)
		if len(seen) != 1 || !errors.Is(err, c.want) {
			t.Errorf("%s, after a good block: %+v, %v", name, seen, err)
		}
		if c.want != errLength && c.want != errHead {
			if seen, _ := d.Datagram(append(append([]byte{}, c.block...), blockOf(good)...), plane0100, nil); len(seen) != 1 {
				t.Errorf("%s, before a good block: %+v", name, seen)
			}
		}
	}
}

func TestOtherCategoriesArePassedOver(t *testing.T) {
	d := newDecoder(t)
	good := blockOf(make21(plane()))
	datagram := append(append([]byte{23, 0, 5, 1, 2}, good...), 48, 0, 4, 9)
	if seen, err := d.Datagram(datagram, plane0100, nil); err != nil || len(seen) != 1 {
		t.Errorf("%+v, %v", seen, err)
	}
	if seen, err := d.Datagram(nil, plane0100, nil); err != nil || len(seen) != 0 {
		t.Errorf("an empty datagram: %+v, %v", seen, err)
	}
	if n := d.Counts(); n.Other != 2 || n.Blocks != 1 || n.BadBlocks != 0 {
		t.Errorf("%+v", n)
	}
}

// Any single bit of a block that is flipped either refuses it or leaves
// reports that can be.
func TestFlippedBits(t *testing.T) {
	for _, b := range [][]byte{octets(t, blockA), blockOf(octets(t, recordB)), blockOf(make21(plane()))} {
		for i := range 8 * len(b) {
			c := append([]byte{}, b...)
			c[i/8] ^= 0x80 >> (i % 8)
			seen, _ := newDecoder(t).Datagram(c, plane0100, nil)
			for _, s := range seen {
				check(t, s, plane0100)
			}
		}
		for n := range b {
			if seen, err := newDecoder(t).Datagram(b[:n], plane0100, nil); n > 0 && (err == nil || len(seen) != 0) {
				t.Errorf("cut to %d: %+v", n, seen)
			}
		}
	}
}

func check(t *testing.T, s closures.AircraftSeen, received time.Time) {
	t.Helper()
	finite := func(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
	lat, lon, h := s.Position.Lat.Degrees(), s.Position.Lon.Degrees(), float64(s.Position.Height)
	switch {
	case !closures.ValidName(s.Aircraft), s.Said.After(received.Add(mostAhead)), received.Sub(s.Said) > 13*time.Hour:
		t.Fatalf("its name or time: %+v", s)
	case s.Located != finite(lat), s.Located && !(math.Abs(lat) <= 90 && math.Abs(lon) <= 180 && s.Error > 0 && s.Error < 1e6):
		t.Fatalf("its position: %+v", s)
	case (s.AltitudeFrom == closures.NoAltitude) == finite(h), s.AltitudeFrom == closures.AboveEllipsoid && !(s.VerticalError > 0):
		t.Fatalf("its height: %+v", s)
	case finite(float64(s.Speed)) != finite(s.Track.Radians()), finite(float64(s.Speed)) && !(s.VelocityError > 0 && s.Speed >= 0):
		t.Fatalf("its velocity: %+v", s)
	case finite(float64(s.Climb)) && !(s.VerticalVelError > 0 && s.AltitudeFrom != closures.NoAltitude):
		t.Fatalf("its climb: %+v", s)
	}
}

func TestOptionsThatCannotBe(t *testing.T) {
	for name, change := range map[string]func(*Options){
		"no source":      func(o *Options) { o.Source = "" },
		"no edition":     func(o *Options) { o.Edition = "" },
		"an old edition": func(o *Options) { o.Edition = "0.26" },
		"one not made":   func(o *Options) { o.Edition = "3.0" },
		"no bound":       func(o *Options) { o.PositionError = 0 },
		"a bound of NaN": func(o *Options) { o.ClimbError = geometry.Speed(nan) },
		"no motion":      func(o *Options) { o.Motion.Climb = 0 },
	} {
		o := options()
		change(&o)
		if _, err := NewDecoder(o); err == nil {
			t.Errorf("%s: made", name)
		}
	}
}

func FuzzDatagram(f *testing.F) {
	f.Add(octets(f, blockA))
	f.Add(blockOf(octets(f, recordB)))
	f.Add(append(blockOf(make21(plane())), 23, 0, 4, 0))
	f.Fuzz(func(t *testing.T, b []byte) {
		d := newDecoder(t)
		seen, err := d.Datagram(b, plane0100, nil)
		for _, s := range seen {
			check(t, s, plane0100)
		}
		if n := d.Counts(); (err == nil) != (n.BadBlocks == 0) || n.Records > uint64(len(b)) {
			t.Fatalf("%v, %+v", err, n)
		}
	})
}

// BenchmarkDatagram decodes datagrams of ten records.
func BenchmarkDatagram(b *testing.B) {
	var records [][]byte
	for i := range 10 {
		m := plane()
		m[80] = number(int64(i), 3)
		records = append(records, make21(m))
	}
	datagram := blockOf(records...)
	d := newDecoder(b)
	var out []closures.AircraftSeen
	b.ReportAllocs()
	n, start := 0, time.Now()
	for b.Loop() {
		out, _ = d.Datagram(datagram, plane0100, out[:0])
		n += len(out)
	}
	b.ReportMetric(float64(n)/time.Since(start).Seconds(), "records/s")
	b.ReportMetric(200_000, "budget-records/s")
}
