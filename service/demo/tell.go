package demo

import (
	"encoding/json"
	"fmt"
	"io"
	"slices"
	"strings"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/engine"
)

// teller tells the audience what happens, and keeps count of what was shown.
type teller struct {
	out   io.Writer
	json  bool
	err   error // the first of writing
	last  map[closures.BeamID]closures.Decision
	shown [closures.NumCodes]*shown
	opens int
}

// shown is where a reason was seen first.
type shown struct {
	at     time.Duration
	beam   closures.BeamID
	detail string
	proper bool // it counts: see teller.note
}

// ofTheStart are the reasons that belong to the time before the first opening.
const ofTheStart = closures.Codes(1<<closures.CodeStarting | 1<<closures.CodeNotCovered)

func newTeller(out io.Writer, asJSON bool) *teller {
	return &teller{out: out, json: asJSON, last: map[closures.BeamID]closures.Decision{}}
}

func (t *teller) printf(format string, args ...any) {
	if _, err := fmt.Fprintf(t.out, format, args...); err != nil && t.err == nil {
		t.err = fmt.Errorf("telling the story: %w", err)
	}
}

// line writes one JSON object.
func (t *teller) line(v any) {
	b, err := json.Marshal(v)
	if err != nil && t.err == nil {
		t.err = err
	}
	t.printf("%s\n", b)
}

// timeOf writes a time of the night as minutes and seconds.
func timeOf(d time.Duration) string {
	tenths := d.Round(100*time.Millisecond) / (100 * time.Millisecond)
	return fmt.Sprintf("%02d:%02d.%d", tenths/600, tenths/10%60, tenths%10)
}

// scene tells what is about to happen.
func (t *teller) scene(at time.Duration, says string) {
	switch {
	case says == "":
	case t.json:
		t.line(struct {
			S    float64 `json:"t_s"`
			Says string  `json:"says"`
		}{at.Seconds(), says})
	default:
		t.printf("\n%s  %s\n", timeOf(at), says)
	}
}

// update takes in one published view and tells each beam's change of state or
// reasons. Beams that change alike are told of together.
func (t *teller) update(at time.Duration, u engine.Update) {
	var told []change
	for i := range u.View.Beams {
		d := u.View.Beams[i].Decision
		t.note(at, d)
		old, before := t.last[d.Beam]
		t.last[d.Beam] = *d
		if before && old.Open == d.Open && old.Codes == d.Codes {
			continue
		}
		if d.Open {
			t.opens++
		}
		if t.json {
			t.change(at, d)
			continue
		}
		words := said(d)
		if n := len(told); n > 0 && told[n-1].words == words {
			told[n-1].beams += ", " + string(d.Beam)
			continue
		}
		told = append(told, change{string(d.Beam), words})
	}
	for _, c := range told {
		t.printf("%s    %-12s  %s\n", timeOf(at), c.beams, c.words)
	}
}

// change is one line: which beams, and what became of them.
type change struct{ beams, words string }

// note keeps what was shown first. Before the first opening nearly everything is
// a reason, since nothing is known; what is shown then counts only where it
// belongs there.
func (t *teller) note(at time.Duration, d *closures.Decision) {
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		proper := t.opens > 0 || ofTheStart.Has(c)
		if was := t.shown[c]; !d.Codes.Has(c) || was != nil && (was.proper || !proper) {
			continue
		}
		s := &shown{at: at, beam: d.Beam, proper: proper}
		if i := slices.IndexFunc(d.Reasons, func(f closures.Finding) bool { return f.Code == c }); i >= 0 {
			s.detail = detailOf(&d.Reasons[i])
		}
		t.shown[c] = s
	}
}

func detailOf(f *closures.Finding) string {
	if f.Source == "" {
		return f.Detail
	}
	return string(f.Source) + ": " + f.Detail
}

// mostSaid is how many reasons are put into words; the others are named.
const mostSaid = 2

// said puts a decision into words.
func said(d *closures.Decision) string {
	if d.Open {
		if d.OpenUntil.IsZero() {
			return "OPEN       nothing in sight closes it"
		}
		s := "OPEN       until " + d.OpenUntil.UTC().Format("15:04:05.0") + " UTC"
		if len(d.Coming) > 0 {
			s += ", for " + d.Coming[0].Code.String()
		}
		return s
	}
	codes := d.Codes
	if rest := codes.Without(closures.CodeReopening).Without(closures.CodeRearm); rest != 0 {
		codes = codes.Without(closures.CodeReopening) // it goes with every closure
	}
	names := codes.Names()
	if len(names) > mostSaid {
		return "SHUTTERED  " + strings.Join(names, ", ")
	}
	var parts []string
	for _, name := range names {
		part := name
		if i := slices.IndexFunc(d.Reasons, func(f closures.Finding) bool { return f.Code.String() == name }); i >= 0 {
			part += " (" + detailOf(&d.Reasons[i]) + ")"
		}
		parts = append(parts, part)
	}
	return "SHUTTERED  " + strings.Join(parts, ", ")
}

// change writes a beam's change as JSON.
func (t *teller) change(at time.Duration, d *closures.Decision) {
	reasons := []wire.Reason{}
	for i := range d.Reasons {
		reasons = append(reasons, wire.ReasonOf(&d.Reasons[i]))
	}
	state := wire.Shuttered
	if d.Open {
		state = wire.Open
	}
	t.line(struct {
		S       float64         `json:"t_s"`
		At      time.Time       `json:"at"`
		Beam    closures.BeamID `json:"beam"`
		State   wire.State      `json:"state"`
		Codes   []string        `json:"codes"`
		Reasons []wire.Reason   `json:"reasons"`
	}{at.Seconds(), d.At, d.Beam, state, append([]string{}, d.Codes.Names()...), reasons})
}

// missing returns the reasons that were not shown.
func (t *teller) missing() []string {
	out := []string{}
	for c, s := range t.shown {
		if s == nil || !s.proper {
			out = append(out, closures.Code(c).String())
		}
	}
	return out
}

// table writes which reasons were shown, and where first.
func (t *teller) table() {
	t.printf("\nReasons shown:\n")
	for c, s := range t.shown {
		name := closures.Code(c).String()
		if s == nil || !s.proper {
			t.printf("  %-16s  not shown\n", name)
			continue
		}
		t.printf("  %-16s  %s  %-5s  %s\n", name, timeOf(s.at), s.beam, s.detail)
	}
}
