package modes

import (
	"encoding/csv"
	"encoding/hex"
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
)

// Published frames and values: J. Sun, The 1090 Megahertz Riddle, 2nd ed. (TU
// Delft OPEN, 2021), its text and figures, and the tests of pyModeS 3.3.0; where
// a check says "computed", with pyModeS 3.3.0.

func frame(t testing.TB, text string) *Frame {
	t.Helper()
	b, err := hex.DecodeString(text)
	if err != nil {
		t.Fatal(err)
	}
	f, ok := NewFrame(b)
	if !ok {
		t.Fatalf("%s is no frame", text)
	}
	return &f
}

func close12(t *testing.T, what string, got, want float64) {
	t.Helper()
	if !(math.Abs(got-want) <= 1e-12*max(1, math.Abs(want))) {
		t.Errorf("%s: %.16g, want %.16g", what, got, want)
	}
}

func TestPublishedRemainders(t *testing.T) {
	for text, want := range map[string]uint32{
		"8D406B902015A678D4D220AA4BDA": 0,
		"8D4CA251204994B1C36E60A5343D": 16, // corrupt
		"5D484FDEA248F5":               22, // DF 11, an interrogator's code
		"2A00516D492B80":               0x510AF9,
		"2000171806A983":               0x4CA7E8,
		"a000029cffbaa11e2004727281f1": 0x4243D0,
		"a000139381951536e024d4ccf6b5": 0x3C4DD2,
	} {
		f := frame(t, text)
		if got := f.Remainder(); got != want {
			t.Errorf("%s: remainder %06X, want %06X", text, got, want)
		}
		if slow := slowRemainder(f); slow != want {
			t.Errorf("%s: slow remainder %06X, want %06X", text, slow, want)
		}
	}
	// DF 11 carries its address; DF 5 a squawk of 0356, DF 4 an altitude.
	if f := frame(t, "5D484FDEA248F5"); f.Format() != 11 || f.Address() != 0x484FDE {
		t.Errorf("DF %d of %06X", f.Format(), f.Address())
	}
	f := frame(t, "2000171806A983")
	if feet, _, state := altitude13(uint32(f.b[2]&0x1F)<<8 | uint32(f.b[3])); feet != 36000 || state != altitudeKnown {
		t.Errorf("altitude %v, %v", feet, state)
	}
}

// slowRemainder divides bit by bit.
func slowRemainder(f *Frame) uint32 {
	bits := []uint32{}
	for _, b := range f.b[:f.n] {
		for i := 7; i >= 0; i-- {
			bits = append(bits, uint32(b>>i&1))
		}
	}
	const poly = 0x1FFF409
	for i := 0; i+24 < len(bits); i++ {
		if bits[i] == 1 {
			for k := range 25 {
				bits[i+k] ^= poly >> (24 - k) & 1
			}
		}
	}
	var r uint32
	for _, b := range bits[len(bits)-24:] {
		r = r<<1 | b
	}
	return r
}

func TestPublishedIdentifications(t *testing.T) {
	for text, want := range map[string]string{"8D4840D6202CC371C32CE0576098": "KLM1023 ", "8D406B902015A678D4D220AA4BDA": "EZY85MH "} {
		f := frame(t, text)
		if sign, ok := f.me().identification(); !ok || sign != want || f.me().typeCode() != 4 {
			t.Errorf("%s: %q %v, TC %d", text, sign, ok, f.me().typeCode())
		}
	}
	if f := frame(t, "8D4840D6202CC371C32CE0576098"); f.Address() != 0x4840D6 || f.b[0]&7 != 5 {
		t.Errorf("address %06X", f.Address())
	}
}

func cprOf(f *Frame) CPR {
	m := f.me()
	return CPR{Lat: m.bits(23, 17), Lon: m.bits(40, 17), Odd: m.bit(22), Surface: m.typeCode() <= 8}
}

func pairOf(t *testing.T, even, odd string) Pair {
	t.Helper()
	p := Pair{Even: cprOf(frame(t, even)), Odd: cprOf(frame(t, odd))}
	if p.Even.Odd || !p.Odd.Odd {
		t.Fatalf("%s and %s are not an even and an odd one", even, odd)
	}
	return p
}

func TestPublishedAirbornePairs(t *testing.T) {
	p := pairOf(t, "8D40621D58C382D690C8AC2863A7", "8D40621D58C386435CC412692AD6")
	if p.Even.Lat != 93000 || p.Even.Lon != 51372 || p.Odd.Lat != 74158 || p.Odd.Lon != 50194 {
		t.Errorf("%+v", p)
	}
	for _, c := range []struct {
		even, odd                        string
		evenLat, evenLon, oddLat, oddLon float64
		zones                            int
		feet                             float64
	}{
		{"8D40621D58C382D690C8AC2863A7", "8D40621D58C386435CC412692AD6", 52.2572021484375, 3.91937255859375, 52.26578017412606, 3.938912527901786, 36, 38000},
		{"8D40058B58C901375147EFD09357", "8D40058B58C904A87F402D3B8C59", 49.8240966796875, 6.067850213301809, 49.81755143505031, 6.084421518686655, 38, 39000},
	} {
		p := pairOf(t, c.even, c.odd)
		lat, lon, ok := p.Position(0, 0)
		if !ok {
			t.Fatalf("%s: no position", c.even)
		}
		close12(t, c.even+" latitude", lat, c.evenLat)
		close12(t, c.even+" longitude", lon, c.evenLon)
		p.OddNewest = true
		lat, lon, _ = p.Position(0, 0)
		close12(t, c.odd+" latitude", lat, c.oddLat)
		close12(t, c.odd+" longitude", lon, c.oddLon)
		if n := zonesAt(c.evenLat); n != c.zones {
			t.Errorf("%d zones, want %d", n, c.zones)
		}
		if feet, _, state := altitude12(frame(t, c.even).me().bits(9, 12)); feet != c.feet || state != altitudeKnown {
			t.Errorf("altitude %v", feet)
		}
	}
}

func TestPublishedLocalPositions(t *testing.T) {
	for _, c := range []struct {
		text                     string
		refLat, refLon, lat, lon float64
	}{
		{"8D40621D58C382D690C8AC2863A7", 52.258, 3.918, 52.2572021484375, 3.91937255859375},
		{"8D06A15358BF17FF7D4A84B47B95", 30.508474576271183, 36.000000000000003, 30.50540212857521, 33.4478759765625}, // at a zone's edge
		{"8C4841753A9A153237AEF0F275BE", 52.320607, 4.734735, 52.32056051997815, 4.735735212053571},                   // surface
	} {
		p := cprOf(frame(t, c.text))
		lat, lon, ok := p.Near(c.refLat, c.refLon)
		if !ok {
			t.Fatalf("%s: no position", c.text)
		}
		close12(t, c.text+" latitude", lat, c.lat)
		close12(t, c.text+" longitude", lon, c.lon)
	}
}

func TestPublishedSurfacePairs(t *testing.T) {
	p := pairOf(t, "8C4841753AAB238733C8CD4020B1", "8C4841753A8A35323FAEBDAC702D")
	p.OddNewest = true
	lat, lon, ok := p.Position(51.990, 4.375)
	if !ok {
		t.Fatal("no position")
	}
	close12(t, "latitude", lat, 52.320607072215964)
	close12(t, "longitude", lon, 4.734734671456474)
	v := frame(t, "8C4841753A9A153237AEF0F275BE").me().movement()
	if v.SpeedKt != 17 || v.TrackDeg != 92.8125 {
		t.Errorf("movement %+v", v)
	}
	// The other quadrants, to the five digits printed.
	for _, c := range []struct {
		oddNewest                bool
		refLat, refLon, lat, lon float64
	}{
		{true, 43.63, 1.37, 43.62646, 1.37476},
		{false, 43.63, 1.37, 43.62648, 1.37462},
		{true, -43.5, 1.37, -46.37354, 1.44350},
		{true, 43.63, -178.63, 43.62646, -178.62524},
	} {
		p := pairOf(t, "903a23ff426a38565950432ebf95", "903a23ff426a4e65f7487a775d17")
		p.OddNewest = c.oddNewest
		lat, lon, ok := p.Position(c.refLat, c.refLon)
		if !ok || !(math.Abs(lat-c.lat) <= 0.51e-5 && math.Abs(lon-c.lon) <= 0.51e-5) {
			t.Errorf("near %v, %v: %.7f, %.7f, %v", c.refLat, c.refLon, lat, lon, ok)
		}
	}
}

func TestPublishedPairsThatMustBeRefused(t *testing.T) {
	p := Pair{Even: CPR{Lat: 8192}, Odd: CPR{Lat: 114688, Odd: true}}
	even, odd := p.latitudes()
	if zonesAt(even) != 23 || zonesAt(odd) != 24 {
		t.Errorf("%v has %d zones and %v has %d", even, zonesAt(even), odd, zonesAt(odd))
	}
	if _, _, ok := p.Position(0, 0); ok {
		t.Error("a pair from two numbers of zones has a position")
	}
	p = Pair{Even: CPR{Lat: 113939, Lon: 119217}, Odd: CPR{Lat: 72761, Lon: 59498, Odd: true}}
	if even, _ := p.latitudes(); !(even > 112 && even < 114) {
		t.Errorf("latitude %v", even)
	}
	if _, _, ok := p.Position(0, 0); ok {
		t.Error("a pair beyond the pole has a position")
	}
}

// The transition latitudes to the eight decimals printed (computed, closed
// form), and the numbers of zones at the latitudes that pyModeS tests.
func TestPublishedZones(t *testing.T) {
	for lat, want := range map[float64]int{0: 59, 45: 42, 80: 10, 87: 2, -87: 2, 87.5: 1, 90: 1} {
		if n := zonesAt(lat); n != want {
			t.Errorf("%v: %d zones, want %d", lat, n, want)
		}
	}
	const printed = `59 10.47047130; 58 14.82817437; 57 18.18626357; 56 21.02939493; 55 23.54504487; 54 25.82924707; 53 27.93898710; 52 29.91135686; 51 31.77209708; 50 33.53993436; 49 35.22899598; 48 36.85025108; 47 38.41241892; 46 39.92256684; 45 41.38651832; 44 42.80914012; 43 44.19454951; 42 45.54626723; 41 46.86733252; 40 48.16039128; 39 49.42776439; 38 50.67150166; 37 51.89342469; 36 53.09516153; 35 54.27817472; 34 55.44378444; 33 56.59318756; 32 57.72747354; 31 58.84763776; 30 59.95459277; 29 61.04917774; 28 62.13216659; 27 63.20427479; 26 64.26616523; 25 65.31845310; 24 66.36171008; 23 67.39646774; 22 68.42322022; 21 69.44242631; 20 70.45451075; 19 71.45986473; 18 72.45884545; 17 73.45177442; 16 74.43893416; 15 75.42056257; 14 76.39684391; 13 77.36789461; 12 78.33374083; 11 79.29428225; 10 80.24923213; 9 81.19801349; 8 82.13956981; 7 83.07199445; 6 83.99173563; 5 84.89166191; 4 85.75541621; 3 86.53536998; 2 87.0`
	for _, one := range strings.Split(printed, "; ") {
		var n int
		var lat float64
		if _, err := fmt.Sscan(one, &n, &lat); err != nil {
			t.Fatal(err)
		}
		if !(math.Abs(narrowings[n]-lat) <= 0.51e-8) {
			t.Errorf("%d zones up to %.10f, want %v", n, narrowings[n], lat)
		}
		if above, below := zonesAt(lat+1e-7), zonesAt(lat-1e-7); above != n-1 || below != n {
			t.Errorf("about %v: %d and %d zones", lat, below, above)
		}
	}
	// The slow twin: the formula itself.
	for lat := -90.0; lat <= 90; lat += 0.0137 {
		want := 1
		if math.Abs(lat) <= 87 {
			c := math.Cos(lat * math.Pi / 180)
			want = int(math.Floor(2 * math.Pi / math.Acos(1-(1-math.Cos(math.Pi/30))/(c*c))))
		}
		if n := zonesAt(lat); n != want {
			t.Errorf("%v: %d zones, want %d", lat, n, want)
		}
	}
}

func TestPublishedAltitudes(t *testing.T) {
	for text, want := range map[string]float64{
		"8d484fde5803b647ecec4fcdd74f": -325, "8d4845575803c647bcec2a980abc": -300, "8d3424d25803d64c18ee03351f89": -275,
		"8d4401e458058645a8ea90496290": 0, "8d346355580596459cea86756acc": 25, "8d346355580b064116e70a269f97": 1000,
		"8d343386581f06318ad4fecab734": 5000,
	} {
		f := frame(t, text)
		if feet, step, state := altitude12(f.me().bits(9, 12)); feet != want || state != altitudeKnown || step != 25 || f.Remainder() != 0 {
			t.Errorf("%s: %v ft, %v, remainder %X", text, feet, state, f.Remainder())
		}
	}
	// Computed: 13-bit codes in hexadecimal.
	for code, want := range map[uint32]float64{
		0x0100: -1200, 0x0500: -1100, 0x0400: -1000, 0x0402: -500, 0x040A: 0, 0x140A: 100, 0x100A: 200, 0x0428: 1000, 0x0488: 5000,
		0x06A2: 10000, 0x0CA8: 25000, 0x0CA1: 35000, 0x0623: 50000, 0x0104: 126700, 0x1030: 25000, 0x0010: -1000,
	} {
		if feet, _, state := altitude13(code); feet != want || state != altitudeKnown {
			t.Errorf("%04X: %v ft, %v, want %v", code, feet, state, want)
		}
	}
	valid, low, high, each := 0, math.Inf(1), math.Inf(-1), map[float64]bool{}
	for code := range uint32(1 << 13) {
		if code&(1<<4) != 0 || code&(1<<6) != 0 {
			continue
		}
		if feet, step, state := altitude13(code); state == altitudeKnown {
			valid, low, high, each[feet] = valid+1, min(low, feet), max(high, feet), true
			if step != 100 {
				t.Errorf("%04X: steps of %v", code, step)
			}
		}
	}
	if valid != 1280 || low != -1200 || high != 126700 || len(each) != 1280 {
		t.Errorf("%d codes for %d altitudes from %v to %v ft", valid, len(each), low, high)
	}
	if _, _, state := altitude13(0); state != altitudeMissing {
		t.Errorf("0: %v", state)
	}
	// C of 101 is none of the five, nor is M a unit in use.
	for _, code := range []uint32{0x1000 | 0x0100, 1<<6 | 0x0488, 1 << 6} {
		if _, _, state := altitude13(code); state != altitudeBad {
			t.Errorf("%04X: %v", code, state)
		}
	}
}

func TestPublishedVelocities(t *testing.T) {
	for _, c := range []struct {
		text                string
		subtype             uint8
		speed, track, climb float64
		pressure            bool
		above               float64
	}{
		{"8D485020994409940838175B284F", 1, 159.20113064925135, 182.8803775528476, -832, false, 550},
		{"8d3461cf9908388930080f948ea1", 1, 90.60353193998566, 142.62419250445186, 64, false, 350},
		{"8d3461cf9908558e100c1071eb67", 1, 139.20129309744217, 142.8831393167297, 128, false, 375},
		{"8d394c0f990c4932780838866883", 1, 408.3968658057992, 349.8457334197997, -64, false, nan},
	} {
		f := frame(t, c.text)
		v, ok := f.me().velocity()
		if !ok || v.Subtype != c.subtype || v.ClimbFpm != c.climb || f.Remainder() != 0 {
			t.Errorf("%s: %+v, remainder %X", c.text, v, f.Remainder())
		}
		kt, track := v.OverGround()
		close12(t, c.text+" speed", kt, c.speed)
		close12(t, c.text+" track", track, c.track)
		if c.above == c.above && v.AboveFt != c.above {
			t.Errorf("%s: %v ft above the pressure altitude, want %v", c.text, v.AboveFt, c.above)
		}
	}
	v, _ := frame(t, "8D485020994409940838175B284F").me().velocity()
	if v.EastKt != -8 || v.NorthKt != -159 || v.NACv != 0 || v.ClimbPressure {
		t.Errorf("%+v", v)
	}
	if v, _ := frame(t, "8d3461cf99085a8f10400f80e6ac").me().velocity(); v.ClimbFpm != 960 {
		t.Errorf("%+v", v)
	}
	if v, _ := frame(t, "8DA05F219B06B6AF189400CBC33F").me().velocity(); v.Subtype != 3 || v.HeadingDeg != 243.984375 || v.AirspeedKt != 375 || !v.True || v.ClimbFpm != -2304 || !v.ClimbPressure {
		t.Errorf("%+v", v)
	}
	// Its parity is not valid: the message alone.
	if v, _ := frame(t, "8D4841409B04000CA04400000000").me().velocity(); v.AirspeedKt != 100 || v.True || v.HeadingDeg != 0 || v.ClimbFpm != 1024 {
		t.Errorf("%+v", v)
	}
}

func TestPublishedTargetState(t *testing.T) {
	s, ok := frame(t, "8DA05629EA21485CBF3F8CADAEEB").me().target()
	if !ok || s.AltitudeFt != 16992 || s.ByFMS || math.Abs(s.PressureHPa-1012.8) > 1e-9 || math.Abs(s.HeadingDeg-66.8) > 0.05 || s.NACp != 9 || !s.NICbaro || s.SIL != 3 {
		t.Errorf("%+v, %v", s, ok)
	}
}

// Every row of testdata/adsb_vectors.csv (its head says where it is from), to
// its last digits, and each frame's parity and address.
func TestVectors(t *testing.T) {
	file, err := os.Open("testdata/adsb_vectors.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	r := csv.NewReader(file)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	column := map[string]int{}
	for i, name := range rows[0] {
		column[name] = i
	}
	for _, row := range rows[1:] {
		num := func(name string) float64 {
			x, err := strconv.ParseFloat(row[column[name]], 64)
			if err != nil {
				t.Fatal(err)
			}
			return x
		}
		check := func(name string, got, unit float64) {
			t.Helper()
			if !(math.Abs(got-num(name)) <= 0.6*unit) {
				t.Errorf("row %s: %s is %.13f, want %s", row[0], name, got, row[column[name]])
			}
		}
		for _, name := range []string{"even_frame", "odd_frame", "velocity_frame"} {
			f := frame(t, row[column[name]])
			if want := row[column["icao"]]; f.Remainder() != 0 || fmt.Sprintf("%06X", f.Address()) != want || f.Format() != 17 {
				t.Errorf("row %s: %s has address %06X and remainder %X", row[0], name, f.Address(), f.Remainder())
			}
		}
		p := pairOf(t, row[column["even_frame"]], row[column["odd_frame"]])
		lat, lon, ok := p.Position(0, 0)
		if !ok {
			t.Errorf("row %s: no position", row[0])
		}
		check("dec_lat_even_newest", lat, 1e-12)
		check("dec_lon_even_newest", lon, 1e-12)
		p.OddNewest = true
		lat, lon, _ = p.Position(0, 0)
		check("dec_lat_odd_newest", lat, 1e-12)
		check("dec_lon_odd_newest", lon, 1e-12)
		// One frame alone, by what is near.
		lat, lon, _ = p.Even.Near(num("true_lat_deg")+1, num("true_lon_deg")-1)
		check("dec_lat_even_newest", lat, 1e-12)
		check("dec_lon_even_newest", lon, 1e-12)
		feet, _, _ := altitude12(frame(t, row[column["even_frame"]]).me().bits(9, 12))
		check("baro_alt_ft", feet, 1)
		v, ok := frame(t, row[column["velocity_frame"]]).me().velocity()
		kt, track := v.OverGround()
		check("v_east_kt", v.EastKt, 1)
		check("v_north_kt", v.NorthKt, 1)
		check("gs_kt", kt, 1e-9)
		check("track_deg", track, 1e-9)
		check("vs_fpm", v.ClimbFpm, 1)
		if !ok {
			t.Errorf("row %s: no velocity", row[0])
		}
	}
	if len(rows) != 121 {
		t.Errorf("%d rows, want 120 and a head", len(rows))
	}
}
