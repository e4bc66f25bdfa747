package wire

import (
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"
)

func TestParseNumberTakesJSONNumbersOnly(t *testing.T) {
	good := []string{
		"0", "-0", "1", "-1", "10", "0.5", "-0.25", "1e3", "1E3", "1e+3", "1e-3", "123456789012345678901234567890", "0.1e-5",
		"9007199254740993", "1.7976931348623157e308", "4.9e-324", "2.2250738585072014e-308", "1e22", "1e23", "1e-22", "1e-23",
		"0.000000000000000000000000000000000000000000001", "18446744073709551616", "18446744073709551617.5", "1e-999",
		"333333333.33333329", "1E30", "4.50", "2e-3", "0.000000000000000000000000001", // RFC 8785's examples
	}
	for _, s := range good {
		want, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(s, err)
		}
		got, err := ParseNumber(s)
		if err != nil || math.Float64bits(got) != math.Float64bits(want) {
			t.Errorf("%s: %v, %v, want %v", s, got, err, want)
		}
	}
	bad := []string{
		"", "-", "+1", "00", "01", "-01", ".5", "5.", "1e", "1e+", "1e-", "e5", "NaN", "nan", "Inf", "-Infinity", "infinity",
		"0x10", "0x1p-2", "1_000", "1,5", " 1", "1 ", "1\n", "1e400", "-1e400", "1f", "1.2.3", "--1", "１", "1e1.5", "null", "true", "1\x00",
	}
	for _, s := range bad {
		if v, err := ParseNumber(s); err == nil || !math.IsNaN(v) {
			t.Errorf("%q was taken as %v", s, v)
		}
	}
}

func TestParseNumberAgreesWithStrconv(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringMatching(`-?(0|[1-9][0-9]{0,24})(\.[0-9]{1,30})?([eE][+-]?[0-9]{1,3})?`).Draw(t, "s")
		want, err := strconv.ParseFloat(s, 64)
		got, mine := ParseNumber(s)
		if (err != nil) != (mine != nil) {
			t.Fatalf("%s: %v against %v", s, mine, err)
		}
		if err == nil && math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%s: %v, want %v", s, got, want)
		}
	})
	// Long fractions against large exponents cancel out.
	for _, s := range []string{
		"0." + strings.Repeat("0", 1000001) + "1e1000001", "1" + strings.Repeat("0", 400) + "e-400", "0." + strings.Repeat("0", 400) + "1e401",
		"0." + strings.Repeat("0", 1000001) + "1e5000000", "0e99999999999", "0.0e-99999999999",
	} {
		want, err := strconv.ParseFloat(s, 64)
		got, mine := ParseNumber(s)
		if (err != nil) != (mine != nil) || err == nil && got != want {
			t.Errorf("%.20s…: %v, %v, want %v, %v", s, got, mine, want, err)
		}
	}
}

func TestNumbersReadBackAsTheyWere(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := math.Float64frombits(rapid.Uint64().Draw(t, "bits"))
		s := string(appendNumber(nil, v))
		if math.IsNaN(v) || math.IsInf(v, 0) {
			if s != "null" {
				t.Fatal(s)
			}
			return
		}
		if got, err := ParseNumber(s); err != nil || math.Float64bits(got) != math.Float64bits(v) {
			t.Fatalf("%s: %v, want %v", s, got, v)
		}
	})
}

func TestParseTimeTakesOneFormOnly(t *testing.T) {
	good := map[string]time.Time{
		"1970-01-01T00:00:00Z":           time.Unix(0, 0),
		"2200-12-31T23:59:59.999999999Z": time.Date(2200, 12, 31, 23, 59, 59, 999999999, time.UTC),
		"1985-04-12T23:20:50.52Z":        time.Date(1985, 4, 12, 23, 20, 50, 520000000, time.UTC), // RFC 3339, section 5.8
		"2000-02-29T12:00:00.000000001Z": time.Date(2000, 2, 29, 12, 0, 0, 1, time.UTC),
		"2096-02-29T00:00:00.1Z":         time.Date(2096, 2, 29, 0, 0, 0, 100000000, time.UTC),
		"2031-02-14T03:10:02.500Z":       time.Date(2031, 2, 14, 3, 10, 2, 500000000, time.UTC),
	}
	for s, want := range good {
		got, err := ParseTime(s)
		if err != nil || !got.Equal(want) || got.Location() != time.UTC {
			t.Errorf("%s: %v, %v", s, got, err)
		}
	}
	bad := []string{
		"", "2031-02-14", "2031-02-14T03:10Z", "2031-02-14T03:10:02", "2031-02-14T03:10:02+00:00", "2031-02-14T03:10:02-00:00",
		"2031-02-14t03:10:02Z", "2031-02-14T03:10:02z", "2031-02-14 03:10:02Z", "2031-02-14T03:10:02,5Z", "2031-02-14T03:10:02.Z",
		"2031-02-14T03:10:02.1234567890Z", "2031-02-14T24:00:00Z", "2031-02-14T23:60:00Z", "2016-12-31T23:59:60Z", "2031-02-14T0:00:00Z",
		"2031-2-14T03:10:02Z", "2031-02-30T03:10:02Z", "2031-02-29T03:10:02Z", "2100-02-29T00:00:00Z", "2031-04-31T00:00:00Z",
		"2031-13-01T00:00:00Z", "2031-00-01T00:00:00Z", "2031-01-00T00:00:00Z", "1969-12-31T23:59:59Z", "2201-01-01T00:00:00Z",
		"0000-01-01T00:00:00Z", "20310214T031002Z", " 2031-02-14T03:10:02Z", "2031-02-14T03:10:02Z ", "2031-02-14T03:10:02Z\n",
		"2031-02-14T03:10:02.5+0Z", "２031-02-14T03:10:02Z", "2031-02-14T-1:10:02Z", "2031-02-14T03:10:02.5ZZ", "1985-04-12T23:20:50.52+00:00",
	}
	for _, s := range bad {
		if v, err := ParseTime(s); err == nil || !v.IsZero() {
			t.Errorf("%q was taken as %v", s, v)
		}
	}
}

func TestTimesReadBackAsTheyWere(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := time.Unix(rapid.Int64Range(0, 7289654399).Draw(t, "s"), rapid.Int64Range(0, 999999999).Draw(t, "ns")).UTC()
		s := FormatTime(want)
		got, err := ParseTime(s)
		if err != nil || got != want {
			t.Fatalf("%s: %v, %v, want %v", s, got, err, want)
		}
		if in := FormatTime(want.In(time.FixedZone("x", 3600))); in != s {
			t.Fatalf("%s, want %s", in, s)
		}
	})
}

func TestEveryDayFrom1970To2200(t *testing.T) {
	at := time.Unix(0, 0).UTC()
	for ; at.Year() <= LastYear; at = at.AddDate(0, 0, 1) {
		if got := days(at.Year(), int(at.Month()), at.Day()); int64(got)*86400 != at.Unix() {
			t.Fatalf("%v: day %d", at, got)
		}
	}
	for _, year := range []int{0, 1, 4, 100, 400, 1582, 1600, 1900, 9999} {
		for _, month := range []int{1, 2, 3, 12} {
			want := time.Date(year, time.Month(month), 28, 0, 0, 0, 0, time.UTC).Unix()
			if got := days(year, month, 28); int64(got)*86400 != want {
				t.Errorf("%d-%d: %d, want %d", year, month, got, want/86400)
			}
		}
	}
}

func FuzzParseTime(f *testing.F) {
	for _, s := range []string{"2031-02-14T03:10:02.5Z", "2016-12-31T23:59:60Z", "2031-02-29T00:00:00Z", "2031-02-14T24:00:00Z"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		got, err := ParseTime(s)
		if err != nil {
			if !got.IsZero() {
				t.Fatalf("%q: an error and %v", s, got)
			}
			return
		}
		want, err := time.Parse(time.RFC3339Nano, s)
		if err != nil || !want.Equal(got) {
			t.Fatalf("%q: %v, while time.Parse says %v, %v", s, got, want, err)
		}
	})
}

func FuzzParseNumber(f *testing.F) {
	for _, s := range []string{"0", "-0.5e-3", "1e400", "0x1p-2", "1_0", "9007199254740993", "0.00000000000000000000001"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		got, err := ParseNumber(s)
		if err != nil {
			return
		}
		want, err := strconv.ParseFloat(s, 64)
		if err != nil || math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%q: %v, want %v, %v", s, got, want, err)
		}
	})
}

func TestQuoteIsShortAndPlain(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := rapid.SliceOfN(rapid.Byte(), 0, 300).Draw(t, "b")
		q := quote(b)
		if len(q) > maxQuoted {
			t.Fatalf("%d bytes: %s", len(q), q)
		}
		for _, c := range q {
			if c < ' ' || c > '~' {
				t.Fatalf("%q", q)
			}
		}
		if _, err := strconv.Unquote(q); err != nil {
			t.Fatalf("%s: %v", q, err)
		}
	})
}
