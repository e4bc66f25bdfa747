package modes

// letters are the six-bit characters of identifications; # is none.
const letters = "#ABCDEFGHIJKLMNOPQRSTUVWXYZ##### ###############0123456789######"

// identification reads the call sign of type codes 1 to 4, eight characters
// with its blanks; false where one of them is no character.
func (m message) identification() (sign string, ok bool) {
	var b [8]byte
	for i := range b {
		b[i] = letters[m.bits(9+6*uint(i), 6)]
		if b[i] == '#' {
			return "", false
		}
	}
	return string(b[:]), true
}

// Target is what a target state and status (type code 29, subtype 1) states.
// Numbers that are not stated are NaN.
type Target struct {
	AltitudeFt  float64 // selected
	ByFMS       bool    // selected by flight management; else at the control unit
	PressureHPa float64 // set at the altimeter
	HeadingDeg  float64 // selected
	NACp        uint8
	NICbaro     bool
	SIL         uint8
}

// target reads type code 29; false for a subtype that is not defined.
func (m message) target() (t Target, ok bool) {
	if m.bits(6, 2) != 1 {
		return Target{}, false
	}
	t = Target{AltitudeFt: nan, PressureHPa: nan, HeadingDeg: nan, ByFMS: m.bit(9), NACp: uint8(m.bits(40, 4)), NICbaro: m.bit(44), SIL: uint8(m.bits(45, 2))}
	if n := m.bits(10, 11); n > 0 {
		t.AltitudeFt = 32 * float64(n-1)
	}
	if n := m.bits(21, 9); n > 0 {
		t.PressureHPa = 800 + 0.8*float64(n-1)
	}
	if m.bit(30) {
		t.HeadingDeg = float64(m.bits(31, 9)) * 180 / 256
	}
	return t, true
}

// Status is what an operational status (type code 31) states of quality.
type Status struct {
	Surface bool // subtype 1
	Version uint8
	NICa    bool
	NICc    bool // on the surface
	NACp    uint8
	NACv    uint8 // on the surface
	GVA     uint8 // in the air, version 2
	SIL     uint8
}

// status reads type code 31; false for a subtype or a version that is not
// defined.
func (m message) status() (s Status, ok bool) {
	sub := m.bits(6, 3)
	s = Status{Surface: sub == 1, Version: uint8(m.bits(41, 3)), NICa: m.bit(44), NACp: uint8(m.bits(45, 4)), SIL: uint8(m.bits(51, 2))}
	if sub > 1 || s.Version > 2 {
		return Status{}, false
	}
	switch {
	case s.Surface && s.Version == 2:
		s.NACv, s.NICc = uint8(m.bits(17, 3)), m.bit(20)
	case !s.Surface && s.Version == 2:
		s.GVA = uint8(m.bits(49, 2))
	}
	return s, true
}
