package listfile

import (
	"strings"
	"time"

	"beamward/closures/wire"
)

// unit is how an angle or a duration is written in a text.
type unit uint8

const (
	unitNone unit = iota
	unitDegrees
	unitArcminutes
	unitArcseconds
	unitHours // of right ascension
	unitDMS   // degrees, minutes and seconds of arc, a sign before them all
	unitHMS   // hours, minutes and seconds: of right ascension, or a duration
	unitHM    // a duration of hours and minutes
	unitMS    // a duration of minutes and seconds
	unitSeconds
	unitMinutes
)

var unitNames = [...]string{"", "deg", "arcmin", "arcsec", "hours", "dms", "hms", "hm", "ms", "s", "min"}

func parseUnit(s string) unit {
	for u, name := range unitNames {
		if name == s {
			return unit(u)
		}
	}
	return unitNone
}

// The units that a value can have.
var (
	equatorUnits = []unit{unitDegrees, unitHours, unitHMS, unitDMS}
	arcUnits     = []unit{unitDegrees, unitArcminutes, unitArcseconds, unitDMS}
	spanUnits    = []unit{unitSeconds, unitMinutes, unitHours, unitHMS, unitHM, unitMS}
)

func unitsOfValue(name string) []unit {
	switch name {
	case "ra":
		return equatorUnits
	case "dec", "radius", "az_from", "az_to", "el_from", "el_to":
		return arcUnits
	case "for", "covers_for":
		return spanUnits
	}
	return nil
}

// decimal reads a number as people write one: a sign of either kind, leading
// zeros, a point with digits about it.
func decimal(text string) (float64, bool) {
	negative := strings.HasPrefix(text, "-")
	digits := text
	if negative || strings.HasPrefix(text, "+") {
		digits = text[1:]
	}
	if digits == "" || !isDigit(digits[0]) {
		return 0, false
	}
	for len(digits) > 1 && digits[0] == '0' && isDigit(digits[1]) {
		digits = digits[1:]
	}
	if strings.ContainsAny(digits, "eE") {
		return 0, false
	}
	v, err := wire.ParseNumber(digits)
	if err != nil || v > 1e9 {
		return 0, false
	}
	if negative {
		v = -v
	}
	return v, true
}

// sexagesimal reads two or three numbers, each but the first below 60, parted
// by colons, blanks or the letters and marks of the unit. Only the last has a
// fraction. It returns the value in units of the first.
func sexagesimal(text string, marks [3]string, least int) (float64, bool) {
	negative := strings.HasPrefix(text, "-")
	if negative || strings.HasPrefix(text, "+") {
		text = strings.TrimLeft(text[1:], " ")
	}
	sum, scale, n := 0.0, 1.0, 0
	for ; n < 3 && text != ""; n++ {
		i := 0
		for i < len(text) && (isDigit(text[i]) || text[i] == '.') {
			i++
		}
		number := text[:i]
		v, ok := decimal(number)
		rest := text[i:]
		if !ok || n > 0 && v >= 60 || v > 1e6 {
			return 0, false
		}
		sum += v / scale
		scale *= 60
		text = part(rest, marks[n])
		if text == rest && rest != "" || strings.Contains(number, ".") && text != "" || text == "" && strings.Contains(rest, ":") {
			return 0, false
		}
	}
	if negative {
		sum = -sum
	}
	return sum, text == "" && n >= least
}

// part takes what parts two numbers off the beginning: one mark or colon with
// blanks about it, or blanks alone.
func part(text, marks string) string {
	rest := strings.TrimLeft(text, " ")
	for _, m := range ":" + marks {
		if strings.HasPrefix(rest, string(m)) {
			return strings.TrimLeft(rest[len(string(m)):], " ")
		}
	}
	return rest
}

var (
	hourMarks   = [3]string{"hH", "mM", "sS"}
	arcMarks    = [3]string{"dD°", "mM'′", "sS\"″"}
	minuteMarks = [3]string{"mM", "sS", ""}
)

// parseAngle reads an angle in its unit as picodegrees, within ±360 degrees.
func parseAngle(text string, u unit) (picodegrees, bool) {
	var v float64
	var ok bool
	switch u {
	case unitDegrees:
		v, ok = decimal(text)
	case unitArcminutes:
		v, ok = decimal(text)
		v /= 60
	case unitArcseconds:
		v, ok = decimal(text)
		v /= 3600
	case unitHours:
		v, ok = decimal(text)
		v *= 15
	case unitDMS:
		v, ok = sexagesimal(text, arcMarks, 2)
	case unitHMS:
		v, ok = sexagesimal(text, hourMarks, 2)
		v *= 15
	}
	if !ok || !(v >= -360) || !(v <= 360) {
		return 0, false
	}
	return roundDegrees(v), true
}

// parseDuration reads a positive duration in its unit, up to 400 days. What is
// finer than a nanosecond is rounded to the nearest.
func parseDuration(text string, u unit) (time.Duration, bool) {
	var seconds float64
	var ok bool
	switch u {
	case unitSeconds:
		seconds, ok = decimal(text)
	case unitMinutes:
		seconds, ok = decimal(text)
		seconds *= 60
	case unitHours:
		seconds, ok = decimal(text)
		seconds *= 3600
	case unitHMS:
		seconds, ok = sexagesimal(text, hourMarks, 3)
		seconds *= 3600
	case unitHM:
		seconds, ok = sexagesimal(text, hourMarks, 2)
		seconds *= 3600
	case unitMS:
		seconds, ok = sexagesimal(text, minuteMarks, 2)
		seconds *= 60
	}
	if !ok || !(seconds > 0) || !(seconds <= maxCovers.Seconds()) {
		return 0, false
	}
	return time.Duration(seconds*float64(time.Second) + 0.5), true
}
