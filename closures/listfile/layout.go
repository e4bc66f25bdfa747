package listfile

import (
	"fmt"
	"regexp"
	"slices"
	"strings"

	"beamward/closures"
)

// Layout says how to read a text that an authority writes in its own way. It
// is compiled from YAML and immutable; many readings may share one.
//
//	layout: 1
//	name: evening-report
//	encoding: utf-8                 # or latin-1
//	zone: "+00:00"                  # of times that do not say their own
//	id_replace: "-"                 # written for each character that no name can have
//	repeated_windows: refuse        # or drop: the same window twice counts once
//	head: {authority: orbital-desk, unlisted_sky: closed}   # what the text does not say
//	times: {stamp: "YYYY DDD hh:mm", clock: "hh:mm:ss"}     # forms, or several for one name
//	as: {covers_from: stamp, from: clock, ra: hms, dec: dms}  # how each value is written
//	continuation: {match: ' {8}(?P<text>\S.*)', example: "        more"}
//	lines:
//	  - {is: ignore, match: '', example: ""}
//	  - is: window
//	    match: 'SHUT (?P<from>\S+) TO (?P<until>\S+)'
//	    example: SHUT 03:10:02 TO 03:10:41
//	    values: {state: closed}
//
// Every line must be taken whole by a rule; what nothing matches refuses the
// text. Rules are tried in order and the first that matches takes the line. A
// line that an ignore rule takes must match no other rule, so that nothing that
// says something is ever thrown away. Every rule carries an example of its
// line, which it and no rule before it must match and whose values must be
// readable: a rule that can never match, or that another one hides, does not
// compile.
//
// The kinds of rules, and the values that their named groups can give:
//
//	head    id authority issued covers_from covers_until covers_for replaces beams
//	        unlisted_sky window_count digest
//	region  region ra dec radius az_from az_to el_from el_to throughout
//	window  what a region has, and state from until for ref
//	point   region at ra dec     (of a track)
//	date    date                 (which the four above can give as well)
//	mark    nothing: a line that says only where it stands
//	ignore  nothing
//
// Besides is, match and example a rule can have: in (the sections it applies
// in; a text begins in `top`), enter (the section it begins), need (any, some or
// once), shape (icrs, horizon, track or whole_sky), observed, values (what every
// such line has), words (what the text calls open and closed), as (how this
// rule's values are written), each (an expression applied again and again over
// the group `spans`, for several windows on a line), and midnight: what a time
// of day without its day means after midnight. With `until` an end that is not
// after its start is on the next day; with `night` a time before noon belongs
// to the day after the date; with `forward` starts never go back, so where one
// does a day has passed.
//
// Angles are written in deg, arcmin, arcsec, hours, hms or dms, durations in s,
// min, hours, hms, hm or ms (minutes and seconds). A region without a name is
// named by its place. A date or a region, once read, holds for the lines below;
// entering a section forgets the region. A form that lacks the year, the day or
// both takes them from the last date; what head says by time of day is of the
// first date.
type Layout struct {
	name        string
	latin       bool
	replace     byte // written for what no name can have; 0: nothing is
	zone        int  // seconds east of UTC
	hasZone     bool
	head        []value // what the text does not say
	before      *joint  // a line that continues the one before
	after       *joint  // a line that the next one continues
	rules       []rule
	weight      int // of all expressions
	dropRepeats bool
}

// Name returns the layout's own name.
func (l *Layout) Name() string { return l.name }

// LayoutError says why a layout does not compile: every fault, with its line
// in the layout.
type LayoutError struct {
	Lines []LineError `json:"lines"`
	Total int         `json:"total"`
}

// Error names the first fault and how many there are.
func (e *LayoutError) Error() string {
	if len(e.Lines) == 0 {
		return "layout refused"
	}
	first := e.Lines[0]
	var b strings.Builder
	fmt.Fprintf(&b, "layout refused: line %d: %s", first.Line, first.Cause)
	if first.Mend != "" {
		fmt.Fprintf(&b, " (%s)", first.Mend)
	}
	if e.Total > 1 {
		fmt.Fprintf(&b, "; %d faults in all", e.Total)
	}
	return b.String()
}

// ruleKind is what a line is.
type ruleKind uint8

const (
	isNone ruleKind = iota
	isHead
	isRegion
	isWindow
	isPoint
	isDate
	isMark
	isIgnore
)

var ruleKinds = [...]string{"", "head", "region", "window", "point", "date", "mark", "ignore"}

func (k ruleKind) String() string { return ruleKinds[k] }

// need says how often a rule must take a line.
type need uint8

const (
	needAny  need = iota // as often as it likes
	needSome             // at least once
	needOnce             // exactly once
)

// midnight says what a time of day without its day means after midnight.
type midnight uint8

const (
	midnightNone    midnight = iota
	midnightUntil            // an end that is not after its start is on the next day
	midnightNight            // before noon is the day after the date, which is the evening's
	midnightForward          // starts never go back: where one does, a day has passed
)

var midnights = [...]string{"none", "until", "night", "forward"}

// rule is one line pattern.
type rule struct {
	at       place // in the layout
	kind     ruleKind
	match    pattern
	each     *pattern // applied again and again over the group `spans`
	in       []string // sections it applies in; none: all
	enter    string   // the section it begins
	need     need
	shape    closures.Shape
	observed bool
	words    map[string]string // the text's words for open and closed
	midnight midnight
	fixed    []value // values that every line has
	examples []cell
}

// pattern is an expression with the values that its groups give.
type pattern struct {
	re     *regexp.Regexp
	prefix string // what every line that it matches begins with
	weight int    // instructions of its program
	values []value
}

// value is one value of a line: a named group, or a text that is always the
// same.
type value struct {
	name  string
	group int    // 0: fixed
	text  string // when fixed
	at    place
	times timeForms // for a time
	unit  unit      // for an angle or a duration
}

// find returns the value of that name, nil when the rule's line gives none.
func (r *rule) find(name string) *value {
	for _, all := range [...][]value{r.match.values, r.fixed, r.spans()} {
		for i := range all {
			if all[i].name == name {
				return &all[i]
			}
		}
	}
	return nil
}

func (r *rule) has(name string) bool { return r.find(name) != nil }

func (r *rule) spans() []value {
	if r.each == nil {
		return nil
	}
	return r.each.values
}

// joint joins physical lines into one.
type joint struct {
	match pattern
	with  string
}

// applies reports whether the rule is tried in a section.
func (r *rule) applies(section string) bool {
	return len(r.in) == 0 || slices.Contains(r.in, section)
}

// The bounds of a layout. Go's expressions take time in proportion to the text
// and to their own size, so bounding both bounds the time.
const (
	maxRules      = 200
	maxExpression = 1000   // bytes
	maxWeight     = 2000   // instructions of one expression
	maxWeights    = 20_000 // of all
	maxExamples   = 10     // of one rule
	layoutLine    = 8192   // bytes of one line, joined
	layoutBytes   = 16 << 20
	maxWork       = 10_000_000_000 // bytes times instructions in one reading, some 5 s
)
