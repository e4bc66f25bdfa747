package listfile

import (
	"errors"
	"fmt"
	"strings"
	"testing"
)

// TestLayoutsThatCannotBe changes one place of a sound layout. Line 1 of it is
// the empty one.
func TestLayoutsThatCannotBe(t *testing.T) {
	const window = `W (?P<region>\S+) (?P<state>SHUT|FREE) (?P<from>[^|]+)\|(?P<until>[^|]+)\|(?P<ref>.*)`
	for _, c := range []struct{ name, old, new, want string }{
		{"no YAML", "name: rows", "name: rows: x", "3: not well-formed YAML: mapping values are not allowed in this context"},
		{"empty", "", "", "1: the text is empty"},
		{"a list", "", "- layout\n", "1: the layout is not a mapping"},
		{"version", "layout: 1", "layout: 2", `2: layout "2" is not a version that is read here`},
		{"no version", "layout: 1\n", "", `1: layout is missing`},
		{"no name", "name: rows\n", "", `1: name is missing`},
		{"a name with a blank", "name: rows", "name: my rows", `3: name "my rows" is not a name`},
		{"unknown key", "name: rows", "name: rows\nlocale: de", `4: the key "locale" is not known`},
		{"key twice", "name: rows", "name: rows\nname: rows", `4: the key "name" stands twice`},
		{"an anchor", "name: rows", "name: &a rows", `3: an anchor`},
		{"an encoding", "name: rows", "name: rows\nencoding: ebcdic", `4: encoding "ebcdic" is not known`},
		{"a zone by name", `zone: "+00:00"`, `zone: UTC`, `4: zone "UTC" is not an offset`},
		{"no zone", "zone: \"+00:00\"\n", ``, "8: the form \"YYYY-MM-DD hh:mm:ss\" of issued says no zone, nor does the layout\n8: the form \"YYYY-MM-DD hh:mm:ss\" of covers_from says no zone, nor does the layout\n8: the form \"YYYY-MM-DD hh:mm:ss\" of covers_until says no zone, nor does the layout\n10: the form \"YYYY-MM-DD hh:mm:ss\" of from says no zone, nor does the layout\n10: the form \"YYYY-MM-DD hh:mm:ss\" of until says no zone, nor does the layout"},
		{"two replacements", "name: rows", "name: rows\nid_replace: --", `4: id_replace "--" is not known`},
		{"a form without a meaning", `["YYYY-MM-DD hh:mm:ss",`, `["YYYY-MM-DD hh:mm:ss q",`, `6: "YYYY-MM-DD hh:mm:ss q": the letter q means nothing in a form; put words in single quotes`},
		{"forms of different parts", `["YYYY-MM-DD hh:mm:ss",`, `["hh:mm:ss",`, `6: the forms of one name say different parts of a time`},
		{"a form that nothing has", `times: {`, `times: {other: "hh:mm", `, `6: no value is written in the form "other"`},
		{"a form named like a unit", `times: {`, `times: {deg: "hh:mm", `, `6: "deg" is the name of a unit`},
		{"as of no value", `as: {`, `as: {right_ascension: deg, `, `7: as names "right_ascension", which is no value`},
		{"a unit that the value cannot have", `ra: deg`, `ra: arcsec`, `7: ra cannot be written in "arcsec"`},
		{"a form that is none", `from: stamp`, `from: stump`, `7: no form is named "stump"`},
		{"nothing says how", `dec: deg, `, ``, `10: nothing says how dec is written`},
		{"head unknown", `head: {`, `head: {observatory: x, `, `5: head cannot fix "observatory"`},
		{"head fixes the digest", `head: {`, `head: {digest: x, `, `5: head cannot fix "digest"`},
		{"head twice", `head: {`, `head: {issued: "2031-02-14 00:00:00", `, `5: the layout fixes issued and reads it from the text`},
		{"head without id", `id: rows, `, ``, `1: nothing says id`},
		{"head without an end", `\|(?P<covers_until>.+)`, `\|.+`, "1: nothing says when the coverage ends"},
		{"head without coverage", `H (?P<issued>.{19,23})\|(?P<covers_from>.+)\|`, `H (?P<issued>.{19,23})\|.+\|`, `1: nothing says covers_from`},
		{"no lines", "lines:", "rows:", "1: lines is missing\n8: the key \"rows\" is not known"},
		{"no reading rule", "", "layout: 1\nname: a\nlines: []\n", "1: nothing says id\n1: nothing says authority\n1: nothing says issued\n1: nothing says covers_from\n1: nothing says unlisted_sky\n1: nothing says when the coverage ends\n1: no rule reads a region or a window"},
		{"a rule of no kind", "{is: head, match", "{match", `9: is is missing`},
		{"a rule of an unknown kind", "{is: head, match", "{is: title, match", `9: is "title" is not known`},
		{"a rule with an unknown key", "{is: head, match", "{is: head, flags: i, match", `9: the key "flags" is not known`},
		{"no expression", `match: '` + window + `', `, ``, `11: match is missing`},
		{"no example", `, example: R f-101 150.1 2.2 0.05 open`, ``, `10: the rule has no example`},
		{"an expression that never matches its example", `example: R f-101`, `example: S f-101`, `10: the expression does not match its example`},
		{"an expression that never matches anything", `match: 'R `, `match: 'R$x `, `10: the expression does not match its example`},
		{"an expression that is none", `match: 'R (`, `match: 'R ((`, "10: the expression is not one: missing closing ): `R ((?P<region>\\S+) (?P<ra>\\S+) (?P<dec>\\S+) (?P<radius>\\S+) ?(?P<throughout>\\w*)`"},
		{"a look-ahead", `match: 'R (`, `match: '(?=R)R (`, "10: the expression is not one: invalid or unsupported Perl syntax: `(?=`"},
		{"a repetition of repetitions", `match: 'R (`, `match: '(?:(?:R{50}){50})?R (`, "10: the expression is not one: invalid repeat count: `{50}`"},
		{"a heavy expression", `match: 'R (`, `match: '(?:R{900}R{900}R{900})?R (`, "10: the expression is too heavy: more than 2000 steps"},
		{"heavy expressions together", "lines:", "lines:" + strings.Repeat("\n  - {is: ignore, match: '(?:R{900}x{900})?x', example: x}", 12), "20: the layout's expressions are too heavy together: more than 20000 steps"},
		{"many examples", "example: R f-101 150.1 2.2 0.05 open", "example: [" + strings.Repeat("R a 1 2 3, ", 10) + "R f 1 2 3]", "10: the rule has more than 10 examples"},
		{"a repetition without end", `match: 'R (`, `match: 'R{2000} (`, "10: the expression is not one: invalid repeat count: `{2000}`"},
		{"an endless expression", `match: 'R (`, `match: 'R` + strings.Repeat("R?", 600) + ` (`, "10: the expression is longer than 1000 bytes"},
		{"a group without a name", `match: 'R (`, `match: '(R) (`, `10: a group without a name`},
		{"a group of no value", `(?P<radius>`, `(?P<size>`, `10: the group "size" is no value that this line can have`},
		{"a group twice", `(?P<radius>`, `(?P<dec>`, "10: the group \"dec\" stands twice"},
		{"a group that another kind has", `(?P<ref>`, `(?P<beams>`, `11: the group "beams" is no value that this line can have`},
		{"a region without shape", ` shape: icrs,`, ``, "10: a region of shape none has no ra\n10: a region of shape none has no dec\n10: a region of shape none has no radius\n10: shape is missing"},
		{"a region of another shape", ` shape: icrs,`, ` shape: horizon,`, "10: the region has no az_from\n10: the region has no az_to\n10: the region has no el_from\n10: the region has no el_to\n10: a region of shape horizon has no ra\n10: a region of shape horizon has no dec\n10: a region of shape horizon has no radius"},
		{"a region of no such shape", ` shape: icrs,`, ` shape: ellipse,`, `10: shape "ellipse" is not known`},
		{"a region that lacks a value", ` (?P<radius>\S+) ?`, ` \S+ ?`, "10: the region has no radius"},
		{"a cone seen through the air", ` shape: icrs,`, ` shape: icrs, observed: true,`, "10: observed means nothing in this rule"},
		{"a track without points", ` shape: icrs, match: 'R (?P<region>\S+) (?P<ra>\S+) (?P<dec>\S+) (?P`, ` shape: track, match: 'R (?P<region>\S+) \S+ \S+ (?P`, "10: the region is a track, and no rule reads points"},
		{"a window without an end", `(?P<until>[^|]+)`, `[^|]+`, "11: the window has neither until nor for, or both"},
		{"a window without a start", `(?P<from>[^|]+)`, `[^|]+`, "11: the window has no from"},
		{"a window without state", `(?P<state>SHUT|FREE)`, `(?:SHUT|FREE)`, "11: the window has no state\n11: words means nothing in this rule"},
		{"a window with two states", "words: {SHUT: closed, FREE: open}", "values: {state: closed}", "12: state is given twice"},
		{"a word for neither", "FREE: open", "FREE: maybe", `12: words give "maybe", which is neither closed nor open`},
		{"a window fixed in time", "words: {", `values: {from: "2031-02-14 03:10:02"}, words: {`, `12: values cannot fix "from"`},
		{"spans without each", `(?P<ref>.*)`, `(?P<spans>.*)`, `11: the group "spans" is no value that this line can have`},
		{"each without spans", "words: {", `each: '.', words: {`, "11: each is read from the group spans; one of them is missing"},
		{"midnight with its own day", "words: {", `midnight: night, words: {`, "11: midnight is night, and the form \"YYYY-MM-DD hh:mm:ss\" of from has its own day"},
		{"a section that nothing enters", "{is: region, ", "{is: region, in: [fields], ", `10: no line ever enters the section "fields"`},
		{"a rule that another hides", "  - {is: region, ", "  - {is: ignore, match: '.*', example: x}\n  - {is: region, ", "11: the rule on line 10 takes this example first\n12: the rule on line 10 takes this example first"},
		{"a rule given twice", "  - {is: region, ", "  - {is: mark, match: 'W .*', example: W f-101}\n  - {is: region, ", "12: the rule on line 10 takes this example first"},
		{"an ignored example that another reads", "  - {is: region, ", "  - {is: ignore, match: 'R f-1 .*', example: R f-1 1 1 1}\n  - {is: region, ", "10: the example is ignored, and the rule on line 11 reads it"},
		{"an example that cannot be read", "example: R f-101 150.1", "example: R f-101 15o.1", `10: the example cannot be read: ra "15o.1" is not an angle in deg`},
		{"an example out of range", "example: R f-101 150.1 2.2", "example: R f-101 150.1 92.2", `10: the example cannot be read: dec_deg "92.2" is out of range`},
		{"an example that does not fit its form", "SHUT 2031-02-14 03:10:02|", "SHUT 14-02-2031 03:10:02|", `11: the example cannot be read: from "14-02-2031 03:10:02" does not fit its form`},
		{"an example with an empty window", "|2031-02-14 03:10:41.25|", "|2031-02-14 03:10:02|", `11: the example cannot be read: the window is empty: from is not before until`},
		{"a form that lacks its date", `["YYYY-MM-DD hh:mm:ss", "YYYY-MM-DD hh:mm:ss.f"]`, `["hh:mm:ss", "hh:mm:ss.f"]`, "9: the form \"hh:mm:ss\" of issued lacks a part of its date, and no rule reads one\n9: the form \"hh:mm:ss\" of covers_from lacks a part of its date, and no rule reads one\n9: the form \"hh:mm:ss\" of covers_until lacks a part of its date, and no rule reads one\n11: the form \"hh:mm:ss\" of from lacks a part of its date, and no rule reads one\n11: the form \"hh:mm:ss\" of until lacks a part of its date, and no rule reads one"},
		{"a joint without text", "lines:", "continuation: {match: ' .*', example: \" x\"}\nlines:", "8: the expression has no group `text`"},
		{"a joint without example", "lines:", "continuation: {match: ' (?P<text>.*)'}\nlines:", "8: the rule has no example"},
		{"a joint that takes a rule's line", "lines:", "continuation: {match: 'R(?P<text>.*)', example: R x}\nlines:", "11: an example of the rule is taken for the continuation of the line before"},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := c.new
			if c.old != "" {
				if !strings.Contains(rowLayout, c.old) {
					t.Fatalf("the layout has no %q", c.old)
				}
				text = strings.Replace(rowLayout, c.old, c.new, 1)
			}
			l, err := CompileLayout([]byte(text))
			var r *LayoutError
			if !errors.As(err, &r) || l != nil {
				t.Fatalf("compiled, or another error: %v", err)
			}
			var got []string
			for _, e := range r.Lines {
				got = append(got, fmt.Sprintf("%d: %s", e.Line, e.Cause))
				if e.Mend == "" {
					t.Errorf("no mend: %+v", e)
				}
			}
			if s := strings.Join(got, "\n"); s != c.want {
				t.Errorf("got:\n%s\nwant:\n%s", s, c.want)
			}
		})
	}
}
