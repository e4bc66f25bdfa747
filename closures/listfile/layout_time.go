package listfile

import (
	"strings"
)

// timeForm is a way to write a time, from a text such as
// "YYYY-MM-DD hh:mm:ss". Its words are
//
//	YYYY YY (20YY)  MM MMM (JAN) MMMM (January)  DD D (one or two digits) DDD (of the year)
//	hh mm ss  f (digits of a fraction, after ss and a point)  zzz (Z, +hh:mm or +hhmm)
//
// and anything else stands for itself, letters but T and Z in single quotes. A
// blank stands for one or more.
type timeForm struct {
	text  string
	parts []formPart
	has   dateParts
	line  int // in the layout
}

// timeForms are the forms that a value may have. More than one may fit only
// when they agree.
type timeForms []timeForm

type formPart struct {
	word    string // one of the words, or empty
	literal byte
}

// dateParts is what a form says of a time.
type dateParts uint8

const (
	hasYear dateParts = 1 << iota
	hasDay            // month and day of the month
	hasDayOfYear
	hasMonth
	hasHour
	hasMinute
	hasSecond
	hasZone
)

const hasAnyDay = hasDay | hasDayOfYear

// written is a time as it stood, before a carried date fills it.
type written struct {
	has                   dateParts
	year, month, day, doy int
	hour, minute, second  int
	nanos                 int64 // of the fraction, rounded down
	inexact               bool  // there was more than nanoseconds hold
	zone                  int   // seconds east of UTC
}

var monthNames = [...]string{"january", "february", "march", "april", "may", "june", "july", "august", "september", "october", "november", "december"}

// The words of forms, the longest first.
var formWords = [...]string{"YYYY", "MMMM", "MMM", "DDD", "zzz", "YY", "MM", "DD", "hh", "mm", "ss", "D", "f"}

// parseForm compiles a form. cause is empty when it is one.
func parseForm(text string) (f timeForm, cause string) {
	f.text = text
	if len(text) == 0 || len(text) > 60 {
		return f, "a form has 1 to 60 characters"
	}
	seen := map[string]bool{}
	for rest := text; rest != ""; {
		word := ""
		for _, w := range formWords {
			if strings.HasPrefix(rest, w) {
				word = w
				break
			}
		}
		c := rest[0]
		switch {
		case word != "":
			if seen[word] {
				return f, "the form says " + word + " twice"
			}
			seen[word] = true
			f.parts = append(f.parts, formPart{word: word})
			rest = rest[len(word):]
		case c == '\'':
			end := strings.IndexByte(rest[1:], '\'')
			if end < 0 {
				return f, "a quote in the form has no end"
			}
			for i := 1; i <= end; i++ {
				f.parts = append(f.parts, formPart{literal: rest[i]})
			}
			rest = rest[end+2:]
		case (c >= 'A' && c <= 'Z' || c >= 'a' && c <= 'z') && c != 'T' && c != 'Z':
			return f, "the letter " + rest[:1] + " means nothing in a form; put words in single quotes"
		default:
			if c == 'Z' {
				f.has |= hasZone
			}
			f.parts = append(f.parts, formPart{literal: c})
			rest = rest[1:]
		}
	}
	return f, f.settle(seen)
}

// settle notes what the form says, and finds what contradicts itself.
func (f *timeForm) settle(seen map[string]bool) string {
	count := func(words ...string) (n int) {
		for _, w := range words {
			if seen[w] {
				n++
			}
		}
		return n
	}
	month, day := count("MM", "MMM", "MMMM"), count("DD", "D")
	switch {
	case count("YYYY", "YY") > 1 || month > 1 || day > 1:
		return "the form says one thing in two ways"
	case seen["DDD"] && month+day > 0:
		return "the form has both the day of the year and the month or its day"
	case month != day:
		return "the form has a month without its day, or a day without its month"
	case seen["mm"] && !seen["hh"] || seen["ss"] && !seen["mm"] || seen["f"] && !seen["ss"]:
		return "the form has minutes without hours, seconds without minutes, or a fraction without seconds"
	case seen["zzz"] && f.has&hasZone != 0:
		return "the form says the zone twice"
	case seen["hh"] && !seen["mm"]:
		return "the form has hours without minutes"
	}
	set := func(n int, bit dateParts) {
		if n > 0 {
			f.has |= bit
		}
	}
	set(count("YYYY", "YY"), hasYear)
	set(day, hasDay)
	set(count("DDD"), hasDayOfYear)
	set(count("hh"), hasHour)
	set(count("mm"), hasMinute)
	set(count("ss"), hasSecond)
	set(count("zzz"), hasZone)
	if f.has&(hasYear|hasAnyDay|hasHour) == 0 {
		return "the form says neither a date nor a time"
	}
	return ""
}

// parse reads text by the form; ok is false when it does not fit.
func (f *timeForm) parse(text string) (w written, ok bool) {
	w.has = f.has
	for _, p := range f.parts {
		if p.word == "" {
			if p.literal == ' ' {
				trimmed := strings.TrimLeft(text, " ")
				if len(trimmed) == len(text) {
					return w, false
				}
				text = trimmed
				continue
			}
			if text == "" || text[0] != p.literal {
				return w, false
			}
			text = text[1:]
			continue
		}
		if text, ok = w.word(p.word, text); !ok {
			return w, false
		}
	}
	return w, text == "" && w.exists()
}

// word reads one word of a form from the beginning of text.
func (w *written) word(word, text string) (rest string, ok bool) {
	switch word {
	case "MMM", "MMMM":
		for i, name := range monthNames {
			if word == "MMM" {
				name = name[:3]
			}
			if len(text) >= len(name) && strings.EqualFold(text[:len(name)], name) {
				w.month = i + 1
				return text[len(name):], true
			}
		}
		return text, false
	case "f":
		return w.fraction(text)
	case "zzz":
		return w.offset(text)
	}
	width := len(word)
	if word == "D" && len(text) > 1 && isDigit(text[1]) {
		width = 2
	}
	n := 0
	if len(text) < width {
		return text, false
	}
	for i := range width {
		if !isDigit(text[i]) {
			return text, false
		}
		n = n*10 + int(text[i]-'0')
	}
	switch word {
	case "YYYY":
		w.year = n
	case "YY":
		w.year = 2000 + n
	case "MM":
		w.month = n
	case "DD", "D":
		w.day = n
	case "DDD":
		w.doy = n
	case "hh":
		w.hour = n
	case "mm":
		w.minute = n
	case "ss":
		w.second = n
	}
	return text[width:], true
}

func isDigit(c byte) bool { return c >= '0' && c <= '9' }
