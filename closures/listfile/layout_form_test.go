package listfile

import (
	"strings"
	"testing"
	"time"
)

// TestForms reads times by their forms. The values are worked by hand.
func TestForms(t *testing.T) {
	for _, c := range []struct {
		form, text string
		zone       int
		want       string // of the early end; with a plus when the late one is a millisecond later
	}{
		{"YYYY-MM-DD hh:mm:ss", "2031-02-14 03:10:02", 0, "2031-02-14T03:10:02Z"},
		{"YYYY-MM-DD hh:mm:ss", "2031-02-14   03:10:02", 0, "2031-02-14T03:10:02Z"},
		{"YYYY-MM-DDThh:mm:ssZ", "2031-02-14T03:10:02Z", -3600, "2031-02-14T03:10:02Z"},
		{"YYYY-MM-DDThh:mm:ss.fzzz", "2031-02-14T03:10:02.5+01:30", 0, "2031-02-14T01:40:02.500Z"},
		{"YYYY-MM-DDThh:mm:sszzz", "2031-02-14T03:10:02-0930", 0, "2031-02-14T12:40:02Z"},
		{"YYYY-MM-DDThh:mm:sszzz", "2031-02-14T03:10:02Z", 3600, "2031-02-14T03:10:02Z"},
		{"YYYY DDD hh:mm", "2031 045 03:10", 0, "2031-02-14T03:10:00Z"},
		{"YYYY DDD hh:mm", "2032 366 03:10", 0, "2032-12-31T03:10:00Z"},
		{"D MMMM YYYY hhmm", "1 march 2032 0000", 3600, "2032-02-29T23:00:00Z"},
		{"D MMMM YYYY hhmm", "14 February 2031 0310", 0, "2031-02-14T03:10:00Z"},
		{"DDMMMYY hhmm", "14FEB31 0310", -4 * 3600, "2031-02-14T07:10:00Z"},
		{"MM/DD/YYYY hh:mm", "02/14/2031 24:00", 0, "2031-02-15T00:00:00Z"},
		{"YYYY-MM-DD hh:mm:ss.f", "2031-02-14 03:10:02.0004", 0, "2031-02-14T03:10:02Z+"},
		{"YYYY-MM-DD hh:mm:ss.f", "2031-02-14 03:10:02.00000000001", 0, "2031-02-14T03:10:02Z+"},
		{"YYYY-MM-DD hh:mm:ss.f", "2031-02-14 03:10:02.1230000000000", 0, "2031-02-14T03:10:02.123Z"},
		{"'day' DDD 'of' YYYY, hh 'h' mm", "day 045 of 2031, 03 h 10", 0, "2031-02-14T03:10:00Z"},
		{"YYYY-MM-DD hh:mm", "2031-02-14 3:10", 0, ""},
		{"YYYY-MM-DD hh:mm", "2031-02-14 24:01", 0, ""},
		{"YYYY-MM-DD hh:mm:ss", "2031-02-14 03:10:61", 0, ""},
		{"YYYY-MM-DD hh:mm", "2031-13-14 03:10", 0, ""},
		{"YYYY-MM-DD hh:mm", "2031-02-14 03:10 ", 0, ""},
		{"YYYY-MM-DD hh:mm", "2031-02-29 03:10", 0, "no such day"},
		{"YYYY DDD hh:mm", "2031 366 03:10", 0, "no such day"},
		{"YYYY DDD hh:mm", "2031 000 03:10", 0, ""},
		{"YYYY-MM-DDThh:mm:sszzz", "2031-02-14T03:10:02+15:00", 0, ""},
		{"YYYY-MM-DDThh:mm:sszzz", "2031-02-14T03:10:02+1:30", 0, ""},
		{"YYYY-MM-DD hh:mm:ss.f", "2031-02-14 03:10:02.", 0, ""},
		{"D MMMM YYYY hhmm", "14 FEB 2031 0310", 0, ""},
	} {
		f, cause := parseForm(c.form)
		if cause != "" {
			t.Errorf("%s: %s", c.form, cause)
			continue
		}
		w, ok := f.parse(c.text)
		if !ok {
			if c.want != "" {
				t.Errorf("%s does not read %q", c.form, c.text)
			}
			continue
		}
		at, cause, _ := w.instant(0, c.zone)
		got := string(appendTime(nil, at.early))
		if cause != "" {
			got = "no such day"
		} else if at.late == at.early+int64(time.Millisecond) {
			got += "+"
		} else if !at.exact() {
			t.Errorf("%s reads %q from %d to %d", c.form, c.text, at.early, at.late)
		}
		if got != c.want {
			t.Errorf("%s reads %q as %s, want %s", c.form, c.text, got, c.want)
		}
	}
}

func TestFormsThatContradictThemselves(t *testing.T) {
	for form, want := range map[string]string{
		"":                         "1 to 60 characters",
		strings.Repeat(" ", 61):    "1 to 60 characters",
		"hh:mm hh":                 "twice",
		"YYYY YY DDD":              "in two ways",
		"MM MMM DD":                "in two ways",
		"YYYY DDD MM DD":           "day of the year and the month",
		"YYYY MM hh:mm":            "a month without its day",
		"DD hh:mm":                 "a month without its day",
		"mm:ss":                    "minutes without hours",
		"hh:ss":                    "seconds without minutes",
		"hh:mm.f":                  "fraction without seconds",
		"YYYY DDD hh":              "hours without minutes",
		"YYYY-MM-DDThh:mm:ssZ zzz": "the zone twice",
		"hh 'h":                    "has no end",
		"YYYY JJJ":                 "the letter J means nothing",
		"zzz":                      "neither a date nor a time",
	} {
		if _, cause := parseForm(form); !strings.Contains(cause, want) {
			t.Errorf("%q: %q, want %q", form, cause, want)
		}
	}
}

// TestAnglesInEveryUnit reads angles; the values are worked by hand.
func TestAnglesInEveryUnit(t *testing.T) {
	for _, c := range []struct {
		text string
		unit unit
		want string // in degrees; empty: refused
	}{
		{"150.1", unitDegrees, "150.1"}, {"+002.20", unitDegrees, "2.2"}, {"-0.5", unitDegrees, "-0.5"}, {"060", unitDegrees, "60"},
		{"3.0", unitArcminutes, "0.05"}, {"180", unitArcseconds, "0.05"}, {"1", unitArcseconds, "0.000277777778"},
		{"10.006667", unitHours, "150.100005"}, {"23.99995", unitHours, "359.99925"},
		{"10:00:24.00", unitHMS, "150.1"}, {"10 00 24", unitHMS, "150.1"}, {"10h00m24s", unitHMS, "150.1"}, {"10h 00m 24.0s", unitHMS, "150.1"},
		{"10:00.4", unitHMS, "150.1"}, {"00 00 00.001", unitHMS, "0.000004166667"},
		{"+02:12:00.0", unitDMS, "2.2"}, {"-00 30 07", unitDMS, "-0.501944444444"}, {`-12°30'00"`, unitDMS, "-12.5"}, {"02d12m", unitDMS, "2.2"},
		{"12° 30′ 36″", unitDMS, "12.51"}, {"- 02 12 00", unitDMS, "-2.2"},
		{"", unitDegrees, ""}, {"+", unitDegrees, ""}, {"1e2", unitDegrees, ""}, {"nan", unitDegrees, ""}, {"0x10", unitDegrees, ""}, {"1_0", unitDegrees, ""},
		{".5", unitDegrees, ""}, {"5.", unitDegrees, ""}, {"361", unitDegrees, ""}, {"--1", unitDegrees, ""}, {"1,5", unitDegrees, ""},
		{"10:60:00", unitHMS, ""}, {"10:00:60", unitHMS, ""}, {"10", unitHMS, ""}, {"10:00:00:00", unitHMS, ""}, {"10.5:00:00", unitHMS, ""}, {"10:0.5:00", unitHMS, ""},
		{"25:00:00", unitHMS, ""}, {"10:00:", unitHMS, ""}, {"10h00m24s x", unitHMS, ""}, {"10-00-24", unitHMS, ""}, {"10:-0:24", unitHMS, ""},
	} {
		got := ""
		if p, ok := parseAngle(c.text, c.unit); ok {
			got = string(appendDegrees(nil, p))
		}
		if got != c.want {
			t.Errorf("%q in %s is %q, want %q", c.text, unitNames[c.unit], got, c.want)
		}
	}
}

func TestDurationsInEveryUnit(t *testing.T) {
	for _, c := range []struct {
		text string
		unit unit
		want time.Duration // 0: refused
	}{
		{"39", unitSeconds, 39 * time.Second}, {"60.5", unitSeconds, 60500 * time.Millisecond}, {"0.001", unitSeconds, time.Millisecond},
		{"20", unitMinutes, 20 * time.Minute}, {"12", unitHours, 12 * time.Hour}, {"0.5", unitHours, 30 * time.Minute},
		{"00:40:00", unitHMS, 40 * time.Minute}, {"1h02m03.5s", unitHMS, time.Hour + 2*time.Minute + 3500*time.Millisecond},
		{"00:40", unitHM, 40 * time.Minute}, {"12 30", unitHM, 12*time.Hour + 30*time.Minute},
		{"02:30", unitMS, 150 * time.Second}, {"0m39s", unitMS, 39 * time.Second}, {"00:39.25", unitMS, 39250 * time.Millisecond},
		{"0", unitSeconds, 0}, {"-5", unitSeconds, 0}, {"9601", unitHours, 0}, {"00:60:00", unitHMS, 0}, {"00:40", unitHMS, 0}, {"soon", unitMinutes, 0},
	} {
		if got, ok := parseDuration(c.text, c.unit); got != c.want || ok != (c.want != 0) {
			t.Errorf("%q in %s is %v, %v, want %v", c.text, unitNames[c.unit], got, ok, c.want)
		}
	}
}

// TestDurationsOverAMonthsEnd leaves room for a leap second: a closed window
// may then end a second late, an open one a second early, and never the other
// way round.
func TestDurationsOverAMonthsEnd(t *testing.T) {
	at := func(s string) instant {
		i, cause, _ := parseInstant([]byte(s))
		if cause != "" {
			t.Fatal(cause)
		}
		return i
	}
	for _, c := range []struct {
		from        string
		length      time.Duration
		early, late string
	}{
		{"2031-02-14T03:10:02Z", 39 * time.Second, "2031-02-14T03:10:41Z", "2031-02-14T03:10:41Z"},
		{"2016-12-31T23:59:30Z", time.Minute, "2017-01-01T00:00:29Z", "2017-01-01T00:00:30Z"},
		{"2016-12-31T23:59:60.500Z", time.Minute, "2017-01-01T00:00:58Z", "2017-01-01T00:01:00Z"},
		{"2031-02-14T03:10:02Z", 1500 * time.Microsecond, "2031-02-14T03:10:02.001Z", "2031-02-14T03:10:02.002Z"},
	} {
		got := at(c.from).plus(c.length)
		if want := (instant{at(c.early).early, at(c.late).late, got.order}); got != want {
			t.Errorf("%s and %v is %s to %s, want %s to %s", c.from, c.length, appendTime(nil, got.early), appendTime(nil, got.late), c.early, c.late)
		}
	}
}
