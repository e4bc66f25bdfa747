package wire

import (
	"errors"
	"math"
	"strconv"
)

// ParseNumber reads a number by the grammar of JSON (RFC 8259, section 6) and
// no other: an optional minus, digits without a leading zero, an optional
// fraction, an optional exponent. NaN, Inf, hexadecimal, underscores, a leading
// plus and blanks are refused, and so is a number too large to be finite. The
// result is the float64 nearest to the text.
func ParseNumber(s string) (float64, error) {
	b := []byte(s)
	v, end, cause := scanNumber(b, 0)
	if cause == "" && end != len(b) {
		cause = notNumber
	}
	if cause != "" {
		return math.NaN(), errors.New("number " + quote(b) + ": " + cause)
	}
	return v, nil
}

const notNumber = "not a number as JSON writes them"

// Powers of ten that a float64 holds exactly.
var exactTens = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// scanNumber reads the number at b[i:] and returns where it ends. The cause is
// empty when there is one. What follows the number is the caller's to judge.
//
// Up to 2^53 and ten to the 22nd both parts are exact in a float64, so that one
// multiplication or division rounds once and rightly (W. D. Clinger, How to
// read floating point numbers accurately, 1990); the rest goes to strconv.
func scanNumber(b []byte, i int) (v float64, end int, cause string) {
	start := i
	if i < len(b) && b[i] == '-' {
		i++
	}
	if i >= len(b) {
		return 0, i, notNumber
	}
	var mantissa uint64
	digits, exponent := 0, 0 // digits counts what the mantissa holds
	const farExponent = 1e6  // larger ones are cut to it and left to strconv
	switch c := b[i]; {
	case c == '0':
		i++
		if i < len(b) && isDigit(b[i]) {
			return 0, i, "a leading zero"
		}
	case c >= '1' && c <= '9':
		for ; i < len(b) && isDigit(b[i]); i++ {
			mantissa = mantissa*10 + uint64(b[i]-'0')
			digits++
		}
	default:
		return 0, i, notNumber
	}
	if i < len(b) && b[i] == '.' {
		i++
		first := i
		for ; i < len(b) && isDigit(b[i]); i++ {
			mantissa = mantissa*10 + uint64(b[i]-'0')
			if mantissa != 0 {
				digits++
			}
		}
		if i == first {
			return 0, i, "no digit after the point"
		}
		exponent = first - i
	}
	if i < len(b) && (b[i] == 'e' || b[i] == 'E') {
		i++
		negative := i < len(b) && b[i] == '-'
		if i < len(b) && (b[i] == '-' || b[i] == '+') {
			i++
		}
		first, e := i, 0
		for ; i < len(b) && isDigit(b[i]); i++ {
			e = min(e*10+int(b[i]-'0'), farExponent)
		}
		if i == first {
			return 0, i, "no digit in the exponent"
		}
		if e == farExponent {
			digits = 20
		}
		if negative {
			e = -e
		}
		exponent += e
	}
	// Up to 19 digits the mantissa has not overflowed.
	if digits <= 19 && mantissa < 1<<53 && exponent >= -22 && exponent <= 22 {
		v = float64(mantissa)
		if exponent < 0 {
			v /= exactTens[-exponent]
		} else {
			v *= exactTens[exponent]
		}
		if b[start] == '-' {
			v = -v
		}
		return v, i, ""
	}
	v, err := strconv.ParseFloat(string(b[start:i]), 64)
	if err != nil || math.IsInf(v, 0) || math.IsNaN(v) {
		return 0, i, "too large"
	}
	return v, i, ""
}

func isDigit(c byte) bool { return c >= '0' && c <= '9' }

// appendNumber writes the shortest number that reads back as v, without an
// exponent over the range in which people read it. NaN and infinities, which
// JSON cannot say, become null.
func appendNumber(dst []byte, v float64) []byte {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return append(dst, "null"...)
	}
	if a := math.Abs(v); a != 0 && (a < 1e-6 || a >= 1e21) {
		return strconv.AppendFloat(dst, v, 'e', -1, 64)
	}
	return strconv.AppendFloat(dst, v, 'f', -1, 64)
}
