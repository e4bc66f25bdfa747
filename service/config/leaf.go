package config

import (
	"math"
	"regexp"
	"strconv"
	"strings"
	"time"
	"unicode"
)

// at says where a value stands in the text.
type at struct {
	key  string
	text string // as written; for what was left out, its default as written here
	line int    // 0: it was left out
	has  bool   // it has a value, written or by default
}

func (a *at) place() *at { return a }

// leaf is one value. read takes it from its text and returns what to write
// instead, or nothing when all is well. write gives the one form of the
// canonical text, which read takes back to the same value.
type leaf interface {
	place() *at
	read(text string, t tags) (mend string)
	write() string
	quotes() bool // whether it may stand in quotes
	native() any
	schema(t tags) object
}

// text is a word, a name, a path, an address or free text.
type text struct {
	at
	value string
}

func (x *text) quotes() bool  { return true }
func (x *text) write() string { return strconv.Quote(x.value) }

func (x *text) read(s string, t tags) string {
	if t.words != nil {
		for _, w := range t.words {
			if s == w {
				x.value = s
				return ""
			}
		}
		return "make it " + either(t.words)
	}
	f := forms[t.form]
	if !(len(s) <= maxLine && printable(s) && f.ok(s)) {
		return f.mend
	}
	x.value = s
	return ""
}

// either lists words as "a, b or c".
func either(words []string) string {
	if len(words) == 1 {
		return words[0]
	}
	return strings.Join(words[:len(words)-1], ", ") + " or " + words[len(words)-1]
}

// maxLine is the longest single value, in bytes.
const maxLine = 1000

// printable also holds for nothing but the one ordinary space, and never at
// the ends, so that what is shown is what is meant.
func printable(s string) bool {
	for _, r := range s {
		if !unicode.IsPrint(r) || r == unicode.ReplacementChar {
			return false
		}
	}
	return strings.TrimSpace(s) == s
}

// number is a decimal number.
type number struct {
	at
	value float64
}

var numberForm = regexp.MustCompile(`^-?(0|[1-9][0-9]{0,14})(\.[0-9]{1,20})?$`)

const numberMend = "write a decimal number, such as -31.5, without quotes, exponent or unit"

func (x *number) quotes() bool { return false }

func (x *number) write() string {
	return strconv.FormatFloat(x.value, 'f', -1, 64)
}

func (x *number) read(s string, _ tags) string {
	if !numberForm.MatchString(s) {
		return numberMend
	}
	v, err := strconv.ParseFloat(s, 64)
	if err != nil || !(math.Abs(v) <= 1e15) {
		return numberMend
	}
	// The canonical text has to fit the grammar again, so digits that the
	// grammar would not take back are refused here.
	if v == 0 {
		v = 0 // one zero, without a sign
	}
	if !numberForm.MatchString(strconv.FormatFloat(v, 'f', -1, 64)) {
		return "write fewer digits"
	}
	x.value = v
	return ""
}

// whole is a number of things.
type whole struct {
	at
	value int
}

var wholeForm = regexp.MustCompile(`^(0|[1-9][0-9]{0,8})$`)

func (x *whole) quotes() bool  { return false }
func (x *whole) write() string { return strconv.Itoa(x.value) }

func (x *whole) read(s string, _ tags) string {
	v, err := strconv.Atoi(s)
	if err != nil || !wholeForm.MatchString(s) {
		return "write a whole number without quotes"
	}
	x.value = v
	return ""
}

// flag is true or false, and none of YAML's other words for them.
type flag struct {
	at
	value bool
}

func (x *flag) quotes() bool  { return false }
func (x *flag) write() string { return strconv.FormatBool(x.value) }

func (x *flag) read(s string, _ tags) string {
	if s != "true" && s != "false" {
		return "make it true or false, without quotes"
	}
	x.value = s == "true"
	return ""
}

// duration is a whole number of one unit.
type duration struct {
	at
	value time.Duration
}

var (
	durationForm  = regexp.MustCompile(`^(0|[1-9][0-9]{0,11})(ms|s|m|h|d)$`)
	durationUnits = []struct {
		name string
		size time.Duration
	}{{"d", 24 * time.Hour}, {"h", time.Hour}, {"m", time.Minute}, {"s", time.Second}, {"ms", time.Millisecond}}
)

const durationMend = "write a whole number and one unit of ms, s, m, h, d, such as 500ms or 10m"

func (x *duration) quotes() bool { return true }

func (x *duration) write() string {
	for _, u := range durationUnits {
		if x.value != 0 && x.value%u.size == 0 {
			return strconv.FormatInt(int64(x.value/u.size), 10) + u.name
		}
	}
	return "0s"
}

func (x *duration) read(s string, _ tags) string {
	m := durationForm.FindStringSubmatch(s)
	if m == nil {
		return durationMend
	}
	n, err := strconv.ParseInt(m[1], 10, 64)
	if err != nil {
		return durationMend
	}
	for _, u := range durationUnits {
		if u.name == m[2] {
			if n > int64(math.MaxInt64/u.size) {
				return "write a shorter time"
			}
			x.value = time.Duration(n) * u.size
			return ""
		}
	}
	return durationMend
}

// instant is a UTC instant in the one form that lists use, too.
type instant struct {
	at
	value time.Time
}

var instantForm = regexp.MustCompile(`^[12][0-9]{3}-[01][0-9]-[0-3][0-9]T[0-2][0-9]:[0-5][0-9]:[0-5][0-9](\.[0-9]{1,3})?Z$`)

const instantMend = "write UTC as YYYY-MM-DDThh:mm:ssZ, with up to three decimals of a second"

func (x *instant) quotes() bool  { return true }
func (x *instant) write() string { return x.value.Format("2006-01-02T15:04:05.999Z") }

func (x *instant) read(s string, _ tags) string {
	if !instantForm.MatchString(s) {
		return instantMend
	}
	v, err := time.Parse(time.RFC3339Nano, s)
	if err != nil { // such as February 30
		return instantMend
	}
	x.value = v.UTC()
	return ""
}
