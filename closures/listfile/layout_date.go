package listfile

import (
	"strings"
	"time"
)

// fraction reads the digits after the point.
func (w *written) fraction(text string) (rest string, ok bool) {
	i, scale := 0, int64(time.Second)
	for ; i < len(text) && isDigit(text[i]); i++ {
		scale /= 10
		w.nanos += int64(text[i]-'0') * scale
		w.inexact = w.inexact || scale == 0 && text[i] != '0'
	}
	return text[i:], i > 0
}

// offset reads Z, +hh:mm or +hhmm.
func (w *written) offset(text string) (rest string, ok bool) {
	if strings.HasPrefix(text, "Z") {
		return text[1:], true
	}
	for _, n := range [...]int{6, 5} {
		if len(text) >= n {
			if seconds, ok := parseZone(text[:n]); ok {
				w.zone = seconds
				return text[n:], true
			}
		}
	}
	return text, false
}

// parseZone reads +hh:mm or +hhmm, either sign, up to 14 hours.
func parseZone(text string) (seconds int, ok bool) {
	digits := strings.Replace(text, ":", "", 1)
	if len(digits) != 5 || len(text) == 6 && text[3] != ':' || digits[0] != '+' && digits[0] != '-' {
		return 0, false
	}
	for i := 1; i < 5; i++ {
		if !isDigit(digits[i]) {
			return 0, false
		}
	}
	h, m := int(digits[1]-'0')*10+int(digits[2]-'0'), int(digits[3]-'0')*10+int(digits[4]-'0')
	seconds = h*3600 + m*60
	if m > 59 || seconds > 14*3600 {
		return 0, false
	}
	if digits[0] == '-' {
		seconds = -seconds
	}
	return seconds, true
}

// exists reports whether each part is in its range; whether the day exists is
// known only with its year.
func (w *written) exists() bool {
	if w.hour == 24 && w.minute == 0 && w.second == 0 && w.nanos == 0 && !w.inexact { // the end of a day
		return w.dated()
	}
	return w.hour <= 23 && w.minute <= 59 && w.second <= 60 && w.dated()
}

func (w *written) dated() bool {
	if w.has&hasDay != 0 && (w.month < 1 || w.month > 12 || w.day < 1 || w.day > 31) {
		return false
	}
	return w.has&hasDayOfYear == 0 || w.doy >= 1 && w.doy <= 366
}

// fill takes what w lacks of its date from the date carried down.
func (w *written) fill(date *written) bool {
	if w.has&hasYear == 0 {
		if date.has&hasYear == 0 {
			return false
		}
		w.year = date.year
	}
	if w.has&hasAnyDay == 0 {
		if date.has&hasAnyDay == 0 {
			return false
		}
		w.month, w.day, w.doy = date.month, date.day, date.doy
	}
	w.has |= hasYear | date.has&hasAnyDay
	return true
}

// midnightOf returns the beginning of the date, in Unix seconds of its zone's
// own clock.
func (w *written) midnightOf() (seconds int64, ok bool) {
	var t time.Time
	if w.doy > 0 {
		t = time.Date(w.year, 1, w.doy, 0, 0, 0, 0, time.UTC)
		ok = t.Year() == w.year
	} else {
		t = time.Date(w.year, time.Month(w.month), w.day, 0, 0, 0, 0, time.UTC)
		ok = t.Day() == w.day
	}
	return t.Unix(), ok && w.year >= 1970 && w.year <= 2200
}

// instant returns the instant of w, which has its whole date, with days added.
func (w *written) instant(days int, zone int) (at instant, cause, mend string) {
	start, ok := w.midnightOf()
	if !ok {
		return instant{}, "is on a day that does not exist", "correct the date"
	}
	if w.has&hasZone != 0 {
		zone = w.zone
	}
	second := start + int64(days)*86400 + int64(w.hour*3600+w.minute*60+min(w.second, 59)) - int64(zone)
	ns := second*int64(time.Second) + w.nanos
	if ns < firstInstant || ns >= lastInstant {
		return instant{}, "is out of range", yearsMend
	}
	if w.second == 60 {
		return leapInstant(ns)
	}
	at = instant{early: ns - ns%int64(time.Millisecond), order: ns}
	at.late = at.early
	if at.early != ns || w.inexact {
		at.late += int64(time.Millisecond)
	}
	return at, "", ""
}

// plus returns the instant a duration later. Over the end of a month there may
// be a leap second, which POSIX time leaves out, so the early end is then a
// second earlier.
func (i instant) plus(d time.Duration) instant {
	const ms = int64(time.Millisecond)
	out := instant{early: floorDiv(i.early+int64(d), ms) * ms, late: -floorDiv(-(i.late+int64(d)), ms) * ms, order: i.order + int64(d)}
	from, until := time.Unix(0, i.early).UTC(), time.Unix(0, out.late).UTC()
	if from.Month() != until.Month() || from.Year() != until.Year() {
		out.early -= int64(time.Second)
	}
	return out
}
