package api

import (
	"net/http"
	"net/url"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/danielgtaylor/huma/v2"

	"beamward/closures/wire"
)

// maxQuery bounds a query, in bytes.
const maxQuery = 4096

// readQuery reads the query and refuses parameters that the route does not
// know or that come twice.
func (c *call) readQuery(known []string) error {
	raw := c.r.URL.RawQuery
	if raw == "" {
		return nil
	}
	if len(raw) > maxQuery {
		return badQuery("", "the query is too long", "send at most 4096 bytes")
	}
	values, err := url.ParseQuery(raw)
	if err != nil {
		return badQuery("", "the query cannot be read", "write name=value pairs with & between them, escaped as URLs are")
	}
	for name, all := range values {
		switch {
		case !slices.Contains(known, name):
			mend := "send none here"
			if len(known) > 0 {
				mend = "use " + strings.Join(known, ", ")
			}
			return badQuery("", "there is a query parameter that is not known here", mend)
		case len(all) > 1:
			return badQuery(name, "it was given twice", "give it once")
		}
	}
	c.query = values
	return nil
}

func badQuery(name, cause, mend string) *refusal {
	r := refuse(http.StatusBadRequest, cause, "")
	if name != "" {
		r.Detail = name + ": " + cause
	}
	r.Errors = []wire.ProblemEntry{{Field: name, Detail: cause, Mend: mend}}
	return r
}

// has reports whether a parameter was given.
func (c *call) has(name string) bool { return c.query.Has(name) }

// number reads a parameter within [lo, hi]; def where it was not given.
func (c *call) number(name string, lo, hi, def float64) (float64, error) {
	if !c.has(name) {
		return def, nil
	}
	v, err := wire.ParseNumber(c.query.Get(name))
	if err != nil || !(v >= lo && v <= hi) {
		return 0, badQuery(name, "it is not a number within the bounds", "give a plain decimal number from "+plain(lo)+" to "+plain(hi))
	}
	return v, nil
}

func plain(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

// count reads a whole number within [lo, hi]; def where it was not given.
func (c *call) count(name string, lo, hi, def uint64) (uint64, error) {
	if !c.has(name) {
		return def, nil
	}
	text := c.query.Get(name)
	v, err := strconv.ParseUint(text, 10, 64)
	if err != nil || strconv.FormatUint(v, 10) != text || v < lo || v > hi {
		return 0, badQuery(name, "it is not a whole number within the bounds", "give digits alone, from "+strconv.FormatUint(lo, 10)+" to "+strconv.FormatUint(hi, 10))
	}
	return v, nil
}

// instant reads a time; def where it was not given.
func (c *call) instant(name string, def time.Time) (time.Time, error) {
	if !c.has(name) {
		return def, nil
	}
	t, err := wire.ParseTime(c.query.Get(name))
	if err != nil {
		return time.Time{}, badQuery(name, "it is not a time", "write it as 2031-02-14T03:10:02Z, in UTC")
	}
	return t, nil
}

// word reads one of a few words; the first where it was not given.
func (c *call) word(name string, words ...string) (string, error) {
	if !c.has(name) {
		return words[0], nil
	}
	text := c.query.Get(name)
	if !slices.Contains(words, text) {
		return "", badQuery(name, "it is none of the words that it can be", "use "+strings.Join(words, ", "))
	}
	return text, nil
}

// text reads a short text without control characters; empty where it was not
// given.
func (c *call) text(name string, most int) (string, error) {
	if !c.has(name) {
		return "", nil
	}
	text := c.query.Get(name)
	if text == "" || !cleanText(text, most) {
		return "", badQuery(name, "it is empty, too long or holds control characters", "give 1 to "+strconv.Itoa(most)+" characters")
	}
	return text, nil
}

// The schemas of parameters.
func numberOf(lo, hi float64) *huma.Schema {
	return &huma.Schema{Type: huma.TypeNumber, Minimum: &lo, Maximum: &hi}
}

func countOf(lo, hi float64) *huma.Schema {
	return &huma.Schema{Type: huma.TypeInteger, Minimum: &lo, Maximum: &hi}
}

func timeOf() *huma.Schema {
	return &huma.Schema{Type: huma.TypeString, Format: "date-time", Pattern: `^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d{1,9})?Z$`}
}

func textOf(most int) *huma.Schema { return &huma.Schema{Type: huma.TypeString, MaxLength: &most} }

func wordOf(words ...string) *huma.Schema {
	s := &huma.Schema{Type: huma.TypeString}
	for _, w := range words {
		s.Enum = append(s.Enum, w)
	}
	return s
}
