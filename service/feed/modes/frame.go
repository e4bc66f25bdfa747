package modes

import "errors"

// Frame is one Mode S frame as it was received, parity unchecked. The zero
// Frame is none.
type Frame struct {
	b [14]byte
	n uint8 // bytes: 7 or 14
}

// NewFrame makes a frame of 7 or 14 bytes.
func NewFrame(b []byte) (f Frame, ok bool) {
	if len(b) != 7 && len(b) != 14 {
		return Frame{}, false
	}
	f.n = uint8(copy(f.b[:], b))
	return f, true
}

// Format is the downlink format, 0 to 24. A value of 24 and more is 24: its
// other bits are data.
func (f *Frame) Format() uint8 { return min(f.b[0]>>3, 24) }

// Long reports whether the frame has 112 bits.
func (f *Frame) Long() bool { return f.n == 14 }

// Address is the address field AA of formats 11, 17 and 18.
func (f *Frame) Address() uint32 {
	return uint32(f.b[1])<<16 | uint32(f.b[2])<<8 | uint32(f.b[3])
}

// me is the 56-bit message of formats 17 and 18.
func (f *Frame) me() message {
	var m uint64
	for _, b := range f.b[4:11] {
		m = m<<8 | uint64(b)
	}
	return message(m)
}

// message is the field ME. Its bits are numbered from 1.
type message uint64

// bits returns n bits from bit i on.
func (m message) bits(i, n uint) uint32 { return uint32(m >> (57 - i - n) & (1<<n - 1)) }

func (m message) bit(i uint) bool { return m>>(56-i)&1 == 1 }

func (m message) typeCode() uint8 { return uint8(m.bits(1, 5)) }

// Why a line holds no frame.
var (
	ErrLineForm   = errors.New("not a frame as *8D...;, @ and a time before it, or bare hexadecimal digits")
	ErrLineDigits = errors.New("not hexadecimal digits")
	ErrLineLength = errors.New("not 14 or 28 hexadecimal digits")
)

// ParseLine reads a line as receivers send it, without its end: "*", the
// frame's hexadecimal digits and ";"; the same with "@" or "%" and a time of
// 12 digits, or "<", a time and a level of 2 digits, in place of "*"; or the
// digits alone. Times and levels are passed over. The line "*0000;", by which
// receivers show that the link lives, is no frame and no error.
func ParseLine(line []byte) (f Frame, ok bool, err error) {
	skip := 0
	if len(line) > 0 {
		switch line[0] {
		case '*':
			skip = 1
		case '@', '%':
			skip = 13
		case '<':
			skip = 15
		}
	}
	if skip > 0 {
		if line[len(line)-1] != ';' || len(line) < skip+1 {
			return Frame{}, false, ErrLineForm
		}
		for _, c := range line[1:skip] {
			if digit(c) < 0 {
				return Frame{}, false, ErrLineDigits
			}
		}
		line = line[skip : len(line)-1]
		if string(line) == "0000" {
			return Frame{}, false, nil
		}
	}
	if len(line) != 14 && len(line) != 28 {
		return Frame{}, false, ErrLineLength
	}
	f.n = uint8(len(line) / 2)
	for i := range f.n {
		hi, lo := digit(line[2*i]), digit(line[2*i+1])
		if hi < 0 || lo < 0 {
			return Frame{}, false, ErrLineDigits
		}
		f.b[i] = byte(hi<<4 | lo)
	}
	return f, true, nil
}

func digit(c byte) int {
	switch {
	case c >= '0' && c <= '9':
		return int(c - '0')
	case c >= 'A' && c <= 'F':
		return int(c-'A') + 10
	case c >= 'a' && c <= 'f':
		return int(c-'a') + 10
	}
	return -1
}
