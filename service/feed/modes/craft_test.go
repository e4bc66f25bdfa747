package modes

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry/earth"
	"beamward/geometry/encounter"

	"github.com/golang/geo/s1"
)

// seal makes a frame of its first bytes, with the right parity.
func seal(head ...byte) *Frame {
	f := Frame{n: uint8(len(head) + 3)}
	copy(f.b[:], head)
	r := f.Remainder()
	f.b[f.n-3], f.b[f.n-2], f.b[f.n-1] = byte(r>>16), byte(r>>8), byte(r)
	return &f
}

// squitterOf makes an extended squitter.
func squitterOf(first byte, address uint32, m message) *Frame {
	head := []byte{first, byte(address >> 16), byte(address >> 8), byte(address)}
	for i := 6; i >= 0; i-- {
		head = append(head, byte(m>>(8*i)))
	}
	return seal(head...)
}

const (
	df17 = 17<<3 | 5
	df18 = 18 << 3
)

// put sets n bits from bit i on.
func (m message) put(i, n uint, v uint32) message {
	mask := message(1<<n-1) << (57 - i - n)
	return m&^mask | message(v)<<(57-i-n)&mask
}

// encode states a position in a zone.
func encode(lat, lon float64, odd, surface bool) CPR {
	c := CPR{Odd: odd, Surface: surface}
	unit := func(x, zone float64) uint32 { return uint32(math.Floor(131072*modulo(x, zone)/zone+0.5)) & 0x1FFFF }
	dlat := c.latZone()
	c.Lat = unit(lat, dlat)
	at := dlat * (math.Floor(lat/dlat+0.5/131072) + float64(c.Lat)*cprUnit)
	c.Lon = unit(lon, c.lonZone(at))
	return c
}

func positionMessage(tc uint8, b bool, code uint32, c CPR) message {
	m := message(0).put(1, 5, uint32(tc)).put(9, 12, code).put(23, 17, c.Lat).put(40, 17, c.Lon)
	if b {
		m = m.put(8, 1, 1)
	}
	if c.Odd {
		m = m.put(22, 1, 1)
	}
	return m
}

// feetCode codes an altitude in steps of 25 ft.
func feetCode(feet float64) uint32 {
	n := uint32(math.Round((feet + 1000) / 25))
	return n>>4<<5 | 1<<4 | n&15
}

func signed(m message, sign, field, n uint, v int) message {
	if v < 0 {
		m, v = m.put(sign, 1, 1), -v
	}
	return m.put(field, n, uint32(v+1))
}

// velocityMessage states knots, feet a minute in steps of 64, and feet in
// steps of 25.
func velocityMessage(east, north, climb, above int, nacv uint8, pressure bool) message {
	m := message(0).put(1, 5, 19).put(6, 3, 1).put(11, 3, uint32(nacv))
	m = signed(m, 14, 15, 10, east)
	m = signed(m, 25, 26, 10, north)
	m = signed(m, 37, 38, 9, climb/64)
	m = signed(m, 49, 50, 7, above/25)
	if pressure {
		m = m.put(36, 1, 1)
	}
	return m
}

func statusMessage(s Status) message {
	m := message(0).put(1, 5, 31).put(41, 3, uint32(s.Version)).put(45, 4, uint32(s.NACp)).put(51, 2, uint32(s.SIL)).put(49, 2, uint32(s.GVA))
	if s.NICa {
		m = m.put(44, 1, 1)
	}
	if s.Surface {
		m = m.put(6, 3, 1).put(17, 3, uint32(s.NACv)).put(49, 2, 0)
		if s.NICc {
			m = m.put(20, 1, 1)
		}
	}
	return m
}

// craft is an aircraft that flies straight and level over a sphere.
type craft struct {
	address     uint32
	lat, lon    float64 // degrees
	north, east float64 // m/s
	feet        float64
	odd         bool // the next position's format
	tc          uint8
	first       byte // of its frames; 0: DF 17
}

func (c *craft) head() byte {
	if c.first != 0 {
		return c.first
	}
	return df17
}

func (c *craft) fly(s float64) {
	c.lat += c.north * s / 111195
	c.lon = around(c.lon + c.east*s/(111195*math.Cos(c.lat*math.Pi/180)))
}

func (c *craft) position() *Frame {
	m := positionMessage(c.tc, false, feetCode(c.feet), encode(c.lat, c.lon, c.odd, false))
	c.odd = !c.odd
	return squitterOf(c.head(), c.address, m)
}

func (c *craft) motion() *Frame {
	return squitterOf(c.head(), c.address, velocityMessage(int(math.Round(c.east/knot)), int(math.Round(c.north/knot)), 0, 0, 2, false))
}

func (c *craft) where() place { return placeAt(c.lat, c.lon) }

// siteLat and siteLon are the place of the invented Skerry Peak.
const siteLat, siteLon = -31.5012, -4.0021

func options() Options {
	return Options{Source: "rx-1", Motion: encounter.Civil(), PositionError: 2000, VelocityError: 30, ClimbError: 10, Geoid: 18,
		Site: earth.Position{Lat: siteLat * s1.Degree, Lon: siteLon * s1.Degree, Height: 2450}}
}

// listener feeds a decoder along a clock.
type listener struct {
	*Decoder
	at time.Time
}

func newListener(t testing.TB) *listener {
	t.Helper()
	d, err := NewDecoder(options())
	if err != nil {
		t.Fatal(err)
	}
	return &listener{d, time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC)}
}

func (l *listener) after(s float64) { l.at = l.at.Add(time.Duration(s * 1e9)) }

func (l *listener) hear(f *Frame) (closures.AircraftSeen, bool) { return l.Decode(f, l.at) }

// located hears a frame that must make a report with a position.
func (l *listener) located(t testing.TB, f *Frame) closures.AircraftSeen {
	t.Helper()
	s, ok := l.hear(f)
	if !ok || !s.Located {
		t.Fatalf("no report with a position: %+v, %+v", s, l.Counts())
	}
	return s
}

// silent hears a frame that must make none.
func (l *listener) silent(t testing.TB, f *Frame) {
	t.Helper()
	if s, ok := l.hear(f); ok && s.Located {
		t.Fatalf("a report with a position: %+v", s)
	}
}

func placeOf(s closures.AircraftSeen) place {
	return placeAt(s.Position.Lat.Degrees(), s.Position.Lon.Degrees())
}

// near makes an aircraft some tens of kilometres from the site.
func near(g *rand.Rand) *craft {
	return &craft{address: g.Uint32N(1 << 24), lat: siteLat + 1.2*(g.Float64()-0.5), lon: siteLon + 1.2*(g.Float64()-0.5),
		north: (60 + 140*g.Float64()) * float64(1-2*g.IntN(2)), east: 400 * (g.Float64() - 0.5), feet: 25 * math.Floor(1600*g.Float64()), odd: g.IntN(2) == 0, tc: 11}
}

func random() *rand.Rand { return rand.New(rand.NewPCG(11, 13)) }
