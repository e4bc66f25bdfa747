package modes

// An altitude code's answers.
type altitudeState uint8

const (
	altitudeMissing altitudeState = iota // all zero: not available
	altitudeBad                          // no valid code, or a unit that is not defined
	altitudeKnown
)

// altitude12 reads the 12-bit code of airborne positions, in feet, with the
// height of its steps.
func altitude12(code uint32) (feet, step float64, _ altitudeState) {
	if code == 0 {
		return 0, 0, altitudeMissing
	}
	// The 13-bit code without its M bit, which stands after the sixth.
	return altitude13(code>>6<<7 | code&0x3F)
}

// altitude13 reads the 13-bit code of formats 0, 4, 16 and 20.
func altitude13(code uint32) (feet, step float64, _ altitudeState) {
	const m, q = 1 << 6, 1 << 4
	switch {
	case code == 0:
		return 0, 0, altitudeMissing
	case code&m != 0: // metres: reserved, no transponder is known to send it
		return 0, 0, altitudeBad
	case code&q != 0:
		n := code>>7<<5 | code>>1&0x10 | code&0xF
		return 25*float64(n) - 1000, 25, altitudeKnown
	}
	feet, ok := gillham(code)
	if !ok {
		return 0, 0, altitudeBad
	}
	return feet, 100, altitudeKnown
}

// gillham reads steps of 100 ft, whose bits stand in the 13-bit code as
// C1 A1 C2 A2 C4 A4 M B1 Q(D1) B2 D2 B4 D4. D and A and B are a Gray code of
// 500 ft steps, C one of five steps of 100 ft that runs back and forth.
func gillham(code uint32) (feet float64, ok bool) {
	bit := func(i uint) uint32 { return code >> (12 - i) & 1 }
	c := bit(0)<<2 | bit(2)<<1 | bit(4)
	five := bit(8)<<7 | bit(10)<<6 | bit(12)<<5 | bit(1)<<4 | bit(3)<<3 | bit(5)<<2 | bit(7)<<1 | bit(9)
	// B4 is the last of the eight; D1 is 0 here, as Q.
	five = five<<1 | bit(11)
	n := binary(five)
	hundreds := binary(c)
	switch hundreds {
	case 0, 5, 6:
		return 0, false
	case 7:
		hundreds = 5
	}
	if n%2 == 1 {
		hundreds = 6 - hundreds
	}
	return 500*float64(n) + 100*float64(hundreds) - 1300, true
}

// binary turns a Gray code into the number that it stands for.
func binary(gray uint32) uint32 {
	for s := uint(1); s < 16; s <<= 1 {
		gray ^= gray >> s
	}
	return gray
}
