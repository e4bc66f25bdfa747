package wire

import (
	"encoding/json"
	"errors"
	"reflect"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

type inner struct {
	A int8    `json:"a"`
	B float64 `json:"b,omitempty"`
}

type embedded struct {
	Deep string `json:"deep"`
	A    string `json:"a"`
}

type sample struct {
	embedded
	A     uint16             `json:"a"`
	Name  string             `json:"name"`
	On    bool               `json:"on"`
	At    time.Time          `json:"at"`
	Until *time.Time         `json:"until"`
	In    inner              `json:"in"`
	List  []inner            `json:"list"`
	Two   [2]float64         `json:"two"`
	Map   map[string]float64 `json:"map"`
	Any   any                `json:"any"`
	Raw   json.RawMessage    `json:"raw"`
	Plain string
	Not   string `json:"-"`
	own   string
}

func TestStrictTakesWhatIsWhole(t *testing.T) {
	const text = ` {"a": 65535, "name": "\u0041\n\ud83d\ude00é", "on": true, "at": "2031-02-14T03:10:02.5Z", "until": null, "deep": "d",
	"in": {"a": -128}, "list": [{"a":1,"b":2.5}, {}], "two": [1, -2e3], "map": {"x": 1, "": 2}, "any": {"k": [null, true, "s", 1.5, {}]},
	"raw": {"anything": [1, 2]}, "Plain": "p"} `
	var got, want sample
	if err := Strict([]byte(text), &got); err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal([]byte(text), &want); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(got, want) {
		t.Error(cmp.Diff(want, got, cmp.AllowUnexported(sample{}, embedded{})))
	}
	if got.own != "" || got.embedded.A != "" {
		t.Error("a hidden field was set")
	}
}

func TestStrictRefuses(t *testing.T) {
	deep := strings.Repeat("[", MaxDepth) + strings.Repeat("]", MaxDepth)
	cases := map[string]struct{ text, cause string }{
		"empty":                   {"", "ends where a value"},
		"blank":                   {" \n", "ends where a value"},
		"not an object":           {"[]", "want an object"},
		"null for a struct":       {"null", "want an object"},
		"trailing":                {"{} {}", "after the end"},
		"trailing comma":          {`{"a":1,}`, "want a key"},
		"trailing NUL":            {"{}\x00", "after the end"},
		"byte order mark":         {"\ufeff{}", "want an object"},
		"unknown":                 {`{"b":1}`, `unknown key "b"`},
		"case":                    {`{"A":1}`, `it is written "a"`},
		"case of a kind":          {`{"ON":true}`, `it is written "on"`},
		"Kelvin sign":             {`{"\u212ain":1}`, "unknown key"},
		"twice":                   {`{"a":1,"a":2}`, "given twice"},
		"twice, spelt apart":      {`{"a":1,"\u0061":2}`, "given twice"},
		"twice in a map":          {`{"map":{"x":1,"x":2}}`, "given twice"},
		"twice in anything":       {`{"any":{"x":1,"x":2}}`, "given twice"},
		"twice in raw":            {`{"raw":{"x":1,"x":2}}`, "given twice"},
		"unexported":              {`{"own":"x"}`, "unknown key"},
		"left out":                {`{"Not":"x"}`, "unknown key"},
		"null for a number":       {`{"a":null}`, "want a whole number"},
		"null for a string":       {`{"name":null}`, "want a string"},
		"null for a boolean":      {`{"on":null}`, "want true or false"},
		"null for a time":         {`{"at":null}`, "want a time"},
		"number for a string":     {`{"name":1}`, "want a string"},
		"string for a number":     {`{"a":"1"}`, "want a whole number"},
		"fraction for an integer": {`{"a":1.0}`, "whole number"},
		"exponent for an integer": {`{"a":1e2}`, "whole number"},
		"too large":               {`{"a":65536}`, "range of uint16"},
		"negative":                {`{"a":-1}`, "range of uint16"},
		"small overflow":          {`{"in":{"a":-129}}`, "range of int8"},
		"infinite":                {`{"in":{"b":1e999}}`, "too large"},
		"NaN":                     {`{"in":{"b":NaN}}`, "want a number"},
		"hexadecimal":             {`{"in":{"b":0x10}}`, "comma or the end"},
		"leading zero":            {`{"a":01}`, "leading zero"},
		"word":                    {`{"on":True}`, "true or false"},
		"word and more":           {`{"on":trueish}`, "comma or the end"},
		"offset":                  {`{"at":"2031-02-14T03:10:02+01:00"}`, "want the form"},
		"leap second":             {`{"until":"2016-12-31T23:59:60Z"}`, "no such second"},
		"array too short":         {`{"two":[1]}`, "want 2 elements"},
		"array too long":          {`{"two":[1,2,3]}`, "want 2 elements"},
		"array without an end":    {`{"two":[1,2`, "want a comma"},
		"comma first":             {`{"list":[,]}`, "want an object"},
		"colon missing":           {`{"a" 1}`, "want a colon"},
		"key bare":                {`{a:1}`, "want a key"},
		"single quotes":           {`{'a':1}`, "want a key"},
		"comment":                 {`{/**/}`, "want a key"},
		"control in a string":     {"{\"name\":\"a\nb\"}", "control character"},
		"bad escape":              {`{"name":"\x41"}`, "no such escape"},
		"short escape":            {`{"name":"\u12"}`, "no such escape"},
		"half a pair":             {`{"name":"\ud83d"}`, "half a surrogate"},
		"pair reversed":           {`{"name":"\ude00\ud83d"}`, "half a surrogate"},
		"high and letter":         {`{"name":"\ud83dx"}`, "half a surrogate"},
		"not UTF-8":               {"{\"name\":\"\xff\"}", "not UTF-8"},
		"overlong":                {"{\"name\":\"\xc0\x80\"}", "not UTF-8"},
		"surrogate in UTF-8":      {"{\"name\":\"\xed\xa0\x80\"}", "not UTF-8"},
		"not UTF-8 after escape":  {"{\"name\":\"\\n\xff\"}", "not UTF-8"},
		"string without an end":   {`{"name":"abc`, "without an end"},
		"escape at the end":       {`{"name":"abc\`, "without an end"},
		"too deep":                {`{"any":` + deep + `}`, "levels deep"},
		"far too deep":            {`{"any":` + strings.Repeat("[", 1e5), "levels deep"},
		"too deep in raw":         {`{"raw":` + strings.Repeat(`{"a":`, 1e5), "levels deep"},
	}
	for name, c := range cases {
		var into sample
		err := Strict([]byte(c.text), &into)
		var strict *StrictError
		if !errors.As(err, &strict) || !strings.Contains(strict.Cause, c.cause) {
			t.Errorf("%s: %v, want %q", name, err, c.cause)
		}
		if !reflect.ValueOf(into).IsZero() {
			t.Errorf("%s: something was left behind: %+v", name, into)
		}
	}
	var any any
	if err := Strict([]byte(deep), &any); err != nil {
		t.Errorf("%d levels: %v", MaxDepth, err)
	}
	if Strict([]byte("{}"), sample{}) == nil || Strict([]byte("{}"), nil) == nil || Strict([]byte("{}"), (*sample)(nil)) == nil {
		t.Error("something that is no pointer was taken")
	}
}

func TestStrictNamesThePlace(t *testing.T) {
	var into sample
	err := Strict([]byte("{\"name\": \"é\",\n \"list\": [{\"a\": 1},\n  {\"a\": 1, \"é/~\": 2}]}"), &into)
	want := `line 3, column 12 (/list/1/\u00e9~1~0): unknown key "\u00e9/~"`
	if err == nil || err.Error() != want {
		t.Errorf("%v, want %s", err, want)
	}
	err = Strict([]byte(`{"`+strings.Repeat("k", 500)+`\u0007":1}`), &into)
	if err == nil || len(err.Error()) > 300 || strings.ContainsRune(err.Error(), 7) {
		t.Errorf("%v", err)
	}
}

// FuzzStrict holds Strict against encoding/json: what it takes, that must take
// too, and with the same meaning.
func FuzzStrict(f *testing.F) {
	for _, s := range []string{
		`{"a":1,"name":"x","on":true,"in":{"a":1,"b":2},"list":[{}],"two":[1,2],"map":{"x":1},"any":[{"y":null}],"raw":[]}`,
		`{"a":1,"A":2}`, `{"name":"\ud83d\ude00"}`, `{"at":"2031-02-14T03:10:02Z","until":null}`, `{"any":{"a":1,"a":2}}`, `[1,2]`, `"x"`,
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		var got, want sample
		if err := Strict(b, &got); err == nil {
			if err := json.Unmarshal(b, &want); err != nil {
				t.Fatalf("%q: taken, while encoding/json says %v", b, err)
			}
			if !reflect.DeepEqual(got, want) {
				t.Fatalf("%q: %s", b, cmp.Diff(want, got, cmp.AllowUnexported(sample{}, embedded{})))
			}
		} else if len(err.Error()) > 700 {
			t.Fatalf("an error of %d bytes", len(err.Error()))
		}
		var one, two any
		if Strict(b, &one) == nil && (json.Unmarshal(b, &two) != nil || !reflect.DeepEqual(one, two)) {
			t.Fatalf("%q: %v against %v", b, one, two)
		}
	})
}
