package modes

import (
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/geometry"
)

// Lines that hold no frame.
func TestMalformedLines(t *testing.T) {
	const long, short = "8D40621D58C382D690C8AC2863A7", "5D484FDEA248F5"
	for name, c := range map[string]struct {
		line string
		want error
	}{
		"empty":                        {"", ErrLineLength},
		"blank":                        {" ", ErrLineLength},
		"a star alone":                 {"*", ErrLineForm},
		"an end alone":                 {";", ErrLineLength},
		"a star and an end":            {"*;", ErrLineLength},
		"no end":                       {"*" + long, ErrLineForm},
		"no beginning":                 {long + ";", ErrLineLength},
		"a digit short":                {"*" + long[1:] + ";", ErrLineLength},
		"a digit more":                 {"*0" + long + ";", ErrLineLength},
		"two frames":                   {"*" + long + long + ";", ErrLineLength},
		"no digit":                     {"*8D40621D58C382D690C8AC2863G7;", ErrLineDigits},
		"a sign":                       {"*-D40621D58C382D690C8AC2863A7;", ErrLineDigits},
		"a prefix of numbers":          {"*0x40621D58C382D690C8AC2863A7;", ErrLineDigits},
		"a letter of another alphabet": {"*8D40621D58C382D690C8AC2863\u0430;", ErrLineDigits},
		"blanks within":                {"*8D40621D58C382D690C8AC 863A7;", ErrLineDigits},
		"a blank behind":               {"*" + long + "; ", ErrLineForm},
		"a carriage return":            {"*" + long + ";\r", ErrLineForm},
		"a time too short":             {"@0123456789A" + long + ";", ErrLineLength},
		"a time of no digits":          {"@01234567890x" + long + ";", ErrLineDigits},
		"a time and nothing":           {"@0123456789AB;", ErrLineLength},
		"a time cut":                   {"@01234;", ErrLineForm},
		"a level missing":              {"<0123456789AB" + short + ";", ErrLineLength},
		"zero bytes":                   {strings.Repeat("\x00", 14), ErrLineDigits},
		"a fact":                       {`{"kind":"aircraft"}`, ErrLineLength},
		"very long":                    {"*" + strings.Repeat("8D", 1<<15) + ";", ErrLineLength},
	} {
		if f, ok, err := ParseLine([]byte(c.line)); ok || !errors.Is(err, c.want) || f != (Frame{}) {
			t.Errorf("%s: %v, %v", name, ok, err)
		}
	}
	for _, line := range []string{"*" + long + ";", long, strings.ToLower(long), "@0123456789AB" + long + ";", "%0123456789ab" + long + ";", "<0123456789AB7F" + long + ";", "*" + short + ";"} {
		f, ok, err := ParseLine([]byte(line))
		if !ok || err != nil || f.Long() == strings.Contains(line, short) || f.Format() == 0 {
			t.Errorf("%s: %v, %v", line, ok, err)
		}
	}
	if _, ok, err := ParseLine([]byte("*0000;")); ok || err != nil {
		t.Errorf("the sign of a living link: %v, %v", ok, err)
	}
}

// Frames and messages that are wrong in one way each, with what counts them.
// None makes a report with a position.
func TestMalformedFrames(t *testing.T) {
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, north: 100, feet: 30000, tc: 11}
	good := c.position()
	flip := func(byte_ int, mask byte) *Frame {
		f := *good
		f.b[byte_] ^= mask
		return &f
	}
	of := func(m message) *Frame { return squitterOf(df17, 0xA0B1C2, m) }
	short := *good
	short.n = 7
	long := seal(11<<3|5, 0xA0, 0xB1, 0xC2)
	long.n = 14
	p := encode(siteLat, siteLon, false, false)
	bad := func(n Counts) uint64 { return n.BadParity }
	unproven := func(n Counts) uint64 { return n.Unproven }
	message_ := func(n Counts) uint64 { return n.BadMessage }
	unused := func(n Counts) uint64 { return n.Unused }
	pending := func(n Counts) uint64 { return n.Pending }
	for name, one := range map[string]struct {
		f     *Frame
		count func(Counts) uint64
	}{
		"a bit of the format":    {flip(0, 1<<7), unproven},
		"a bit of the address":   {flip(2, 1), bad},
		"a bit of the altitude":  {flip(5, 1), bad},
		"a bit of the latitude":  {flip(7, 1<<4), bad},
		"a bit of the longitude": {flip(9, 1<<6), bad},
		"a bit of the parity":    {flip(13, 1), bad},
		"all zero":               {&Frame{n: 14}, unproven},
		"all one": {func() *Frame {
			f := Frame{n: 14}
			for i := range f.b {
				f.b[i] = 0xFF
			}
			return &f
		}(), unproven},
		"no frame":                    {&Frame{}, unproven},
		"DF 17 of 56 bits":            {&short, unproven},
		"DF 11 of 112 bits":           {long, unproven},
		"DF 18 of wrong parity":       {func() *Frame { f := *squitterOf(df18, 1, positionMessage(11, false, 1, p)); f.b[12] ^= 1; return &f }(), bad},
		"DF 19":                       {squitterOf(19<<3, 0xA0B1C2, positionMessage(11, false, 1, p)), unproven},
		"DF 24":                       {squitterOf(24<<3, 0xA0B1C2, positionMessage(11, false, 1, p)), unproven},
		"a reply of a stranger":       {frame(t, "2000171806A983"), unproven},
		"a call with a bad code":      {func() *Frame { f := *seal(11<<3, 1, 2, 3); f.b[6] ^= 0x51; return &f }(), unproven},
		"no position (type code 0)":   {of(message(0).put(9, 12, feetCode(3000))), unused},
		"a type code in reserve":      {of(message(0).put(1, 5, 25)), unused},
		"a velocity of subtype 0":     {of(message(0).put(1, 5, 19)), message_},
		"a velocity of subtype 7":     {of(message(0).put(1, 5, 19).put(6, 3, 7)), message_},
		"a status of version 3":       {of(message(0).put(1, 5, 31).put(41, 3, 3)), message_},
		"a status of subtype 2":       {of(message(0).put(1, 5, 31).put(6, 3, 2)), message_},
		"a target state of subtype 2": {of(message(0).put(1, 5, 29).put(6, 2, 2)), message_},
		"a call sign of no letters":   {of(message(0).put(1, 5, 4).put(9, 6, 27)), message_},
		"one position alone":          {of(positionMessage(11, false, 1, p)), pending},
		"a surface position alone":    {of(message(0).put(1, 5, 8).put(23, 17, 1)), pending},
	} {
		l := newListener(t)
		s, ok := l.hear(one.f)
		if ok && s.Located || one.count(l.Counts()) != 1 {
			t.Errorf("%s: %+v, %+v", name, s, l.Counts())
		}
	}
}

// Positions with altitudes that state none, and pairs that contradict.
func TestMalformedPositions(t *testing.T) {
	for name, code := range map[string]uint32{"missing": 0, "a code of no altitude": 0x1000>>7<<6 | 0x0100>>7<<6, "ones, but for feet": 0xFEF} {
		l := newListener(t)
		var s closures.AircraftSeen
		for i := range 2 {
			s, _ = l.hear(squitterOf(df17, 1, positionMessage(11, false, code, encode(siteLat, siteLon+0.001*float64(i), i == 1, false))))
		}
		n := l.Counts()
		if !s.Located || s.AltitudeFrom != closures.NoAltitude || geometry.Finite(float64(s.Position.Height)) || n.NoAltitude+n.BadAltitude != 1 || (n.NoAltitude == 1) != (code == 0) {
			t.Errorf("%s: %+v, %+v", name, s, n)
		}
	}
	for name, pair := range map[string][2]CPR{
		"beyond the pole":         {{Lat: 113939, Lon: 119217}, {Lat: 72761, Lon: 59498, Odd: true}},
		"of two numbers of zones": {{Lat: 8192}, {Lat: 114688, Odd: true}},
		"too far from each other": {encode(siteLat, siteLon, false, false), encode(siteLat+0.04, siteLon, true, false)},
		"out of range":            {encode(siteLat+20, siteLon, false, false), encode(siteLat+20, siteLon, true, false)},
		"at the antipodes":        {encode(-siteLat, siteLon+180, false, false), encode(-siteLat, siteLon+180, true, false)},
	} {
		l := newListener(t)
		for i, p := range pair {
			l.after(0.5)
			if s, ok := l.hear(squitterOf(df17, 1, positionMessage(11, false, feetCode(30000), p))); ok && s.Located {
				t.Errorf("%s, %d: %+v", name, i, s)
			}
		}
		if n := l.Counts(); n.Impossible != 1 || n.Pending != 2 {
			t.Errorf("%s: %+v", name, n)
		}
	}
}

// Whatever comes, a report with a position states one that can be, with bounds.
func checkReport(s closures.AircraftSeen, at time.Time) error {
	switch {
	case s.Source != "rx-1" || !closures.ValidName(s.Aircraft) || !s.Said.Equal(at):
		return fmt.Errorf("its name or time: %+v", s)
	case !s.Located && geometry.Finite(s.Position.Lat.Radians()):
		return fmt.Errorf("a position that is none: %+v", s)
	case !s.Located:
		return nil
	}
	lat, lon := s.Position.Lat.Degrees(), s.Position.Lon.Degrees()
	switch {
	case !(lat >= -90 && lat <= 90 && lon >= -180 && lon <= 180):
		return fmt.Errorf("its position: %+v", s)
	case !(s.Error > binWidth && s.Error < 1e6):
		return fmt.Errorf("its error: %+v", s)
	case (s.AltitudeFrom == closures.NoAltitude) != !geometry.Finite(float64(s.Position.Height)):
		return fmt.Errorf("its altitude: %+v", s)
	case s.AltitudeFrom == closures.AboveEllipsoid && !(s.VerticalError > 0):
		return fmt.Errorf("its vertical error: %+v", s)
	case geometry.Finite(float64(s.Speed)) != geometry.Finite(s.Track.Radians()) || geometry.Finite(float64(s.Speed)) && !(s.VelocityError > 0 && s.Speed >= 0):
		return fmt.Errorf("its velocity: %+v", s)
	case geometry.Finite(float64(s.Climb)) && !(s.VerticalVelError > 0 && s.AltitudeFrom != closures.NoAltitude):
		return fmt.Errorf("its climb: %+v", s)
	}
	return nil
}

// Frames of any bits: the decoder lives, and what it reports can be.
func FuzzDecode(f *testing.F) {
	c := &craft{address: 0xA0B1C2, lat: siteLat, lon: siteLon, north: 100, feet: 30000, tc: 11}
	add := func(all ...*Frame) {
		var b []byte
		for _, o := range all {
			b = append(b, o.n)
			b = append(b, o.b[:o.n]...)
		}
		f.Add(b)
	}
	add(c.position(), c.position(), c.motion(), c.position())
	add(frame(f, "8D485020994409940838175B284F"), frame(f, "8DA05629EA21485CBF3F8CADAEEB"))
	add(frame(f, "8C4841753AAB238733C8CD4020B1"), frame(f, "8C4841753A8A35323FAEBDAC702D"), seal(11<<3, 1, 2, 3))
	f.Fuzz(func(t *testing.T, b []byte) {
		l := newListener(t)
		for len(b) > 1 {
			n := 7
			if b[0]&8 != 0 {
				n = 14
			}
			seal := b[0]&0x80 == 0
			l.after(float64(b[0]&0x70) / 100)
			var o Frame
			o.n = uint8(n)
			b = b[1+copy(o.b[:n], b[1:]):]
			if seal { // else hardly any would pass
				r := o.Remainder()
				o.b[n-3] ^= byte(r >> 16)
				o.b[n-2] ^= byte(r >> 8)
				o.b[n-1] ^= byte(r)
			}
			if s, ok := l.hear(&o); ok {
				if err := checkReport(s, l.at); err != nil {
					t.Fatal(err)
				}
			}
		}
	})
}

func FuzzParseLine(f *testing.F) {
	for _, line := range []string{"*8D40621D58C382D690C8AC2863A7;", "@0123456789AB5D484FDEA248F5;", "<0123456789AB7F5D484FDEA248F5;", "5d484fdea248f5", "*0000;", ""} {
		f.Add([]byte(line))
	}
	f.Fuzz(func(t *testing.T, line []byte) {
		o, ok, err := ParseLine(line)
		if ok && err != nil || !ok && o != (Frame{}) {
			t.Fatalf("%v, %v, %+v", ok, err, o)
		}
		if !ok {
			return
		}
		digits := fmt.Sprintf("%x", o.b[:o.n])
		again, ok, err := ParseLine([]byte("*" + digits + ";"))
		if !ok || err != nil || again != o || !strings.Contains(strings.ToLower(string(line)), digits) {
			t.Fatalf("%q became %s", line, digits)
		}
	})
}
