package modes

// generator is the Mode S parity polynomial x^24 + x^23 + … + x^12 + x^10 +
// x^3 + 1 without its leading bit.
const generator = 0xFFF409

// parities holds the remainder of each byte, shifted by 24 bits.
var parities = func() (t [256]uint32) {
	for i := range t {
		r := uint32(i) << 16
		for range 8 {
			r <<= 1
			if r&(1<<24) != 0 {
				r ^= 1<<24 | generator
			}
		}
		t[i] = r
	}
	return t
}()

// Remainder is the 24-bit remainder of the whole frame: 0 for a right DF 17 or
// 18; the interrogator's code for DF 11, 0 for those sent unasked; the
// aircraft's address for DF 0, 4, 5, 16, 20 and 21.
func (f *Frame) Remainder() uint32 {
	if f.n < 7 {
		return ^uint32(0)
	}
	var r uint32
	last := f.n - 3
	for _, b := range f.b[:last] {
		r = (r<<8 ^ parities[byte(r>>16)^b]) & 0xFFFFFF
	}
	return r ^ (uint32(f.b[last])<<16 | uint32(f.b[last+1])<<8 | uint32(f.b[last+2]))
}
