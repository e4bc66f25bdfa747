package wire

import (
	"strings"
	"testing"
)

const (
	src   = `"kind":"detector","source":"a",` + at
	craft = `{"kind":"aircraft","source":"rx-1","aircraft":"a",` + at
	beam  = `{"kind":"aim","beam":"north",` + at
	tele  = `{"kind":"aim","telescope":"t",` + at
	sight = `{"kind":"sighting","source":"s",` + at
	watch = `{"kind":"watch","post":"p",` + at
)

// malformed is lines that are no facts, each with words of its refusal.
var malformed = []struct{ name, line, want string }{
	{"empty", ``, "not a JSON object"},
	{"blank", `   `, "not a JSON object"},
	{"byte order mark", "\ufeff{" + src + `,"state":"clear"}`, "not a JSON object"},
	{"array", `[]`, "not a JSON object"},
	{"two objects", `{` + src + `,"state":"clear"}{}`, "text after the object"},
	{"trailing comma", `{` + src + `,"state":"clear",}`, "no key in quotes"},
	{"trailing garbage", `{` + src + `,"state":"clear"} x`, "text after the object"},
	{"NUL at the end", `{` + src + `,"state":"clear"}` + "\x00", "text after the object"},
	{"cut short", `{` + src + `,"state":"clear"`, "no comma and no end"},
	{"cut in a key", `{"ki`, "without an end"},
	{"cut in a value", `{"kind":"detec`, "without an end"},
	{"no colon", `{"kind" "detector"}`, "no colon"},
	{"key without quotes", `{kind:"detector"}`, "no key in quotes"},
	{"single quotes", `{'kind':'detector'}`, "no key in quotes"},
	{"comment", `{/* */` + src + `,"state":"clear"}`, "no key in quotes"},
	{"too long", `{"kind":"` + strings.Repeat("x", MaxFactLine) + `"}`, "longer than"},
	{"deep", `{"kind":` + strings.Repeat("[", 10000), "not a string"},
	{"nothing said", `{}`, "kind: missing"},
	{"no kind", `{"source":"a",` + at + `}`, "kind: missing"},
	{"unknown kind", `{"kind":"hold","beam":"north",` + at + `}`, "no such word"},
	{"kind in capitals", `{"kind":"Detector","source":"a",` + at + `,"state":"clear"}`, "no such word"},
	{"kind null", `{"kind":null}`, "not a string"},
	{"kind empty", `{"kind":""}`, "no such word"},
	{"unknown field", `{` + src + `,"state":"clear","colour":"red"}`, `no fact has a field "colour"`},
	{"case-variant field", `{` + src + `,"State":"clear"}`, "write it state"},
	{"case-variant twin", `{` + src + `,"state":"alarm","STATE":"clear"}`, "write it state"},
	{"field twice", `{` + src + `,"state":"alarm","state":"clear"}`, "state: given twice"},
	{"field twice, one escaped", `{` + src + `,"state":"alarm","stat\u0065":"clear"}`, "state: given twice"},
	{"empty key", `{"":1}`, "no fact has a field"},
	{"field of another kind", `{` + src + `,"state":"clear","safe":true}`, "safe: not a field of this kind"},
	{"nested field at the top", `{` + src + `,"state":"clear","ra_deg":1}`, "no fact has a field"},
	{"field missing", `{` + src + `}`, "state: missing"},
	{"source missing", `{"kind":"detector",` + at + `,"state":"clear"}`, "source: missing"},
	{"instant missing", `{"kind":"detector","source":"a","state":"clear"}`, "at: missing"},
	{"name with a blank", `{"kind":"detector","source":"a b",` + at + `,"state":"clear"}`, "not a name"},
	{"name of dots", `{"kind":"detector","source":"..",` + at + `,"state":"clear"}`, "not a name"},
	{"name with a slash", `{"kind":"detector","source":"a/b",` + at + `,"state":"clear"}`, "not a name"},
	{"name empty", `{"kind":"detector","source":"",` + at + `,"state":"clear"}`, "not a name"},
	{"name too long", `{"kind":"detector","source":"` + strings.Repeat("a", 65) + `",` + at + `,"state":"clear"}`, "not a name"},
	{"name of controls", `{"kind":"detector","source":"\u001b[31m",` + at + `,"state":"clear"}`, `"\x1b[31m" is not a name`},
	{"name of every beam", `{"kind":"shutter","beam":"*",` + at + `,"position":"closed"}`, "not a name"},
	{"name a number", `{"kind":"detector","source":7,` + at + `,"state":"clear"}`, "not a string"},
	{"control in a string", "{\"kind\":\"det\nector\"}", "control character"},
	{"bad escape", `{"kind":"\q"}`, "no such escape"},
	{"half a surrogate", `{"kind":"\ud800"}`, "surrogate"},
	{"not UTF-8", "{\"kind\":\"\xff\"}", "not UTF-8"},
	{"not UTF-8 in a key", "{\"\xff\":1}", "not UTF-8"},

	{"hour 24", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T24:00:00Z"}`, "no such hour"},
	{"second 60", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:09:60Z"}`, "no such second"},
	{"offset", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:10:01+00:00"}`, "want the form"},
	{"lower case", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14t03:10:01z"}`, "want the form"},
	{"comma fraction", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:10:01,5Z"}`, "want the form"},
	{"short hour", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T3:10:01Z"}`, "want the form"},
	{"no zone", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:10:01"}`, "want the form"},
	{"blank for T", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14 03:10:01Z"}`, "want the form"},
	{"no such day", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-29T03:10:01Z"}`, "no such day"},
	{"Unix seconds", `{"kind":"detector","source":"a","state":"clear","at":1928805001}`, "not a string"},
	{"ten digits", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:10:01.1234567890Z"}`, "want the form"},
	{"ahead", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-14T03:10:02.500000001Z"}`, "ahead of this clock"},
	{"behind", `{"kind":"detector","source":"a","state":"clear","at":"2031-02-13T03:10:01.999999999Z"}`, "behind this clock"},
	{"far behind", `{"kind":"detector","source":"a","state":"clear","at":"1970-01-01T00:00:00Z"}`, "behind this clock"},

	{"NaN", craft + `,"lat_deg":NaN,"lon_deg":0}`, "lat_deg: not a number"},
	{"Infinity", craft + `,"speed_mps":Infinity}`, "not a number"},
	{"minus Infinity", craft + `,"speed_mps":-Infinity}`, "not a number"},
	{"hexadecimal", craft + `,"speed_mps":0x10}`, "no comma and no end"},
	{"underscore", craft + `,"speed_mps":1_0}`, "no comma and no end"},
	{"leading plus", craft + `,"speed_mps":+1}`, "not a number"},
	{"leading zero", craft + `,"speed_mps":01}`, "leading zero"},
	{"leading point", craft + `,"speed_mps":.5}`, "not a number"},
	{"trailing point", craft + `,"speed_mps":5.}`, "no digit after the point"},
	{"empty exponent", craft + `,"speed_mps":5e}`, "no digit in the exponent"},
	{"decimal comma", craft + `,"speed_mps":5,5}`, "no key in quotes"},
	{"too large for a number", craft + `,"speed_mps":1e400}`, "too large"},
	{"number in quotes", craft + `,"speed_mps":"5"}`, "not a number"},
	{"number null", craft + `,"speed_mps":null}`, "not a number"},
	{"latitude", craft + `,"lat_deg":90.0001,"lon_deg":0}`, "lat_deg: 90.0001 is out of range"},
	{"longitude", craft + `,"lat_deg":0,"lon_deg":-181}`, "out of range"},
	{"half a position", craft + `,"lat_deg":0}`, "half a position"},
	{"altitude of what", craft + `,"altitude_m":1000}`, "altitude_from"},
	{"altitude of nothing", craft + `,"altitude_from":"pressure"}`, "altitude_from"},
	{"altitude in feet", craft + `,"altitude_m":350000,"altitude_from":"pressure"}`, "out of range"},
	{"altitude unknown", craft + `,"altitude_m":1000,"altitude_from":"ground"}`, "give one of ellipsoid, mean_sea_level, pressure"},
	{"speed below 0", craft + `,"speed_mps":-1}`, "out of range"},
	{"track", craft + `,"track_deg":361}`, "out of range"},
	{"error 0", craft + `,"error_m":0}`, "leave it out when it is not known"},
	{"error below 0", craft + `,"vertical_error_m":-5}`, "out of range"},
	{"on the ground as a number", craft + `,"on_ground":1}`, "neither true nor false"},
	{"on the ground as a word", craft + `,"on_ground":"false"}`, "neither true nor false"},
	{"on the ground, null", craft + `,"on_ground":null}`, "neither true nor false"},
	{"on the ground, Python", craft + `,"on_ground":False}`, "neither true nor false"},
	{"true and more", craft + `,"on_ground":truely}`, "no comma and no end"},
	{"aircraft missing", `{"kind":"aircraft","source":"rx-1",` + at + `}`, "aircraft: missing"},

	{"aim of nobody", `{"kind":"aim",` + at + `,"icrs":{"ra_deg":1,"dec_deg":1}}`, "beam or telescope"},
	{"aim of two", `{"kind":"aim","beam":"b","telescope":"t",` + at + `,"icrs":{"ra_deg":1,"dec_deg":1}}`, "beam or telescope"},
	{"aim of a source", `{"kind":"aim","beam":"b","source":"s",` + at + `,"icrs":{"ra_deg":1,"dec_deg":1}}`, "not a field of this kind"},
	{"aim nowhere", beam + `}`, "state the aim once"},
	{"aim twice", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"of_date":{"ra_deg":1,"dec_deg":1}}`, "state the aim once"},
	{"right ascension", beam + `,"icrs":{"ra_deg":360.5,"dec_deg":1}}`, "icrs.ra_deg: 360.5 is out of range"},
	{"right ascension below 0", beam + `,"icrs":{"ra_deg":-0.1,"dec_deg":1}}`, "out of range"},
	{"declination", beam + `,"icrs":{"ra_deg":1,"dec_deg":-91}}`, "icrs.dec_deg"},
	{"declination missing", beam + `,"icrs":{"ra_deg":1}}`, "icrs: not whole"},
	{"declination twice", beam + `,"icrs":{"ra_deg":1,"dec_deg":1,"dec_deg":2}}`, "icrs.dec_deg: given twice"},
	{"aim of hours", beam + `,"icrs":{"ra_h":1,"dec_deg":1}}`, `icrs: no field "ra_h"`},
	{"aim an array", beam + `,"icrs":[1,2]}`, "icrs: not an object"},
	{"aim null", beam + `,"icrs":null}`, "icrs: not an object"},
	{"aim without an end", beam + `,"icrs":{"ra_deg":1,`, "no key in quotes"},
	{"aim with a comma first", beam + `,"icrs":{,"ra_deg":1,"dec_deg":1}}`, "no key in quotes"},
	{"azimuth", tele + `,"refracted":true,"horizon":{"az_deg":-1,"el_deg":1}}`, "horizon.az_deg"},
	{"elevation", tele + `,"refracted":true,"horizon":{"az_deg":1,"el_deg":91}}`, "horizon.el_deg"},
	{"horizon, refracted or not", tele + `,"horizon":{"az_deg":1,"el_deg":1}}`, "through the air"},
	{"refracted stars", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"refracted":true}`, "through the air"},
	{"field of a beam", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"field_radius_deg":1}`, "a beam has no field"},
	{"exposing beam", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"exposing":true}`, "does not expose"},
	{"aim error 0", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"error_arcsec":0}`, "out of range"},
	{"aim error too large", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"error_arcsec":36001}`, "out of range"},
	{"motion unknown", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"motion":""}`, "give one of tracking, slewing, parked, fixed"},
	{"rates of another frame", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"rate_arcsec_s":{"az":1,"el":1}}`, "not in the frame"},
	{"rates mixed", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"rate_arcsec_s":{"ra":1,"el":1}}`, "rate_arcsec_s: no field"},
	{"rates too large", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"rate_arcsec_s":{"ra":1e9,"dec":1}}`, "rate_arcsec_s.ra"},
	{"rates empty", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"rate_arcsec_s":{}}`, "not whole"},
	{"proper motion of date", beam + `,"of_date":{"ra_deg":1,"dec_deg":1},"pm_mas_yr":{"ra":1,"dec":1}}`, "icrs alone"},
	{"table of one", beam + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1}]}`, "table: not an aim"},
	{"table of none", beam + `,"table":[]}`, "table: not an aim"},
	{"table out of order", beam + `,"table":[{"at":"2031-02-14T03:00:01Z","ra_deg":1,"dec_deg":1},{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1}]}`, "in order of time"},
	{"table of leaps", beam + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1},{"at":"2031-02-14T03:00:01Z","ra_deg":181,"dec_deg":1}]}`, "less than 90 degrees"},
	{"table with half a point", beam + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1}]}`, "table[0]: not whole"},
	{"table with a bad point", beam + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1},{"at":"2031-02-14T03:00:60Z","ra_deg":1,"dec_deg":1}]}`, "table[1].at"},
	{"table too long", beam + `,"table":[` + strings.Repeat(`{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1},`, MaxPoints) + `{}]}`, "more than 512 points"},
	{"table with rates", beam + `,"table":[{"at":"2031-02-14T03:00:00Z","ra_deg":1,"dec_deg":1},{"at":"2031-02-14T03:00:01Z","ra_deg":1,"dec_deg":1}],"rate_arcsec_s":{"ra":1,"dec":1}}`, "how it moves"},
	{"target of controls", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"target":"a\u0000b"}`, "no name of a target"},
	{"target turned round", beam + `,"icrs":{"ra_deg":1,"dec_deg":1},"target":"a\u202eb"}`, "no name of a target"},

	{"sighting half", sight + `,"az_deg":1,"el_deg":1}`, "half a direction"},
	{"sighting spread 0", sight + `,"az_deg":1,"el_deg":1,"spread_deg":0}`, "out of range"},
	{"sighting for ever", sight + `,"for_s":1e6}`, "out of range"},
	{"sighting clear of something", sight + `,"for_s":60,"clear":true}`, "clear takes back all"},
	{"watch of nobody said", watch + `,"until":"2031-02-14T05:00:00Z"}`, "by: missing"},
	{"watch without an end", watch + `,"by":["a"]}`, "until: missing"},
	{"watch of one named twice", watch + `,"by":["a","A"],"until":"2031-02-14T05:00:00Z"}`, "by[1]"},
	{"watch of a nameless", watch + `,"by":[" "],"until":"2031-02-14T05:00:00Z"}`, "no name of a person"},
	{"watch by a word", watch + `,"by":"a","until":"2031-02-14T05:00:00Z"}`, "not an array"},
	{"watch by a crowd", watch + `,"by":[` + crowd(MaxPeople+1) + `],"until":"2031-02-14T05:00:00Z"}`, "more than 32 people"},
	{"power below 0", `{"kind":"laser","beam":"b",` + at + `,"emitting":true,"power_w":-1}`, "out of range"},
	{"pressure in inches", `{"kind":"weather","source":"m",` + at + `,"pressure_hpa":29.92,"temperature_c":4}`, "out of range"},
	{"temperature in kelvin", `{"kind":"weather","source":"m",` + at + `,"pressure_hpa":760,"temperature_c":277}`, "out of range"},
	{"heard of what", `{"kind":"heard","source":"m",` + at + `,"scope":"all"}`, "give one of link, reception"},
	{"connected from outside", `{"kind":"heard","source":"m",` + at + `,"scope":"link","connected":true}`, "no fact has a field"},
}

func crowd(n int) string {
	names := make([]string, n)
	for i := range names {
		names[i] = `"` + strings.Repeat("x", i+1) + `"`
	}
	return strings.Join(names, ",")
}

func TestMalformedLinesAreRefused(t *testing.T) {
	if len(malformed) < 60 {
		t.Errorf("%d lines", len(malformed))
	}
	p := NewParser(100)
	for _, c := range malformed {
		name, body, err := p.Fact([]byte(c.line), received)
		if err == nil {
			t.Errorf("%s: taken as %+v", c.name, body)
			continue
		}
		checkRefusal(t, c.line, name, body, err)
		if !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
}

// TestEveryCutLineIsRefused cuts each good line at each byte.
func TestEveryCutLineIsRefused(t *testing.T) {
	for _, line := range seeds() {
		for i := range len(line) {
			name, body, err := ParseFact([]byte(line[:i]), received)
			if err == nil {
				t.Fatalf("%s was taken", line[:i])
			}
			checkRefusal(t, line[:i], name, body, err)
		}
	}
}
