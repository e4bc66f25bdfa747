package listfile

import (
	"strconv"
	"time"

	"beamward/closures/wire"
)

// instant is a time as a list gives it: between two milliseconds, and most
// often on one. POSIX time has no name for the inside of a leap second, since a
// clock may then show the second before once more; and lists keep nothing finer
// than a millisecond. Whoever uses an instant takes the safe end.
type instant struct {
	early, late int64 // Unix nanoseconds
	order       int64 // of the very instant, for telling apart two between the same milliseconds
}

func (i instant) exact() bool { return i.early == i.late }

// before compares as the list meant it.
func (i instant) before(o instant) bool {
	if i.exact() && o.exact() {
		return i.early < o.early
	}
	if i.late != o.late {
		return i.late < o.late
	}
	if i.exact() || o.exact() {
		return !i.exact()
	}
	return i.order < o.order
}

// The years that a list may speak of, 2000 to 2199 in Unix nanoseconds: within
// what 64 bits hold, with room for the arithmetic on leads and nights.
const (
	firstInstant int64 = 946_684_800_000_000_000
	lastInstant  int64 = 7_258_118_400_000_000_000
)

const (
	timeMend  = "write YYYY-MM-DDThh:mm:ssZ or YYYY-MM-DDThh:mm:ss.fffZ, in UTC"
	yearsMend = "lists speak of the years 2000 to 2199"
	leapMend  = "second 60 exists only at 23:59:60 on the last day of a month"
)

// parseInstant reads YYYY-MM-DDThh:mm:ss[.fff]Z, and second 60 where a leap
// second can stand: the last of a month. cause is empty when it was one.
func parseInstant(text []byte) (at instant, cause, mend string) {
	var own [24]byte
	if len(text) != 20 && len(text) != len(own) {
		return instant{}, "is not a time", timeMend
	}
	leap := text[17] == '6' && text[18] == '0'
	if leap { // read the same fraction of second 59
		text = own[:copy(own[:], text)]
		text[17], text[18] = '5', '9'
	}
	t, err := wire.ParseTime(string(text))
	if err != nil {
		return instant{}, "is not a time", timeMend
	}
	ns := t.UnixNano()
	if ns < firstInstant || ns >= lastInstant {
		return instant{}, "is out of range", yearsMend
	}
	if !leap {
		return instant{early: ns, late: ns, order: ns}, "", ""
	}
	return leapInstant(ns)
}

// leapInstant returns the instant inside the leap second that follows the
// second which ns, of the same fraction, lies in.
func leapInstant(ns int64) (at instant, cause, mend string) {
	second := ns - ns%int64(time.Second)
	next := time.Unix(0, second+int64(time.Second)).UTC()
	if next.Hour() != 0 || next.Minute() != 0 || next.Day() != 1 {
		return instant{}, "is no leap second", leapMend
	}
	return instant{early: second, late: second + int64(time.Second), order: ns + int64(time.Second)}, "", ""
}

// appendTime appends Unix nanoseconds in the canonical way: the fraction only
// where there is one, and then always of three digits, as the format has it.
// Lists keep milliseconds.
func appendTime(dst []byte, ns int64) []byte {
	ms := floorDiv(ns, int64(time.Millisecond))
	days := floorDiv(ms, 86_400_000)
	ms -= days * 86_400_000
	y, m, d := civil(days)
	dst = appendPadded(dst, y, 4)
	dst = append(dst, '-')
	dst = appendPadded(dst, m, 2)
	dst = append(dst, '-')
	dst = appendPadded(dst, d, 2)
	dst = append(dst, 'T')
	dst = appendPadded(dst, ms/3_600_000, 2)
	dst = append(dst, ':')
	dst = appendPadded(dst, ms/60_000%60, 2)
	dst = append(dst, ':')
	dst = appendPadded(dst, ms/1000%60, 2)
	if f := ms % 1000; f != 0 {
		dst = append(dst, '.')
		dst = appendPadded(dst, f, 3)
	}
	return append(dst, 'Z')
}

func appendPadded(dst []byte, n int64, width int) []byte {
	switch width {
	case 2:
		return append(dst, byte('0'+n/10), byte('0'+n%10))
	case 3:
		return append(dst, byte('0'+n/100), byte('0'+n/10%10), byte('0'+n%10))
	}
	if n >= 1000 {
		return strconv.AppendInt(dst, n, 10)
	}
	return append(dst, byte('0'+n/1000), byte('0'+n/100%10), byte('0'+n/10%10), byte('0'+n%10))
}

func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

// civil returns the date of a day counted from 1970-01-01, by counting in
// whole 400-year cycles of years that begin in March.
func civil(days int64) (year, month, day int64) {
	days += 719468
	era := floorDiv(days, 146097)
	doe := days - era*146097
	yoe := (doe - doe/1460 + doe/36524 - doe/146096) / 365
	doy := doe - (365*yoe + yoe/4 - yoe/100)
	mp := (5*doy + 2) / 153
	day = doy - (153*mp+2)/5 + 1
	month = mp + 3
	if mp >= 10 {
		month = mp - 9
	}
	year = yoe + era*400
	if month <= 2 {
		year++
	}
	return year, month, day
}
