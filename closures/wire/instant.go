package wire

import (
	"errors"
	"time"
)

// The years that ParseTime takes. Outside them a time is a slip.
const (
	FirstYear = 1970
	LastYear  = 2200
)

// ParseTime reads an instant written YYYY-MM-DDThh:mm:ssZ, with a point and one
// to nine digits of a fraction after the seconds or without, and nothing else:
// no offset, no lower case, no comma, no hour 24, no second 60, only days that
// exist, from FirstYear to LastYear. The result is in UTC.
func ParseTime(s string) (time.Time, error) {
	t, cause := scanTime([]byte(s), FirstYear, LastYear)
	if cause != "" {
		return time.Time{}, errors.New("time " + quote([]byte(s)) + ": " + cause)
	}
	return t, nil
}

// FormatTime writes an instant as ParseTime reads it, to the nanosecond, with
// no more digits of a fraction than it has. Outside the years of ParseTime the
// text is in the same form and refused by it.
func FormatTime(t time.Time) string { return string(AppendTime(nil, t)) }

// AppendTime appends what FormatTime returns.
func AppendTime(dst []byte, t time.Time) []byte {
	return t.UTC().AppendFormat(dst, time.RFC3339Nano)
}

const timeForm = "want the form 2031-02-14T03:10:02Z"

// scanTime reads all of b. The cause is empty when it is an instant within the
// years given, the last included.
func scanTime(b []byte, first, last int) (time.Time, string) {
	const form = "0000-00-00T00:00:00Z"
	if len(b) < len(form) || len(b) > len(form)+10 {
		return time.Time{}, timeForm
	}
	for i := range len(form) - 1 {
		if form[i] == '0' && !isDigit(b[i]) || form[i] != '0' && b[i] != form[i] {
			return time.Time{}, timeForm
		}
	}
	if b[len(b)-1] != 'Z' {
		return time.Time{}, timeForm
	}
	nanos := int64(0)
	if fraction := b[len(form)-1 : len(b)-1]; len(fraction) > 0 {
		if fraction[0] != '.' || len(fraction) == 1 {
			return time.Time{}, timeForm
		}
		scale := int64(1e9)
		for _, c := range fraction[1:] {
			if !isDigit(c) {
				return time.Time{}, timeForm
			}
			scale /= 10
			nanos += int64(c-'0') * scale
		}
	}
	year, month, day := pair(b, 0)*100+pair(b, 2), pair(b, 5), pair(b, 8)
	hour, minute, second := pair(b, 11), pair(b, 14), pair(b, 17)
	switch {
	case year < first || year > last:
		return time.Time{}, "the year is out of range"
	case month < 1 || month > 12 || day < 1 || day > daysIn(year, month):
		return time.Time{}, "no such day"
	case hour > 23:
		return time.Time{}, "no such hour"
	case minute > 59:
		return time.Time{}, "no such minute"
	case second > 59:
		return time.Time{}, "no such second"
	}
	secs := int64(days(year, month, day))*86400 + int64(hour*3600+minute*60+second)
	return time.Unix(secs, nanos).UTC(), ""
}

func pair(b []byte, i int) int { return int(b[i]-'0')*10 + int(b[i+1]-'0') }

func daysIn(year, month int) int {
	switch {
	case month == 2 && year%4 == 0 && (year%100 != 0 || year%400 == 0):
		return 29
	case month == 2:
		return 28
	case month == 4 || month == 6 || month == 9 || month == 11:
		return 30
	}
	return 31
}

// days returns the days from 1970-01-01 to a day of the Gregorian calendar.
// Years are taken to begin in March, so that the leap day comes last and the
// months before it have 153 days in five.
func days(year, month, day int) int {
	m := month - 3
	if m < 0 {
		m += 12
		year--
	}
	const toEpoch = 719468 // days from 0000-03-01 to 1970-01-01
	return year*365 + floorDiv(year, 4) - floorDiv(year, 100) + floorDiv(year, 400) + (153*m+2)/5 + day - 1 - toEpoch
}

func floorDiv(a, b int) int {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}
