package listfile

import (
	"errors"
	"fmt"
	"strings"
	"testing"
)

// refused reads a text that must be refused, and returns what was said as
// "line: cause" lines.
func refused(t *testing.T, text string, f Format, limits Limits) (*Refusal, string) {
	t.Helper()
	l, _, err := Read(strings.NewReader(text), f, limits)
	var r *Refusal
	if !errors.As(err, &r) || l != nil {
		t.Fatalf("accepted, or another error: %v, %v", l, err)
	}
	var b strings.Builder
	for _, e := range r.Lines {
		fmt.Fprintf(&b, "%d: %s\n", e.Line, e.Cause)
		if e.Mend == "" || len(e.Text) > 80 {
			t.Errorf("line %d, %s: mend %q, text of %d bytes", e.Line, e.Cause, e.Mend, len(e.Text))
		}
	}
	return r, strings.TrimSuffix(b.String(), "\n")
}

// undigested returns the golden list without its digest.
func undigested(t *testing.T, f Format) string {
	var kept []string
	for _, line := range strings.SplitAfter(string(golden(t, f)), "\n") {
		switch {
		case f == JSON && strings.Contains(line, `,"digest"`):
			line = line[:strings.Index(line, `,"digest"`)] + ",\n"
		case strings.Contains(line, "digest: "):
			continue
		}
		kept = append(kept, line)
	}
	return strings.Join(kept, "")
}

// TestMalformed changes one place of the golden list in one way, and wants the
// line and the cause. An empty old text stands for the whole list.
func TestMalformed(t *testing.T) {
	for _, c := range []struct {
		name     string
		format   Format
		old, new string
		want     string
	}{
		// The head.
		{"version of tomorrow", YAML, "closure_list: 1", "closure_list: 2", `1: closure_list "2" is not a version that is read here`},
		{"version as text", YAML, "closure_list: 1", `closure_list: "1"`, `1: closure_list "1" is not a version that is read here`},
		{"no version", CSV, "# closure_list: 1\n", "", `1: closure_list is missing`},
		{"no id", YAML, "id: \"2031-045-B\"\n", "", `1: id is missing`},
		{"id with a space", YAML, `id: "2031-045-B"`, `id: "2031 045"`, `2: id "2031 045" is not a name`},
		{"id of two points", CSV, "# id: 2031-045-B", "# id: ..", `2: id ".." is not a name`},
		{"id too long", JSON, `"id":"2031-045-B"`, `"id":"` + strings.Repeat("x", 65) + `"`, `1: id "` + strings.Repeat("x", 37) + `..." is not a name`},
		{"id as number", JSON, `"id":"2031-045-B"`, `"id":2031`, `1: id is not text`},
		{"id null", YAML, `id: "2031-045-B"`, `id: ~`, `2: id is not text`},
		{"authority empty", YAML, "authority: orbital-desk", "authority:", `3: authority is not text`},
		{"authority with a slash", JSON, "orbital-desk", "orbital/desk", `1: authority "orbital/desk" is not a name`},
		{"issued without Z", YAML, "issued: 2031-02-13T18:05:00Z", "issued: 2031-02-13T18:05:00", `4: issued "2031-02-13T18:05:00" is not a time`},
		{"issued a day only", CSV, "issued: 2031-02-13T18:05:00Z", "issued: 2031-02-13", `4: issued "2031-02-13" is not a time`},
		{"issued in another century", JSON, `"issued":"2031`, `"issued":"1971`, `1: issued "1971-02-13T18:05:00Z" is out of range`},
		{"covers missing", YAML, "covers: {from: 2031-02-14T00:00:00Z, until: 2031-02-14T12:00:00Z}\n", "", `1: covers is missing`},
		{"covers without until", YAML, ", until: 2031-02-14T12:00:00Z}\nreplaces", "}\nreplaces", `5: covers.until is missing`},
		{"covers backwards", YAML, "until: 2031-02-14T12:00:00Z}\nreplaces", "until: 2031-02-13T12:00:00Z}\nreplaces", `5: covers is empty: from is not before until`},
		{"covers of no length", CSV, "/2031-02-14T12:00:00Z", "/2031-02-14T00:00:00Z", `5: covers is empty: from is not before until`},
		{"covers over 400 days", JSON, `"until":"2031-02-14T12:00:00Z"},"rep`, `"until":"2032-03-21T00:00:01Z"},"rep`, `1: covers is longer than 400 days`},
		{"covers without a slash", CSV, "00Z/2031", "00Z 2031", "5: covers.from \"2031-02-14T00:00:00Z 2031-02-14T12:00...\" is not a time\n5: covers.until \"\" is not a time"},
		{"covers a scalar", YAML, "covers: {from: 2031-02-14T00:00:00Z, until: 2031-02-14T12:00:00Z}", "covers: tonight", "5: covers is not a mapping\n5: covers.from is missing\n5: covers.until is missing"},
		{"replaces itself", CSV, "replaces: 2031-045-A", "replaces: 2031-045-B", `6: the list replaces itself`},
		{"replaces twice", YAML, `"2031-044-C"]`, `"2031-045-A"]`, `6: replaces names "2031-045-A" twice`},
		{"replaces a scalar", JSON, `["2031-045-A","2031-044-C"]`, `"2031-045-A"`, `1: replaces is not an array`},
		{"beams empty", YAML, "beams: [north]", "beams: []", `7: beams is empty`},
		{"beams twice", JSON, `["north"]`, `["north","north"]`, `1: beams names "north" twice`},
		{"beam with a comma", CSV, "beams: north", "beams: north,south", `7: beams "north,south" is not a name`},
		{"unlisted sky unsaid", YAML, "unlisted_sky: closed\n", "", `1: unlisted_sky is missing`},
		{"unlisted sky in capitals", CSV, "unlisted_sky: closed", "unlisted_sky: Closed", `8: unlisted_sky "Closed" is neither closed nor open`},
		{"unlisted sky false", JSON, `"unlisted_sky":"closed"`, `"unlisted_sky":false`, `1: unlisted_sky is not text`},
		{"count too large", YAML, "window_count: 7", "window_count: 8", `9: window_count is 8 and the list has 7 windows`},
		{"count too small", CSV, "window_count: 7", "window_count: 6", `9: window_count is 6 and the list has 7 windows`},
		{"count in words", YAML, "window_count: 7", "window_count: seven", `9: window_count "seven" is not a whole number`},
		{"count as fraction", JSON, `"window_count":7`, `"window_count":7.0`, `1: window_count "7.0" is not a whole number`},
		{"count as text", JSON, `"window_count":7`, `"window_count":"7"`, `1: window_count "7" is not a whole number`},
		{"count in octal", YAML, "window_count: 7", "window_count: 07", `9: window_count "07" is not a whole number`},
		{"digest of something else", CSV, "# window_count: 7", "# digest: sha256:" + strings.Repeat("0a", 32), `9: the digest does not fit the list: something in it was changed or lost`},
		{"digest of zeros", YAML, "window_count: 7", `digest: "sha256:` + strings.Repeat("00", 32) + `"`, `9: the digest does not fit the list: something in it was changed or lost`},
		{"digest in capitals", YAML, "window_count: 7", `digest: "sha256:` + strings.Repeat("0A", 32) + `"`, `9: digest "sha256:0A0A0A0A0A0A0A0A0A0A0A0A0A0A0A..." is not a digest`},
		{"unknown head key", YAML, "window_count: 7", "window_number: 7", `9: the key "window_number" is not known`},
		{"head key in capitals", JSON, `"issued"`, `"Issued"`, "1: the key \"Issued\" is not known\n1: issued is missing"},
		{"head key twice", YAML, "window_count: 7", "id: \"2031-045-B\"", `9: the key "id" stands twice`},
		{"head key twice in JSON", JSON, `"window_count":7`, `"id":"2031-045-B"`, `1: the key "id" stands twice`},
		{"head key twice in CSV", CSV, "# window_count: 7", "# covers: 2031-02-14T00:00:00Z/2031-02-14T12:00:00Z", `9: the key "covers" stands twice`},
		{"regions missing", YAML, "regions:", "areas:", "1: regions is missing\n10: the key \"areas\" is not known"},
		{"key after the windows", YAML, "  - {region: comet, closed: {from: 2031-02-14T02:00:00Z, until: 2031-02-14T04:00:00Z}}\n", "window: \n", "9: window_count is 7 and the list has 6 windows\n15: the region has neither windows nor throughout\n24: the key \"window\" is not known"},

		// Regions.
		{"region id missing", YAML, "{id: f-101, ", "{", "11: id is missing\n18: the window names a region that the list does not define\n19: the window names a region that the list does not define"},
		{"region defined twice", YAML, "id: f-102", "id: f-101", "12: the region \"f-101\" is defined twice\n20: the window names a region that the list does not define\n21: the window names a region that the list does not define"},
		{"region without shape", YAML, ", whole_sky: true", "", `16: the region has no shape`},
		{"region of two shapes", YAML, "whole_sky: true", "whole_sky: true, icrs: {ra_deg: 1, dec_deg: 1, radius_deg: 1}", `16: the region has two shapes`},
		{"whole sky false", JSON, `"whole_sky":true`, `"whole_sky":false`, `8: whole_sky "false" is not true`},
		{"throughout maybe", YAML, "throughout: open", "throughout: maybe", `16: throughout "maybe" is neither closed nor open`},
		{"neither windows nor throughout", YAML, ", throughout: open", "", `16: the region has neither windows nor throughout`},
		{"windows and throughout", CSV, "f-101,icrs,150.1,2.2,0.05,,,,,,", "f-101,icrs,150.1,2.2,0.05,,,,,closed,", `11: the region has windows and throughout`},
		{"unknown region key", JSON, `"throughout"`, `"through_out"`, "8: the key \"through_out\" is not known\n8: the region has neither windows nor throughout"},
		{"cone without radius", YAML, ", radius_deg: 0.05}", "}", `11: radius_deg is missing`},
		{"cone of radius 0", CSV, ",2.2,0.05,", ",2.2,0.0,", `11: radius_deg "0.0" is out of range`},
		{"cone of radius below a picodegree", CSV, ",2.2,0.05,", ",2.2,1e-13,", `11: radius_deg "1e-13" is out of range`},
		{"cone of radius 91", YAML, "radius_deg: 0.05", "radius_deg: 91", `11: radius_deg "91" is out of range`},
		{"right ascension 360", YAML, "ra_deg: 150.1", "ra_deg: 360", `11: ra_deg "360" is out of range`},
		{"right ascension negative", JSON, `"ra_deg":150.1`, `"ra_deg":-0.1`, `3: ra_deg "-0.1" is out of range`},
		{"declination 90.5", CSV, "150.1,2.2", "150.1,90.5", `11: dec_deg "90.5" is out of range`},
		{"not a number", YAML, "ra_deg: 150.1", "ra_deg: .nan", `11: ra_deg ".nan" is not a number`},
		{"NaN", CSV, "150.1,2.2", "NaN,2.2", `11: ra_deg "NaN" is not a number`},
		{"infinite", YAML, "ra_deg: 150.1", "ra_deg: Inf", `11: ra_deg "Inf" is not a number`},
		{"plus sign", YAML, "ra_deg: 150.1", "ra_deg: +150.1", `11: ra_deg "+150.1" is not a number`},
		{"hexadecimal", CSV, "150.1,2.2", "0x96,2.2", `11: ra_deg "0x96" is not a number`},
		{"underscore", YAML, "ra_deg: 150.1", "ra_deg: 1_50.1", `11: ra_deg "1_50.1" is not a number`},
		{"comma for a point", YAML, "ra_deg: 150.1", `ra_deg: "150,1"`, `11: ra_deg is not a number`},
		{"leading zero", CSV, "150.1,2.2", "0150.1,2.2", `11: ra_deg "0150.1" is not a number`},
		{"point without digits", CSV, "150.1,2.2", "150.,2.2", `11: ra_deg "150." is not a number`},
		{"spaces about a number", CSV, "150.1,2.2", " 150.1,2.2", `11: ra_deg " 150.1" is not a number`},
		{"sexagesimal", YAML, "ra_deg: 150.1", "ra_deg: 10:00:24", `11: ra_deg "10:00:24" is not a number`},
		{"number too large", JSON, `"ra_deg":150.1`, `"ra_deg":1e999`, `3: "1e999" is not a JSON number`},
		{"number as text", JSON, `"ra_deg":150.1`, `"ra_deg":"150.1"`, `3: ra_deg is not a number`},
		{"unknown cone key", YAML, "radius_deg: 0.05", "radius_arcmin: 3", "11: the key \"radius_arcmin\" is not known\n11: radius_deg is missing"},
		{"azimuth key in capitals", JSON, `"az_from_deg":60`, `"Az_From_Deg":60`, "5: the key \"Az_From_Deg\" is not known\n5: az_from_deg is missing"},
		{"box upside down", YAML, "el_from_deg: 30, el_to_deg: 45", "el_from_deg: 45, el_to_deg: 30", `13: el_from_deg is not below el_to_deg`},
		{"box of no height", CSV, ",60,120,30,45", ",60,120,30,30", `13: el_from_deg is not below el_to_deg`},
		{"box of no width", JSON, `"az_from_deg":60,"az_to_deg":120`, `"az_from_deg":60,"az_to_deg":60`, `5: az_from_deg and az_to_deg are the same direction`},
		{"box from 360 to 0", CSV, ",60,120,30,45", ",360,0,30,45", `13: az_from_deg and az_to_deg are the same direction`},
		{"azimuth 361", YAML, "az_to_deg: 120", "az_to_deg: 361", `13: az_to_deg "361" is out of range`},
		{"observed yes", YAML, "observed: true", "observed: yes", `14: observed "yes" is neither true nor false`},
		{"observed as text", JSON, `"observed":true`, `"observed":"true"`, `6: observed "true" is neither true nor false`},
		{"track of one point", YAML, ", {at: 2031-02-14T03:00:00.250Z, ra_deg: 0.05, dec_deg: 5.02}, {at: 2031-02-14T04:00:00Z, ra_deg: 0.2, dec_deg: 5.03}", "", `15: the track has fewer than two points`},
		{"track without points", JSON, `"points"`, `"pionts"`, "7: the key \"pionts\" is not known\n7: the track has fewer than two points"},
		{"track out of order", CSV, "point,2031-02-14T03:00:00.250Z", "point,2031-02-14T01:00:00Z", "17: the track's points are not in order of time"},
		{"track with one time twice", YAML, "at: 2031-02-14T03:00:00.250Z", "at: 2031-02-14T02:00:00Z", "15: the track's points are not in order of time"},
		{"track leaps", JSON, `"ra_deg":0.05,"dec_deg":5.02`, `"ra_deg":180,"dec_deg":5.02`, "7: the track's points are 90 degrees or more apart"},
		{"point without dec", YAML, "ra_deg: 0.05, dec_deg: 5.02", "ra_deg: 0.05", "15: dec_deg is missing"},
		{"point on a leap second", CSV, "point,2031-02-14T03:00:00.250Z", "point,2031-01-31T23:59:60Z", "17: the point stands inside a leap second, or between milliseconds"},
		{"point of a cone", CSV, "f-101,,,,,,,,,,closed,2031-02-14T03:10:02Z,2031-02-14T03:10:41Z,A-17", "f-101,,1,2,,,,,,,point,2031-02-14T03:10:02Z,,", "20: only a track has points"},
		{"window beyond its track", YAML, "{region: comet, closed: {from: 2031-02-14T02:00:00Z", "{region: comet, closed: {from: 2031-02-14T01:59:59Z", "24: the window reaches beyond the points of its track, where the region is nowhere"},
		{"track throughout, too short", CSV, "comet,track,,,0.1,,,,,,,,,", "comet,track,,,0.1,,,,,closed,,,,", "15: the region has windows and throughout\n15: the track holds throughout, and its points do not reach over covers"},

		// Windows.
		{"window of an unknown region", YAML, "region: low-east, open", "region: low-west, open", "13: the region has neither windows nor throughout\n22: the window names a region that the list does not define"},
		{"window of an unknown region in JSON", JSON, `"region":"low-east"`, `"region":"low-west"`, "5: the region has neither windows nor throughout\n14: the window names a region that the list does not define"},
		{"window of an unknown region in CSV", CSV, "low-east,,,,,,,,,,open", "low-west,,,,,,,,,,open", "24: the region \"low-west\" is not defined"},
		{"window without region", JSON, `"region":"low-east",`, ``, "5: the region has neither windows nor throughout\n14: region is missing"},
		{"window backwards", YAML, "until: 2031-02-14T03:10:41Z}, ref: \"A-17\"", "until: 2031-02-14T03:10:01Z}, ref: \"A-17\"", "18: the window is empty: from is not before until"},
		{"window of no length", CSV, "03:10:41Z,A-17", "03:10:02Z,A-17", "20: the window is empty: from is not before until"},
		{"window outside covers", YAML, "from: 2031-02-13T23:00:00Z, until: 2031-02-14T00:30:00Z", "from: 2031-02-13T23:00:00Z, until: 2031-02-14T00:00:00Z", "23: the window lies outside covers"},
		{"window outside covers in JSON", JSON, `"from":"2031-02-13T23:00:00Z","until":"2031-02-14T00:30:00Z"`, `"from":"2031-02-14T12:00:00Z","until":"2031-02-14T12:30:00Z"`, "15: the window lies outside covers"},
		{"window with an offset", YAML, "03:10:41Z}, ref: \"A-17\"", "03:10:41+00:00}, ref: \"A-17\"", `18: until "2031-02-14T03:10:41+00:00" is not a time`},
		{"window in small letters", CSV, "2031-02-14T03:10:41Z,A-17", "2031-02-14t03:10:41z,A-17", `20: until "2031-02-14t03:10:41z" is not a time`},
		{"window with a space for T", CSV, "2031-02-14T03:10:41Z,A-17", "2031-02-14 03:10:41Z,A-17", `20: until "2031-02-14 03:10:41Z" is not a time`},
		{"window with a comma fraction", JSON, "05:10:02.125Z", "05:10:02,125Z", `13: from "2031-02-14T05:10:02,125Z" is not a time`},
		{"window with microseconds", JSON, "05:10:02.125Z", "05:10:02.125000Z", `13: from "2031-02-14T05:10:02.125000Z" is not a time`},
		{"window with one digit of a fraction", YAML, "05:10:02.125Z", "05:10:02.1Z", `21: from "2031-02-14T05:10:02.1Z" is not a time`},
		{"window at hour 24", CSV, "2031-02-14T12:00:00Z,\nf-102", "2031-02-14T24:00:00Z,\nf-102", `22: until "2031-02-14T24:00:00Z" is not a time`},
		{"window on 30 February", YAML, "from: 2031-02-14T05:10:02.125Z", "from: 2031-02-30T05:10:02.125Z", `21: from "2031-02-30T05:10:02.125Z" is not a time`},
		{"second 60 at noon", CSV, "2031-02-14T12:00:00Z,\nf-102", "2031-02-14T11:59:60Z,\nf-102", `22: until "2031-02-14T11:59:60Z" is no leap second`},
		{"second 60 within a month", YAML, "from: 2031-02-13T23:00:00Z", "from: 2031-02-13T23:59:60Z", `23: from "2031-02-13T23:59:60Z" is no leap second`},
		{"second 61", JSON, `03:10:41Z"},"ref":"A-17"`, `03:10:61Z"},"ref":"A-17"`, `10: until "2031-02-14T03:10:61Z" is not a time`},
		{"neither closed nor open", JSON, `{"region":"low-east","open":{"from":"2031-02-14T02:00:00Z","until":"2031-02-14T04:00:00Z"}}`, `{"region":"low-east"}`, "14: the window is neither closed nor open\n14: from is missing\n14: until is missing"},
		{"closed and open", YAML, `ref: "C-1"`, "open: {from: 2031-02-14T01:00:00Z, until: 2031-02-14T02:00:00Z}", "23: the window is both closed and open"},
		{"window word", CSV, "low-east,,,,,,,,,,open", "low-east,,,,,,,,,,shut", `24: window "shut" is not one`},
		{"window twice", YAML, ", ref: \"A-17\"", ", ref: \"B, \\\"late\\\" \\\\ 2\"", "19: the window stands on line 18 already"},
		{"window twice in CSV", CSV, `,"B, ""late"" \ 2"`, ",A-17", "21: the window stands on line 20 already"},
		{"unknown window key", JSON, `"ref":"C-1"`, `"reference":"C-1"`, `15: the key "reference" is not known`},
		{"window key twice", JSON, `"ref":"C-1"`, `"ref":"C-1","ref":"C-1"`, `15: the key "ref" stands twice`},
		{"span key twice", YAML, "{from: 2031-02-14T05:10:02.125Z,", "{from: 2031-02-14T05:10:02.125Z, from: 2031-02-14T05:10:02.125Z,", `21: the key "from" stands twice`},
		{"reference with a tab", JSON, `"ref":"C-1"`, `"ref":"C\t1"`, `15: ref "C\t1" is not usable`},
		{"reference empty", JSON, `"ref":"C-1"`, `"ref":""`, `15: ref "" is not usable`},
		{"reference with a space at its end", CSV, ",C-1", ",C-1 ", `25: ref "C-1 " is not usable`},
		{"reference too long", JSON, `"ref":"C-1"`, `"ref":"` + strings.Repeat("x", 201) + `"`, `15: ref "` + strings.Repeat("x", 37) + `..." is not usable`},
		{"reference turns the text about", JSON, `"ref":"C-1"`, `"ref":"C\u202e1"`, `15: ref "C\u{202e}1" is not usable`},
		{"reference a number", JSON, `"ref":"C-1"`, `"ref":1`, `15: ref is not text`},

		// The texts themselves.
		{"empty", YAML, "", "", "1: the text is empty"},
		{"empty JSON", JSON, "", "", "1: the text is empty"},
		{"only white space", JSON, "", " \n ", "2: the text is not a JSON object"},
		{"only a comment", YAML, "", "# nothing\n", "1: the text is empty"},
		{"byte order mark", YAML, "closure_list", "\uFEFFclosure_list", "1: the text begins with a byte order mark"},
		{"byte order mark in CSV", CSV, "# closure_list", "\uFEFF# closure_list", "1: the text begins with a byte order mark"},
		{"byte order mark inside", YAML, "authority", "\uFEFFauthority", "3: the line holds a byte order mark"},
		{"NUL", CSV, "C-1", "C\x001", "25: the line holds a NUL byte"},
		{"NUL in YAML", YAML, "id: comet", "id: com\x00et", "15: the line holds a NUL byte"},
		{"NUL in JSON", JSON, `"windows":[`, "\x00\"windows\":[", "9: the text holds a NUL byte"},
		{"not UTF-8", CSV, "Ω", "\xCE", "23: the line holds bytes that are not UTF-8"},
		{"not UTF-8 in YAML", YAML, "Ω", "\xCE", "21: the line holds bytes that are not UTF-8"},
		{"not UTF-8 in JSON", JSON, "Ω", "\xCE", "13: a string holds bytes that are not UTF-8"},
		{"UTF-16", YAML, "", "\xFE\xFFc\x00l\x00", "1: the line holds bytes that are not UTF-8"},
		{"carriage return alone", CSV, ",C-1\n", ",C-1\r\r\n", "25: the line holds a carriage return inside a line"},
		{"line separator", YAML, "Ω 3", "Ω\u20283", "21: the line holds the control character U+2028"},
		{"escape character", CSV, "C-1", "C\x1b1", "25: the line holds the control character U+001B"},
		{"anchor", YAML, "beams: [north]", "beams: &b [north]", "7: an anchor"},
		{"alias", YAML, "replaces: [\"2031-045-A\", \"2031-044-C\"]\nbeams: [north]", "replaces: &b [\"2031-045-A\"]\nbeams: *b", "6: an anchor\n7: an alias"},
		{"merge key", YAML, "{id: dome,", "{<<: {id: dome},", "16: the key \"<<\" is not known\n16: id is missing"},
		{"tag", YAML, "unlisted_sky: closed", "unlisted_sky: !!str closed", "8: a tag"},
		{"block of text", YAML, "unlisted_sky: closed", "unlisted_sky: |\n  closed", "8: a block of text"},
		{"second document", YAML, "", "closure_list: 1\n---\nclosure_list: 1\n", "2: a second document follows the list"},
		{"YAML that is none", YAML, "window_count: 7", "window_count: 7: 8", "9: not well-formed YAML: mapping values are not allowed in this context"},
		{"YAML without an end", YAML, "open}\n", "open\n", "16: not well-formed YAML: did not find expected ',' or '}'"},
		{"YAML of a scalar", YAML, "", "closed\n", "1: the list is not a mapping"},
		{"JSON of an array", JSON, "", "[]", "1: the text is not a JSON object"},
		{"JSON trailing data", JSON, "04:00:00Z\"}}]}\n", "04:00:00Z\"}}]} {}\n", "16: something follows the list"},
		{"JSON trailing comma", JSON, `"throughout":"open"}],`, `"throughout":"open"},],`, "8: a value is missing"},
		{"JSON comment", JSON, "\"windows\":[", "// later\n\"windows\":[", `9: "/" cannot stand here`},
		{"JSON single quotes", JSON, `"ref":"C-1"`, `'ref':"C-1"`, `15: "'" cannot stand here`},
		{"JSON lone surrogate", JSON, `"ref":"C-1"`, `"ref":"\ud800"`, `15: a \u escape is not one`},
		{"JSON bad escape", JSON, `"ref":"C-1"`, `"ref":"\x41"`, `15: a string holds an escape that JSON does not have`},
		{"JSON newline in a string", JSON, `"ref":"C-1"`, "\"ref\":\"C\n1\"", `15: a string holds a control character`},
		{"JSON leading zero", JSON, `"ra_deg":150.1`, `"ra_deg":0150.1`, `3: "0150.1" is not a JSON number`},
		{"JSON NaN", JSON, `"ra_deg":150.1`, `"ra_deg":NaN`, `3: "N" cannot stand here`},
		{"JSON nested too deep", JSON, `"ref":"C-1"`, `"ref":` + strings.Repeat("[", 40), `15: objects and arrays are nested too deep`},
		{"JSON cut short", JSON, "\n{\"region\":\"comet\",\"closed\":{\"from\":\"2031-02-14T02:00:00Z\",\"until\":\"2031-02-14T04:00:00Z\"}}]}\n", "", "15: the text ends too soon"},
		{"JSON cut in a string", JSON, "", `{"closure_list":1,"id":"20`, "1: the text ends inside a string"},
		{"JSON windows an object", JSON, `"ref":"C-1"},` + "\n", `"ref":"C-1"},` + "\n7,", "1: window_count is 7 and the list has 8 windows\n16: a window is not an object"},
		{"CSV without a header row", CSV, csvHeader + "\n", "", "10: the header row is not as it must be; no row was read"},
		{"CSV of a head alone", CSV, "", "# closure_list: 1\n", "1: the list has no header row"},
		{"CSV header with a space", CSV, "region,shape", "region, shape", "10: the header row is not as it must be; no row was read"},
		{"CSV columns exchanged", CSV, "ra_deg,dec_deg", "dec_deg,ra_deg", "10: the header row is not as it must be; no row was read"},
		{"CSV head line without a space", CSV, "# beams: north", "#beams: north", "7: the head line is not of the form # key: value"},
		{"CSV head line of a remark", CSV, "# beams: north", "# sent at dusk", "7: the head line is not of the form # key: value"},
		{"CSV head line after the header row", CSV, "f-101,icrs", "# beams: south\nf-101,icrs", "11: the row has 1 fields"},
		{"CSV empty line", CSV, "dome,whole", "\ndome,whole", "19: the line is empty"},
		{"CSV field too many", CSV, ",C-1\n", ",C-1,\n", "25: the row has 15 fields"},
		{"CSV field too few", CSV, "2031-02-14T04:00:00Z,\nnorth", "2031-02-14T04:00:00Z\nnorth", "24: the row has 13 fields"},
		{"CSV quote without an end", CSV, `"B, ""late"" \ 2"`, `"B, ""late"" \ 2`, "21: a quoted field does not end as it must"},
		{"CSV quote and more", CSV, `\ 2"`, `\ 2" x`, "21: a quoted field does not end as it must"},
		{"CSV without a last line end", CSV, "comet,,,,,,,,,,closed,2031-02-14T02:00:00Z,2031-02-14T04:00:00Z,\n", "comet,,,,,,,,,,closed,2031-02-14T02:00:00Z,2031-02-14T04:00:00Z,", "26: the last line does not end: the text may be cut short"},
		{"CSV region described otherwise", CSV, "f-101,,,,,,,,,,closed,2031-02-14T03:10:02Z,2031-02-14T03:10:41Z,A-17", "f-101,icrs,150.1,2.2,0.050,,,,,,closed,2031-02-14T03:10:02Z,2031-02-14T03:10:41Z,A-17", "20: the row describes its region otherwise than line 11"},
		{"CSV row that says nothing", CSV, "dome,whole", "f-101,,,,,,,,,,,,,\ndome,whole", "19: the row says nothing that an earlier one does not"},
		{"CSV row without a window but with a time", CSV, "dome,whole_sky,,,,,,,,open,,,,", "dome,whole_sky,,,,,,,,open,,2031-02-14T02:00:00Z,,", `19: from "2031-02-14T02:00:00Z" has no meaning in a row without a window`},
		{"CSV box columns of a cone", CSV, "f-101,icrs,150.1,2.2,0.05,,", "f-101,icrs,150.1,2.2,0.05,1,", `11: az_from_deg "1" has no meaning with this shape`},
		{"CSV cone columns of a box", CSV, "low-east,horizon,,,,60", "low-east,horizon,,,1,60", `13: radius_deg "1" has no meaning with this shape`},
		{"CSV unknown shape", CSV, "f-101,icrs,", "f-101,cone,", `11: shape "cone" is not known`},
		{"CSV region not defined first", CSV, "low-east,horizon,,,,60,120,30,45,,,,,", "low-east,,,,,60,120,30,45,,,,,", `13: the region has no shape`},
		{"CSV track with a place", CSV, "comet,track,,,0.1", "comet,track,1,,0.1", "15: ra_deg \"1\" has no meaning but in a row with window point"},
		{"CSV point with an end", CSV, "point,2031-02-14T02:00:00Z,,", "point,2031-02-14T02:00:00Z,2031-02-14T02:00:01Z,", `16: until "2031-02-14T02:00:01Z" has no meaning in a point`},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := c.new
			if c.old != "" {
				base := undigested(t, c.format)
				if !strings.Contains(base, c.old) {
					t.Fatalf("the golden list has no %q", c.old)
				}
				text = strings.Replace(base, c.old, c.new, 1)
			}
			_, got := refused(t, text, c.format, Limits{})
			if got != c.want {
				t.Errorf("got:\n%s\nwant:\n%s", got, c.want)
			}
		})
	}
}
