package replay

import (
	"bytes"
	"encoding/json"
	"fmt"
	"sort"
	"strconv"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Difference is a place where the replay and the record say two things.
type Difference struct {
	Seq      uint64          `json:"seq"`             // of the entry that shows it
	At       time.Time       `json:"at"`              // of that entry
	Step     uint64          `json:"step"`            // number of the step's tick; 0: before the first of the run
	Beam     closures.BeamID `json:"beam,omitempty"`  // of a decision; empty: of no single one
	What     string          `json:"what"`            // fixed text
	Field    string          `json:"field,omitempty"` // the first place where they differ, such as reasons[0].margin; empty: it is no single one
	Recorded string          `json:"recorded"`        // as the record writes it
	Replayed string          `json:"replayed"`
}

// String says where and what on one line.
func (d *Difference) String() string {
	s := fmt.Sprintf("entry %d at %s: %s", d.Seq, wire.FormatTime(d.At), d.What)
	if d.Beam != "" {
		s += ", beam " + string(d.Beam)
	}
	if d.Field != "" {
		s += ", " + d.Field
	}
	if d.Recorded != "" || d.Replayed != "" {
		s += fmt.Sprintf(": recorded %s, replayed %s", d.Recorded, d.Replayed)
	}
	return s
}

// nothing stands for a field that is not there.
const nothing = "nothing"

// apart finds the first place where two JSON texts differ, keys in order of
// their names. It returns the place and both values; texts that are no JSON
// differ as a whole.
func apart(recorded, replayed []byte) (field, a, b string) {
	var x, y any
	if decodeNumbers(recorded, &x) != nil || decodeNumbers(replayed, &y) != nil {
		return "", short(string(recorded)), short(string(replayed))
	}
	field, p, q, _ := walk("", x, y)
	return field, p, q
}

func decodeNumbers(b []byte, into *any) error {
	d := json.NewDecoder(bytes.NewReader(b))
	d.UseNumber()
	return d.Decode(into)
}

func walk(at string, x, y any) (field, a, b string, differ bool) {
	switch p := x.(type) {
	case map[string]any:
		q, same := y.(map[string]any)
		if !same {
			break
		}
		names := make([]string, 0, len(p))
		for name := range p {
			names = append(names, name)
		}
		for name := range q {
			if _, both := p[name]; !both {
				names = append(names, name)
			}
		}
		sort.Strings(names)
		for _, name := range names {
			place := name
			if at != "" {
				place = at + "." + name
			}
			v, left := p[name]
			w, right := q[name]
			switch {
			case !left:
				return place, nothing, shown(w), true
			case !right:
				return place, shown(v), nothing, true
			}
			if field, a, b, differ = walk(place, v, w); differ {
				return field, a, b, true
			}
		}
		return "", "", "", false
	case []any:
		q, same := y.([]any)
		if !same {
			break
		}
		for i := range max(len(p), len(q)) {
			place := at + "[" + strconv.Itoa(i) + "]"
			switch {
			case i >= len(p):
				return place, nothing, shown(q[i]), true
			case i >= len(q):
				return place, shown(p[i]), nothing, true
			}
			if field, a, b, differ = walk(place, p[i], q[i]); differ {
				return field, a, b, true
			}
		}
		return "", "", "", false
	}
	p, q := shown(x), shown(y)
	return at, p, q, p != q
}

func shown(v any) string {
	b, err := json.Marshal(v)
	if err != nil {
		return ""
	}
	return short(string(b))
}

// mostShown bounds what a difference cites.
const mostShown = 300

func short(s string) string {
	if len(s) <= mostShown {
		return s
	}
	return s[:mostShown] + "..."
}
