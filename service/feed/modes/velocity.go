package modes

import "math"

// Velocity is what an airborne velocity (type code 19) states. Numbers that
// are not stated are NaN. A value at the end of its scale stands for anything
// beyond, as far as is possible.
type Velocity struct {
	Subtype uint8 // 1 and 2 over ground, 3 and 4 through the air; 2 and 4 in steps of 4 kt

	EastKt, NorthKt float64 // over ground

	AirspeedKt float64 // through the air
	True       bool    // true airspeed; else indicated
	HeadingDeg float64 // magnetic or true, as the aircraft chooses

	ClimbFpm      float64
	ClimbMore     bool // at the end of its scale
	ClimbPressure bool // by the pressure altitude; else geometric

	NACv uint8

	// AboveFt is how far the geometric height above the ellipsoid lies above
	// the pressure altitude; NaN at the end of its scale.
	AboveFt float64
}

// velocity reads a message of type code 19; false for a subtype that is not
// defined.
func (m message) velocity() (v Velocity, ok bool) {
	v = Velocity{Subtype: uint8(m.bits(6, 3)), EastKt: nan, NorthKt: nan, AirspeedKt: nan, HeadingDeg: nan, ClimbFpm: nan, AboveFt: nan,
		NACv: uint8(m.bits(11, 3))}
	unit := 1.0
	if v.Subtype == 2 || v.Subtype == 4 {
		unit = 4
	}
	switch v.Subtype {
	case 1, 2:
		if east, north := m.bits(15, 10), m.bits(26, 10); east > 0 && north > 0 {
			v.EastKt, v.NorthKt = unit*float64(east-1), unit*float64(north-1)
			if m.bit(14) {
				v.EastKt = -v.EastKt
			}
			if m.bit(25) {
				v.NorthKt = -v.NorthKt
			}
		}
	case 3, 4:
		if m.bit(14) {
			v.HeadingDeg = float64(m.bits(15, 10)) * 360 / 1024
		}
		v.True = m.bit(25)
		if n := m.bits(26, 10); n > 0 {
			v.AirspeedKt = unit * float64(n-1)
		}
	default:
		return Velocity{}, false
	}
	v.ClimbPressure = m.bit(36)
	if n := m.bits(38, 9); n > 0 {
		v.ClimbFpm = 64 * float64(n-1)
		if m.bit(37) {
			v.ClimbFpm = -v.ClimbFpm
		}
		v.ClimbMore = n == 511
	}
	if n := m.bits(50, 7); n > 0 && n < 127 {
		v.AboveFt = 25 * float64(n-1)
		if m.bit(49) {
			v.AboveFt = -v.AboveFt
		}
	}
	return v, true
}

// OverGround is the speed in knots and the track of true north in degrees; NaN
// where they are not stated.
func (v *Velocity) OverGround() (kt, trackDeg float64) {
	return math.Hypot(v.EastKt, v.NorthKt), modulo(math.Atan2(v.EastKt, v.NorthKt)*180/math.Pi, 360)
}

var nan = math.NaN()

// step is the width of a step of the speed's scale, in knots.
func (v *Velocity) step() float64 {
	if v.Subtype == 2 || v.Subtype == 4 {
		return 4
	}
	return 1
}
