package asterix

import "errors"

// The items of category 021 that are used, and all others by number alone.
type item uint16

// length is how the length of an item is found.
type length struct {
	item item
	rule rule
	n    int // octets, or of each repetition
}

type rule uint8

const (
	none        rule = iota
	fixed            // n octets
	extended         // octets of which the last bit of each says that another follows
	repeated         // a count, then so many times n octets
	explicit         // an octet that counts itself and what follows
	compound220      // a set of parts
	compound110
	compound295
)

// profile is the user application profile: the items in the order of the bits
// that announce them.
var profile = [49]length{
	{10, fixed, 2}, {40, extended, 0}, {161, fixed, 2}, {15, fixed, 1}, {71, fixed, 3}, {130, fixed, 6}, {131, fixed, 8},
	{72, fixed, 3}, {150, fixed, 2}, {151, fixed, 2}, {80, fixed, 3}, {73, fixed, 3}, {74, fixed, 4}, {75, fixed, 3},
	{76, fixed, 4}, {140, fixed, 2}, {90, extended, 0}, {210, fixed, 1}, {70, fixed, 2}, {230, fixed, 2}, {145, fixed, 2},
	{152, fixed, 2}, {200, fixed, 1}, {155, fixed, 2}, {157, fixed, 2}, {160, fixed, 4}, {165, fixed, 2}, {77, fixed, 3},
	{170, fixed, 6}, {20, fixed, 1}, {220, compound220, 0}, {146, fixed, 2}, {148, fixed, 2}, {110, compound110, 0}, {16, fixed, 1},
	{8, fixed, 1}, {271, extended, 0}, {132, fixed, 1}, {250, repeated, 8}, {260, fixed, 7}, {400, fixed, 1}, {295, compound295, 0},
	{}, {}, {}, {}, {}, {0, explicit, 0}, {0, explicit, 0},
}

var (
	errShort   = errors.New("it ends within an item")
	errUnknown = errors.New("it announces an item that the profile does not have")
	errEmpty   = errors.New("a record announces no item")
	errEndless = errors.New("an item does not end")
	errPart    = errors.New("an item announces a part that it does not have")
	errSelf    = errors.New("an item's own length is wrong")
)

// mostOctets bounds the extended items: the longest in use has six.
const mostOctets = 16

// measure returns how many octets an item takes at the beginning of b.
func (l *length) measure(b []byte) (int, error) {
	n := l.n
	switch l.rule {
	case fixed:
	case extended:
		for n = 0; ; n++ {
			if n >= len(b) {
				return 0, errShort
			}
			if n >= mostOctets {
				return 0, errEndless
			}
			if b[n]&1 == 0 {
				break
			}
		}
		n++
	case repeated:
		if len(b) == 0 {
			return 0, errShort
		}
		n = 1 + int(b[0])*l.n
	case explicit:
		if len(b) == 0 {
			return 0, errShort
		}
		if n = int(b[0]); n < 1 {
			return 0, errSelf
		}
	case compound220:
		return parts(b, []int{2, 2, 2, 1})
	case compound110:
		return trajectory(b)
	case compound295:
		ages := make([]int, ageCount)
		for i := range ages {
			ages[i] = 1
		}
		return parts(b, ages)
	default:
		return 0, errUnknown
	}
	if n > len(b) {
		return 0, errShort
	}
	return n, nil
}

// parts measures a set of parts of fixed length, which its first octets
// announce, seven each.
func parts(b []byte, sizes []int) (int, error) {
	n, total := 0, 0
	for more := true; more; n++ {
		if n >= len(b) {
			return 0, errShort
		}
		if n*7 >= len(sizes) {
			return 0, errPart
		}
		for i := range 7 {
			if b[n]&(0x80>>i) == 0 {
				continue
			}
			if n*7+i >= len(sizes) {
				return 0, errPart
			}
			total += sizes[n*7+i]
		}
		more = b[n]&1 == 1
	}
	if n+total > len(b) {
		return 0, errShort
	}
	return n + total, nil
}

// trajectory measures item 110: an extended status, and points of 15 octets.
func trajectory(b []byte) (int, error) {
	if len(b) == 0 {
		return 0, errShort
	}
	if b[0]&0x3F != 0 {
		return 0, errPart
	}
	n := 1
	for i, l := range []length{{rule: extended}, {rule: repeated, n: 15}} {
		if b[0]&(0x80>>i) == 0 {
			continue
		}
		m, err := l.measure(b[n:])
		if err != nil {
			return 0, err
		}
		n += m
	}
	return n, nil
}
