package modes

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/encounter"
)

func TestTwoFormatsMakeAPosition(t *testing.T) {
	g := random()
	for range 500 {
		l, c := newListener(t), near(g)
		l.silent(t, c.position())
		l.after(0.5)
		c.fly(0.5)
		want := c.where()
		s := l.located(t, c.position())
		if got := placeOf(s); got.from(&want) > 10 {
			t.Fatalf("%+v: placed %v m away", c, got.from(&want))
		}
		if s.Aircraft != fmt.Sprintf("%06x", c.address) || s.Source != "rx-1" || !s.Said.Equal(l.at) || s.Said.Location() != time.UTC || s.OnGround || s.Drill {
			t.Fatalf("%+v", s)
		}
		if s.AltitudeFrom != closures.PressureAltitude || math.Abs(float64(s.Position.Height)-c.feet*foot) > 1e-9 || !math.IsNaN(float64(s.VerticalError)) {
			t.Fatalf("%+v", s)
		}
		if !math.IsNaN(float64(s.Speed)) || !math.IsNaN(s.Track.Radians()) || !math.IsNaN(float64(s.Climb)) {
			t.Fatalf("a velocity that nobody sent: %+v", s)
		}
		// From then on each position is one.
		for range 5 {
			l.after(0.5)
			c.fly(0.5)
			want = c.where()
			got := placeOf(l.located(t, c.position()))
			if got.from(&want) > 10 {
				t.Fatalf("placed %v m away", got.from(&want))
			}
		}
	}
}

// Whatever mixture of frames comes, of however many aircraft under however few
// addresses, an aircraft near the site is never reported elsewhere: each
// report lies where some aircraft of the address was, and every position of a
// near one makes a report from the second format on.
func TestNearIsNeverElsewhere(t *testing.T) {
	g := random()
	for round := range 200 {
		l := newListener(t)
		var all []*craft
		for range 1 + g.IntN(3) {
			c := near(g)
			c.address = 0xA0B1C2
			if g.IntN(3) == 0 { // far, where the site would mistake it
				c.lat += 3.2 + 2*g.Float64()
			}
			all = append(all, c)
		}
		type last struct {
			at time.Time
			n  int
		}
		heard, n := map[*craft]*[2]last{}, 0
		for range 400 {
			dt := (0.4 + 0.2*g.Float64()) / float64(len(all))
			l.after(dt)
			for _, o := range all {
				o.fly(dt)
			}
			c := all[g.IntN(len(all))]
			if g.IntN(3) == 0 {
				l.hear(c.motion())
				continue
			}
			format, want := 0, c.where()
			if c.odd {
				format = 1
			}
			f := c.position()
			if g.IntN(4) == 0 {
				continue // lost
			}
			s, ok := l.hear(f)
			n++
			if heard[c] == nil {
				heard[c] = &[2]last{}
			}
			other := heard[c][1-format]
			heard[c][format] = last{l.at, n}
			site := placeAt(siteLat, siteLon)
			if want.from(&site) > 310e3 {
				continue
			}
			if ok && s.Located {
				if got := placeOf(s); got.from(&want) > 10 {
					t.Fatalf("round %d: reported %v km away: %+v", round, got.from(&want)/1000, l.Counts())
				}
			} else if edge := zonesAt(c.lat+0.1) != zonesAt(c.lat-0.1); other.n > 0 && n-other.n <= keptFrames && l.at.Sub(other.at) <= 10*time.Second && !edge {
				t.Fatalf("round %d: not reported: %+v", round, l.Counts())
			}
		}
	}
}

func TestVelocityJoinsThePosition(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat + 0.3, lon: siteLon, north: -120, east: 180, feet: 30000, tc: 11}
	l.hear(c.position())
	l.after(0.2)
	l.silent(t, c.motion())
	l.after(0.3)
	s := l.located(t, c.position())
	kt, track := math.Hypot(math.Round(180/knot), math.Round(120/knot)), math.Atan2(math.Round(180/knot), -math.Round(120/knot))
	if math.Abs(float64(s.Speed)-kt*knot) > 1e-9 || math.Abs(s.Track.Radians()-track) > 1e-9 {
		t.Errorf("%v m/s toward %v", s.Speed, s.Track)
	}
	// NACv 2: 3 m/s; a step a component; 22 m/s² for 0.3 s since.
	if want := 2.32*3 + math.Sqrt2*knot + 22*0.3; math.Abs(float64(s.VelocityError)-want) > 1e-9 {
		t.Errorf("velocity error %v, want %v", s.VelocityError, want)
	}
	if want := 2.72*4.5 + 64*fpm + 4*0.3; s.Climb != 0 || math.Abs(float64(s.VerticalVelError)-want) > 1e-9 {
		t.Errorf("climb %v, error %v, want %v", s.Climb, s.VerticalVelError, want)
	}
	// It grows old, and then does not help any more.
	l.after(9)
	c.fly(9)
	if s := l.located(t, c.position()); !(float64(s.VelocityError) > 22*9) {
		t.Errorf("velocity error %v", s.VelocityError)
	}
	l.after(1.5)
	c.fly(1.5)
	if s := l.located(t, c.position()); !math.IsNaN(float64(s.Speed)) || !math.IsNaN(float64(s.VelocityError)) || !math.IsNaN(float64(s.Climb)) {
		t.Errorf("%+v", s)
	}
}

// A velocity at the end of its scale may be any beyond: the error reaches from
// the end on.
func TestVelocityBeyondItsScale(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, east: 300, feet: 30000, tc: 11}
	l.hear(c.position())
	m := velocityMessage(1022, 0, 64*510, 0, 2, false)
	l.hear(squitterOf(df17, c.address, m))
	l.after(0.5)
	c.fly(0.5)
	s := l.located(t, c.position())
	least, most := float64(s.Speed-s.VelocityError), float64(s.Speed+s.VelocityError)
	if !(least <= 1022*knot && most >= 1022*knot+moreSpeed) || least < 300 {
		t.Errorf("from %v to %v m/s", least, most)
	}
	least, most = float64(s.Climb-s.VerticalVelError), float64(s.Climb+s.VerticalVelError)
	if !(least <= 510*64*fpm && most >= 510*64*fpm+moreClimb) || least < 100 {
		t.Errorf("climbs from %v to %v m/s", least, most)
	}
}

// Airspeed and heading say nothing of the ground.
func TestAirspeedIsNoVelocity(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA05F21, lat: siteLat, lon: siteLon, east: 100, feet: 30000, tc: 11}
	l.hear(c.position())
	l.hear(frame(t, "8DA05F219B06B6AF189400CBC33F"))
	l.after(0.5)
	c.fly(0.5)
	if s := l.located(t, c.position()); !math.IsNaN(float64(s.Speed)) || !math.IsNaN(float64(s.VelocityError)) || math.Abs(float64(s.Climb)+2304*fpm) > 1e-9 {
		t.Errorf("%+v", s)
	}
}

func TestQualityBecomesHardBounds(t *testing.T) {
	const scale1, scale2 = 1.5275252316519468, 1.1832159566199232 // sqrt(7/3), sqrt(7/5)
	for _, c := range []struct {
		name   string
		status *Status // nil: none is heard
		tc     uint8
		b      bool
		want   float64 // less binWidth
	}{
		{"no status", nil, 11, false, 185 * scale1},
		{"no status, supplement", nil, 11, true, 185 * scale1},
		{"no status, 13", nil, 13, true, 1111.2 * scale1},
		{"no status, 16", nil, 16, false, 18520 * scale1},
		{"no status, none stated", nil, 18, false, 2000},
		{"version 0", &Status{Version: 0}, 9, false, 7.5 * scale1},
		{"version 0, 13", &Status{Version: 0}, 13, false, 926 * scale1},
		{"version 1", &Status{Version: 1, NACp: 8, SIL: 2}, 11, true, 185 * scale2},
		{"version 1, NIC 9", &Status{Version: 1, NICa: true, NACp: 9, SIL: 2}, 11, false, 75 * scale2},
		{"version 2, NIC 8", &Status{Version: 2, NACp: 9, SIL: 3}, 11, false, 185},
		{"version 2, NIC 9", &Status{Version: 2, NICa: true, NACp: 9, SIL: 3}, 11, true, 75},
		{"version 2, undefined supplements", &Status{Version: 2, NICa: true, NACp: 9, SIL: 3}, 11, false, 185},
		{"version 2, 0.3 NM", &Status{Version: 2, NACp: 9, SIL: 3}, 13, true, 556},
		{"version 2, 0.5 NM", &Status{Version: 2, NACp: 9, SIL: 3}, 13, false, 926},
		{"version 2, 0.6 NM", &Status{Version: 2, NICa: true, NACp: 9, SIL: 3}, 13, true, 1111.2},
		{"accuracy rules", &Status{Version: 2, NACp: 7, SIL: 3}, 10, false, 2.32 * 185},
		{"accuracy not known", &Status{Version: 2, NACp: 0, SIL: 3}, 10, false, 2000},
		{"accuracy reserved", &Status{Version: 2, NACp: 13, SIL: 3}, 10, false, 2000},
		{"integrity not known", &Status{Version: 2, NACp: 10, SIL: 0}, 10, false, 2000},
		{"integrity not known, large", &Status{Version: 2, NACp: 10, SIL: 0}, 15, false, 3704 * scale1},
		{"integrity low", &Status{Version: 2, NACp: 11, SIL: 1}, 10, false, 25 * scale1},
		{"none stated", &Status{Version: 2, NACp: 10, SIL: 3}, 18, false, 2000},
		{"none stated, poor", &Status{Version: 2, NACp: 1, SIL: 3}, 18, false, 2.32 * 18520},
	} {
		l := newListener(t)
		if c.status != nil {
			l.hear(squitterOf(df17, 0xA0B1C2, statusMessage(*c.status)))
		}
		var s closures.AircraftSeen
		for i := range 2 {
			m := positionMessage(c.tc, c.b, feetCode(30000), encode(siteLat+0.001*float64(i), siteLon, i == 1, false))
			l.after(0.5)
			s, _ = l.hear(squitterOf(df17, 0xA0B1C2, m))
		}
		if got := float64(s.Error) - binWidth; !s.Located || math.Abs(got-c.want) > 1e-6*c.want {
			t.Errorf("%s: %v m, want %v", c.name, got, c.want)
		}
	}
}

// Every unknown and every worse statement makes the bound larger or leaves it.
func TestWorseQualityNeverShrinksTheBound(t *testing.T) {
	for tc := uint8(5); tc <= 22; tc++ {
		for version := uint8(0); version <= 2; version++ {
			for bits := range 8 {
				s := Status{Version: version, NICa: bits&1 != 0, NICc: bits&2 != 0, NACp: 10, SIL: 3}
				r := containment(tc, &s, true, bits&4 != 0, true)
				if o := containment(tc, &s, false, bits&4 != 0, true); o != unknown && (r == unknown || o < r) {
					t.Errorf("TC %d, %+v: %v m with no status, %v with it", tc, s, o, r)
				}
				if o := containment(tc, &s, true, bits&4 != 0, false); o != unknown && (r == unknown || o < r) {
					t.Errorf("TC %d, %+v: %v m with b unknown, %v with it", tc, s, o, r)
				}
				for sil := uint8(0); sil < 3; sil++ {
					worse, better := s, s
					worse.SIL, better.SIL = sil, sil+1
					if horizontal(r, &worse, true, 2000) < horizontal(r, &better, true, 2000) {
						t.Errorf("TC %d, %+v: SIL %d gives less than %d", tc, s, sil, sil+1)
					}
				}
				for nac := uint8(1); nac < 11; nac++ {
					worse, better := s, s
					worse.NACp, better.NACp = nac, nac+1
					if horizontal(r, &worse, true, 2000) < horizontal(r, &better, true, 2000) {
						t.Errorf("TC %d, %+v: NACp %d gives less than %d", tc, s, nac, nac+1)
					}
				}
			}
		}
	}
}

// A target state's quality is newer than the status'.
func TestTargetStateRenewsQuality(t *testing.T) {
	l := newListener(t)
	l.hear(squitterOf(df17, 0xA0B1C2, statusMessage(Status{Version: 2, NACp: 9, SIL: 3})))
	l.hear(squitterOf(df17, 0xA0B1C2, message(0).put(1, 5, 29).put(6, 2, 1).put(40, 4, 7).put(45, 2, 3)))
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, north: 100, feet: 30000, tc: 10}
	l.hear(c.position())
	l.after(0.5)
	c.fly(0.5)
	if s := l.located(t, c.position()); math.Abs(float64(s.Error)-binWidth-2.32*185) > 1e-9 {
		t.Errorf("%v", s.Error)
	}
	l.after(31)
	c.fly(31)
	if s := l.located(t, c.position()); math.Abs(float64(s.Error)-binWidth-25*math.Sqrt(7.0/3)) > 1e-9 {
		t.Errorf("with an old status: %v", s.Error)
	}
}

func TestGeometricHeight(t *testing.T) {
	hear := func(status *Status, above int, tc uint8, code uint32, wait float64) closures.AircraftSeen {
		l := newListener(t)
		if status != nil {
			l.hear(squitterOf(df17, 0xA0B1C2, statusMessage(*status)))
		}
		l.hear(squitterOf(df17, 0xA0B1C2, velocityMessage(100, 100, 0, above, 2, false)))
		l.after(wait)
		var s closures.AircraftSeen
		for i := range 2 {
			s, _ = l.hear(squitterOf(df17, 0xA0B1C2, positionMessage(tc, false, code, encode(siteLat+0.0001*float64(i), siteLon, i == 1, false))))
		}
		if !s.Located {
			t.Fatal("no report")
		}
		return s
	}
	good := &Status{Version: 2, NACp: 9, SIL: 3, GVA: 2}
	s := hear(good, 550, 11, feetCode(30000), 1)
	if want := 2.72*45 + 50*foot + 0.1*30; s.AltitudeFrom != closures.AboveEllipsoid || math.Abs(float64(s.Position.Height)-30550*foot) > 1e-9 || math.Abs(float64(s.VerticalError)-want) > 1e-9 {
		t.Errorf("%+v, want an error of %v", s, want)
	}
	for name, s := range map[string]closures.AircraftSeen{
		"no quality":            hear(&Status{Version: 2, NACp: 9, SIL: 3}, 550, 11, feetCode(30000), 1),
		"no status":             hear(nil, 550, 11, feetCode(30000), 1),
		"an old difference":     hear(good, 550, 11, feetCode(30000), 11),
		"at its scale's end":    hear(good, 25*126, 11, feetCode(30000), 1),
		"an old version's NACp": hear(&Status{Version: 1, NACp: 8, SIL: 2}, 550, 11, feetCode(30000), 1),
	} {
		if s.AltitudeFrom != closures.PressureAltitude || math.Abs(float64(s.Position.Height)-30000*foot) > 1e-9 {
			t.Errorf("%s: %+v", name, s)
		}
	}
	if s := hear(&Status{Version: 1, NACp: 9, SIL: 2}, 550, 11, feetCode(30000), 1); math.Abs(float64(s.VerticalError)-(2.72*45+50*foot+3+18)) > 1e-9 {
		t.Errorf("version 1: %+v", s)
	}
	// Type codes 20 to 22: metres, or coded feet; the error holds both.
	s = hear(good, 550, 20, feetCode(30000), 1)
	code := float64(feetCode(30000))
	if s.AltitudeFrom != closures.AboveEllipsoid || !(math.Abs(float64(s.Position.Height)-30000*foot) < float64(s.VerticalError) && math.Abs(float64(s.Position.Height)-code) < float64(s.VerticalError)) {
		t.Errorf("%+v", s)
	}
	if s := hear(nil, 550, 20, feetCode(30000), 1); s.AltitudeFrom != closures.NoAltitude || !math.IsNaN(float64(s.Position.Height)) {
		t.Errorf("%+v", s)
	}
}

// Gillham codes come in steps of 100 ft.
func TestGillhamAltitudeInAPosition(t *testing.T) {
	l := newListener(t)
	code := uint32(0x0CA8>>7<<6 | 0x0CA8&0x3F) // 25000 ft
	for i := range 2 {
		s, ok := l.hear(squitterOf(df17, 0xA0B1C2, positionMessage(11, false, code, encode(siteLat, siteLon+0.001*float64(i), i == 1, false))))
		if i == 1 && (!ok || s.AltitudeFrom != closures.PressureAltitude || math.Abs(float64(s.Position.Height)-25000*foot) > 1e-9) {
			t.Errorf("%+v", s)
		}
	}
}

// An aircraft beyond half a zone from the site would be mistaken for one near
// by: it is reported once six frames agree, and there.
func TestFarAircraftAreNotMistaken(t *testing.T) {
	g := random()
	for range 300 {
		l, c := newListener(t), near(g)
		bearing := 2 * math.Pi * g.Float64()
		away := 340e3 + 400e3*g.Float64()
		c.lat += away * math.Cos(bearing) / 111195
		c.lon += away * math.Sin(bearing) / (111195 * math.Cos(c.lat*math.Pi/180))
		reports := 0
		for i := range 12 {
			want := c.where()
			s, ok := l.hear(c.position())
			if ok && s.Located {
				reports++
				if got := placeOf(s); got.from(&want) > 10 {
					t.Fatalf("placed %v km away", got.from(&want)/1000)
				}
			} else if i >= 5 {
				t.Fatalf("no report of frame %d: %+v", i, l.Counts())
			}
			l.after(0.5)
			c.fly(0.5)
		}
		if reports == 0 {
			t.Fatal("never reported")
		}
	}
}

// A transponder that is heard in one format alone is placed by the site, once
// that cannot be by chance.
func TestOneFormatAlone(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat + 0.2, lon: siteLon, north: -100, feet: 20000, tc: 11}
	named := 0
	for i := range 20 {
		c.odd = false
		want := c.where()
		s, ok := l.hear(c.position())
		if ok && !s.Located {
			named++
		}
		if i < 8 == (ok && s.Located) {
			t.Fatalf("frame %d: %+v", i, s)
		}
		if got := placeOf(s); i >= 8 && got.from(&want) > 10 {
			t.Fatalf("frame %d: placed %v m away", i, got.from(&want))
		}
		l.after(0.5)
		c.fly(0.5)
	}
	if named != 4 { // from the second frame on, once a second
		t.Errorf("reported without a position %d times", named)
	}
}

func TestTwoAircraftUnderOneAddress(t *testing.T) {
	l := newListener(t)
	a := &craft{address: 0xA0B1C2, lat: siteLat + 0.2, lon: siteLon, north: -100, feet: 20000, tc: 11}
	b := &craft{address: 0xA0B1C2, lat: siteLat - 0.4, lon: siteLon + 0.5, east: -200, feet: 30000, tc: 11}
	for range 10 {
		l.hear(a.motion())
		l.hear(a.position())
		l.after(0.5)
		a.fly(0.5)
	}
	if s := l.located(t, a.position()); math.IsNaN(float64(s.Speed)) {
		t.Fatalf("%+v", s)
	}
	seen := map[*craft]int{}
	for i := range 40 {
		for _, c := range []*craft{a, b} {
			l.after(0.25)
			l.hear(c.motion())
			want := c.where()
			s, ok := l.hear(c.position())
			if !ok || !s.Located {
				if c == a || i > 0 {
					t.Fatalf("round %d: no report", i)
				}
				continue
			}
			if got := placeOf(s); got.from(&want) > 10 {
				t.Fatalf("round %d: placed %v m away", i, got.from(&want))
			}
			if i > 0 && (!math.IsNaN(float64(s.Speed)) || !math.IsNaN(float64(s.Climb)) || float64(s.Error) < 2000) {
				t.Fatalf("round %d: %+v is one aircraft's, of which is not known", i, s)
			}
			seen[c]++
		}
		a.fly(0.5)
		b.fly(0.5)
	}
	n := l.Counts()
	if seen[a] < 40 || seen[b] < 38 || n.Doubled != 1 || n.Jumps == 0 || n.Erratic == 0 {
		t.Errorf("%v reports, %+v", seen, n)
	}
	// One of them gone, the other is trusted again.
	for range 200 {
		l.after(0.5)
		a.fly(0.5)
		l.hear(a.motion())
		l.hear(a.position())
	}
	if s := l.located(t, func() *Frame { a.fly(0.5); l.after(0.5); return a.position() }()); math.IsNaN(float64(s.Speed)) {
		t.Errorf("%+v", s)
	}
}

// One frame with a position where the aircraft cannot be changes nothing.
func TestImpossibleJump(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat + 0.2, lon: siteLon, north: -100, feet: 20000, tc: 11}
	for range 5 {
		l.hear(c.position())
		l.after(0.5)
		c.fly(0.5)
	}
	bogus := *c
	bogus.lat += 0.5
	l.silent(t, bogus.position())
	for range 5 {
		l.after(0.5)
		c.fly(0.5)
		want := c.where()
		s := l.located(t, c.position())
		if got := placeOf(s); got.from(&want) > 10 {
			t.Fatalf("placed %v m away", got.from(&want))
		}
	}
	if n := l.Counts(); n.Jumps != 1 || n.Doubled != 0 {
		t.Errorf("%+v", n)
	}
}

// Frames that are sent again make no report, so that the reach of the last
// true one goes on growing; and an aircraft that hovers is reported.
func TestRepeatedFrames(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat + 0.2, lon: siteLon, north: -100, feet: 20000, tc: 11}
	var old []*Frame
	for range 8 {
		f := c.position()
		old = append(old, f)
		l.hear(c.motion())
		l.hear(f)
		l.after(0.5)
		c.fly(0.5)
	}
	before := l.Counts()
	for i := range 64 {
		l.silent(t, old[i%len(old)])
		l.after(0.5)
	}
	if n := l.Counts(); n.Repeated-before.Repeated != 64 || n.Located != before.Located {
		t.Errorf("%+v", n)
	}
	// Whether it moves is not known: a repetition.
	l = newListener(t)
	for i := range 6 {
		if s, ok := l.hear(old[i%2]); ok && s.Located != (i == 1) {
			t.Errorf("frame %d: %+v", i, s)
		}
		l.after(0.5)
	}
	// It hovers, and says so.
	l = newListener(t)
	c = &craft{address: 0xA0B1C2, lat: siteLat + 0.2, lon: siteLon, feet: 12000, tc: 11}
	for i := range 40 {
		l.hear(c.motion())
		if s, ok := l.hear(c.position()); i > 0 && (!ok || !s.Located || s.Speed != 0) {
			t.Fatalf("frame %d: %+v", i, s)
		}
		l.after(0.5)
	}
	// It says that it leaves.
	c.north = 30
	l.hear(c.motion())
	l.after(0.6)
	l.silent(t, c.position())
}

func TestSurfacePositions(t *testing.T) {
	surface := func(lat, lon float64, odd bool, movement uint32) *Frame {
		p := encode(lat, lon, odd, true)
		m := message(0).put(1, 5, 7).put(6, 7, movement).put(13, 1, 1).put(14, 7, 64).put(23, 17, p.Lat).put(40, 17, p.Lon)
		if odd {
			m = m.put(22, 1, 1)
		}
		return squitterOf(df17, 0xA0B1C2, m)
	}
	l := newListener(t)
	for i := range 10 {
		s, ok := l.hear(surface(siteLat+0.1, siteLon+0.1, i%2 == 1, 1)) // it stands
		if i == 0 {
			continue
		}
		want := placeAt(siteLat+0.1, siteLon+0.1)
		if got := placeOf(s); !ok || !s.Located || got.from(&want) > 5 || !s.OnGround || s.Speed != 0 || s.AltitudeFrom != closures.NoAltitude || !math.IsNaN(float64(s.Climb)) {
			t.Fatalf("frame %d: %+v", i, s)
		}
		l.after(5)
	}
	s := l.located(t, surface(siteLat+0.1001, siteLon+0.1, true, 41)) // 17 kt toward 180°
	if math.Abs(float64(s.Speed)-17*knot) > 1e-9 || math.Abs(s.Track.Degrees()-180) > 1e-9 || !(s.VelocityError > 30) {
		t.Errorf("%+v", s)
	}
	if s := l.located(t, surface(siteLat+0.1002, siteLon+0.1, true, 0)); !math.IsNaN(float64(s.Speed)) { // no information
		t.Errorf("%+v", s)
	}
	if s := l.located(t, surface(siteLat+0.1003, siteLon+0.1, true, 124)); !(float64(s.Speed+s.VelocityError) > 300) { // 175 kt or more
		t.Errorf("%+v", s)
	}
	// An aircraft that lands is placed by where it was in the air.
	l = newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat + 1.5, lon: siteLon, north: -70, feet: 0, tc: 11}
	for range 4 {
		l.hear(c.position())
		l.after(0.5)
		c.fly(0.5)
	}
	want := c.where()
	s = l.located(t, surface(c.lat, c.lon, false, 100))
	if got := placeOf(s); got.from(&want) > 5 || !s.OnGround {
		t.Errorf("%+v", s)
	}
}

func TestGroundStationsReportsAreKeptApartWithLargerErrors(t *testing.T) {
	var errors_ []float64
	for _, c := range []struct {
		first byte
		imf   bool
		name  string
	}{
		{df17, false, "a0b1c2"}, {df18, false, "a0b1c2"}, {df18 | 1, false, "anon-a0b1c2"}, {df18 | 2, false, "tisb-a0b1c2"}, {df18 | 2, true, "tisb-anon-a0b1c2"},
		{df18 | 5, false, "tisb-anon-a0b1c2"}, {df18 | 6, false, "adsr-a0b1c2"}, {df18 | 6, true, "adsr-anon-a0b1c2"},
	} {
		l := newListener(t)
		v := velocityMessage(100, 0, 0, 500, 2, false)
		if c.imf {
			v = v.put(9, 1, 1)
		}
		l.hear(squitterOf(c.first, 0xA0B1C2, v))
		for i := range 2 {
			m := positionMessage(11, c.imf, feetCode(30000), encode(siteLat, siteLon+0.0001*float64(i), i == 1, false))
			s, ok := l.hear(squitterOf(c.first, 0xA0B1C2, m))
			if i == 0 {
				continue
			}
			if !ok || !s.Located || s.Aircraft != c.name {
				t.Fatalf("%d: %+v", c.first&7, s)
			}
			lag := 0.0
			switch {
			case strings.HasPrefix(c.name, "tisb-"):
				lag = 4
			case strings.HasPrefix(c.name, "adsr-"):
				lag = 3
			}
			if want := 185*math.Sqrt(7.0/3) + binWidth + 350*lag; math.Abs(float64(s.Error)-want) > 1e-6 {
				t.Errorf("%s: error %v, want %v", c.name, s.Error, want)
			}
			if !(float64(s.VelocityError) >= 22*lag) {
				t.Errorf("%s: velocity error %v", c.name, s.VelocityError)
			}
			errors_ = append(errors_, float64(s.VelocityError))
		}
	}
	if !(errors_[3] > 30) {
		t.Errorf("a ground station's word of quality is believed: %v", errors_)
	}
	for _, first := range []byte{df18 | 3, df18 | 4, df18 | 7} {
		l := newListener(t)
		for i := range 3 {
			if s, ok := l.hear(squitterOf(first, 0xA0B1C2, positionMessage(11, false, feetCode(30000), encode(siteLat, siteLon, i == 1, false)))); ok {
				t.Errorf("%d: %+v", first&7, s)
			}
		}
		if n := l.Counts(); n.Unused != 3 || n.Aircraft != 0 {
			t.Errorf("%d: %+v", first&7, n)
		}
	}
}

// A transponder that gives no position is reported without one: from its
// second frame on, once a second, and again once it was not placed for long.
func TestAircraftWithoutPosition(t *testing.T) {
	l := newListener(t)
	call := seal(11<<3|5, 0xA0, 0xB1, 0xC2)
	if _, ok := l.hear(call); ok {
		t.Fatal("one frame proves an aircraft")
	}
	l.after(0.1)
	s, ok := l.hear(call)
	if !ok || s.Located || s.Aircraft != "a0b1c2" || !s.Said.Equal(l.at) || s.AltitudeFrom != closures.NoAltitude ||
		!math.IsNaN(s.Position.Lat.Radians()) || !math.IsNaN(float64(s.Position.Height)) || !math.IsNaN(float64(s.Error)) || !math.IsNaN(float64(s.Speed)) {
		t.Fatalf("%+v", s)
	}
	// What carries its address in the parity counts now: an altitude reply.
	reply := seal(4<<3, 0, 0x17, 0x18)
	for i := range 3 {
		reply.b[4+i] ^= []byte{0xA0, 0xB1, 0xC2}[i]
	}
	l.after(0.5)
	if _, ok := l.hear(reply); ok {
		t.Error("twice within a second")
	}
	l.after(0.6)
	if s, ok := l.hear(reply); !ok || s.Located {
		t.Errorf("%+v", s)
	}
	// So does an answer to an interrogator's call, and nothing of strangers.
	answer := seal(11<<3|5, 0xA0, 0xB1, 0xC2)
	answer.b[6] ^= 22
	l.after(1)
	if _, ok := l.hear(answer); !ok {
		t.Error("an interrogator's answer does not count")
	}
	stranger := seal(11<<3|5, 0xA0, 0xB1, 0xC3)
	stranger.b[6] ^= 22
	for range 3 {
		l.after(1)
		if _, ok := l.hear(stranger); ok {
			t.Error("a stranger counts")
		}
		if _, ok := l.hear(frame(t, "2000171806A983")); ok {
			t.Error("a stranger's reply counts")
		}
	}
	// With positions these frames add nothing; ten seconds after the last do.
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, north: 100, feet: 30000, tc: 11}
	l.hear(c.position())
	c.fly(0.5)
	l.located(t, c.position())
	l.after(9)
	if _, ok := l.hear(call); ok {
		t.Error("a report without a position, after one with")
	}
	l.after(2)
	if s, ok := l.hear(call); !ok || s.Located {
		t.Errorf("%+v", s)
	}
}

func TestClockOddities(t *testing.T) {
	l := newListener(t)
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, north: 100, feet: 30000, tc: 11}
	for _, at := range []time.Time{{}, time.Unix(0, 0), time.Date(1989, 12, 31, 0, 0, 0, 0, time.UTC), time.Date(2200, 1, 1, 0, 0, 0, 0, time.UTC), time.Date(9999, 1, 1, 0, 0, 0, 0, time.UTC), time.Unix(math.MaxInt64/2, 0)} {
		if _, ok := l.Decode(c.position(), at); ok {
			t.Errorf("a report at %v", at)
		}
	}
	if n := l.Counts(); n.BadTime != 6 || n.Proven != 0 {
		t.Errorf("%+v", n)
	}
	l.hear(c.position())
	l.after(-0.3) // a little out of order
	c.fly(-0.3)
	l.located(t, c.position())
	l.after(-2)
	l.silent(t, c.position())
	if n := l.Counts(); n.ClockBack != 1 || n.Aircraft != 1 {
		t.Errorf("%+v", n)
	}
	// Forward: what was remembered is too old to help.
	l.after(3600)
	l.silent(t, c.position())
}

func TestMemoryIsBounded(t *testing.T) {
	o := options()
	o.Most = 10
	d, err := NewDecoder(o)
	if err != nil {
		t.Fatal(err)
	}
	at := time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC)
	for i := range 1000 {
		at = at.Add(time.Millisecond)
		c := &craft{address: uint32(i), lat: siteLat, lon: siteLon, feet: 30000, tc: 11}
		d.Decode(c.position(), at)
		if i%7 == 0 { // this one is heard again and again
			c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon + float64(i)*1e-5, feet: 30000, tc: 11, odd: i%2 == 0}
			s, ok := d.Decode(c.position(), at)
			if i > 14 && (!ok || !s.Located) {
				t.Fatalf("%d: it was forgotten", i)
			}
		}
	}
	n := d.Counts()
	if n.Aircraft != 10 || n.Evicted != 991 || len(d.store.index) != 10 || cap(d.store.list) > 32 {
		t.Errorf("%+v, %d indexed", n, len(d.store.index))
	}
	// The order of hearing is whole, both ways.
	seen := 0
	for i, before := d.store.oldest, int32(-1); i >= 0; i, before = d.store.list[i].newer, i {
		if d.store.list[i].older != before {
			t.Fatal("the order is broken")
		}
		seen++
	}
	if seen != 10 {
		t.Errorf("%d in order", seen)
	}
}

func TestCallsigns(t *testing.T) {
	l := newListener(t)
	l.hear(frame(t, "8D4840D6202CC371C32CE0576098"))
	l.hear(frame(t, "8D406B902015A678D4D220AA4BDA"))
	if got := l.Callsigns(); len(got) != 2 || got["4840d6"] != "KLM1023" || got["406b90"] != "EZY85MH" {
		t.Errorf("%v", got)
	}
}

func TestOptionsThatCannotBe(t *testing.T) {
	for name, change := range map[string]func(*Options){
		"no source":         func(o *Options) { o.Source = "" },
		"no site":           func(o *Options) { o.Site.Lat = 2 },
		"no bound":          func(o *Options) { o.PositionError = 0 },
		"a bound of NaN":    func(o *Options) { o.VelocityError = geometry.Speed(nan) },
		"an infinite geoid": func(o *Options) { o.Geoid = geometry.Length(math.Inf(1)) },
		"no motion":         func(o *Options) { o.Motion = encounter.Motion{} },
	} {
		o := options()
		change(&o)
		if _, err := NewDecoder(o); err == nil {
			t.Errorf("%s: made", name)
		}
	}
}
