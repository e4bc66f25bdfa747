package replay

import (
	"cmp"
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Words puts the explanation into lines of text for a terminal: the entry, what
// was decided, each check, and what all that rests on. The form is for people
// and may change; programs read the JSON.
func (x *Explanation) Words() string {
	var w words
	w.line("Entry %d, %s, at %s: %s.", x.Seq, x.Kind, wire.FormatTime(x.At), x.What)
	if r := x.Refused; r != nil {
		w.line("It had no effect: %s%s.", r.Why, after(" (", r.Mend, ")"))
	}
	if s := x.Step; s != nil {
		w.line("Step %d at %s took in %s.", s.Seq, wire.FormatTime(s.At), count(s.Facts, "fact"))
	}
	for _, did := range x.Did {
		w.line("With that step %s.", did)
	}
	for i := range x.Beams {
		w.beam(&x.Beams[i])
	}
	if s := x.Step; s != nil && len(s.First) > 0 && len(x.Beams) > 0 && x.Beams[0].Checks != nil {
		w.head("Facts of the step")
		for _, f := range s.First {
			w.line("  %d %s", f.Seq, f.What)
		}
		if more := s.Facts - len(s.First); more > 0 {
			w.line("  and %d more", more)
		}
	}
	w.replayed(x)
	return w.b.String()
}

type words struct{ b strings.Builder }

func (w *words) line(format string, args ...any) {
	fmt.Fprintf(&w.b, format, args...)
	w.b.WriteByte('\n')
}

func (w *words) head(title string) {
	w.b.WriteByte('\n')
	w.line("%s", title)
}

func (w *words) beam(b *BeamTold) {
	if b.Checks == nil {
		w.line("Beam %s: %s%s.", b.Beam, b.State, cmp.Or(changes(b.Changed, b.State), ", as before"))
		return
	}
	w.b.WriteByte('\n')
	w.line("Beam %s: %s%s%s.", b.Beam, b.State, entryOf(b.Entry), until(b))
	if b.Changed != nil {
		if b.Changed.Since == 0 {
			w.line("It is the first decision on record since the run began.")
		} else {
			w.line("Before, by entry %d of %s, it was %s%s.", b.Changed.Since, stamp(b.Changed.SinceAt), b.Changed.Was, cmp.Or(changes(b.Changed, b.State), ", and nothing has changed since"))
		}
	}
	w.checks(b)
	w.coming(b)
	w.aim(b.Aim)
	w.inputs(b)
	w.inForce(b)
}

func entryOf(seq uint64) string {
	if seq == 0 {
		return ", unchanged, so not on record by itself"
	}
	return ", on record as entry " + strconv.FormatUint(seq, 10)
}

func until(b *BeamTold) string {
	switch {
	case !b.OpenUntil.IsZero() && b.State == stateWord(true):
		return ", until " + stamp(b.OpenUntil)
	case !b.OpensAt.IsZero():
		return ", foreseen to open at " + stamp(b.OpensAt)
	}
	return ""
}

// changes lists what came and what went; empty where nothing did.
func changes(c *ChangeTold, state string) string {
	if c == nil {
		return ""
	}
	var parts []string
	if c.Was != "" && c.Was != state {
		parts = append(parts, "it is "+state+" now")
	}
	if len(c.Came) > 0 {
		parts = append(parts, "new: "+strings.Join(c.Came, ", "))
	}
	if len(c.Gone) > 0 {
		parts = append(parts, "gone: "+strings.Join(c.Gone, ", "))
	}
	if u := c.OpenUntil; u != nil {
		parts = append(parts, fmt.Sprintf("the end of the opening moved from %s to %s", endOf(u.From), endOf(u.To)))
	}
	if c.Lists {
		parts = append(parts, "other lists are in force")
	}
	if c.Rules {
		parts = append(parts, "other rules are in force")
	}
	if len(parts) == 0 {
		return ""
	}
	return "; " + strings.Join(parts, "; ")
}

func endOf(t time.Time) string {
	if t.IsZero() {
		return "none in sight"
	}
	return stamp(t)
}

func (w *words) checks(b *BeamTold) {
	closed := 0
	for i := range b.Checks {
		if b.Checks[i].Verdict != closures.Clear.String() {
			closed++
		}
	}
	w.head(fmt.Sprintf("Checks: %d of %d close", closed, len(b.Checks)))
	for pass := range 2 { // what closes first
		for i := range b.Checks {
			c := &b.Checks[i]
			if shut := c.Verdict != closures.Clear.String(); shut != (pass == 0) {
				continue
			}
			head := fmt.Sprintf("  %-16s %-8s ", c.Code, c.Verdict)
			if len(c.Findings) == 0 {
				w.line("%s%s", head, c.Says+inWords(c.Margin))
			}
			for j := range c.Findings {
				w.line("%s%s", head, c.Findings[j].words(c))
				head = strings.Repeat(" ", len("  ")+16+len(" ")+8+len(" "))
			}
		}
	}
}

// words puts one finding of a check into a line; a check's only one carries
// the check's margin where it has none itself.
func (f *FindingTold) words(c *CheckTold) string {
	m := f.Margin
	if m == nil && len(c.Findings) == 1 {
		m = c.Margin
	}
	s := after("", f.Source, ": ") + f.Detail + over(f.From, f.Until) + inWords(m)
	s += after(", list ", f.List, "") + after(", region ", cited("", f.Region), "") + after(", ref ", cited("", f.Ref), "")
	if f.RestsOn != 0 {
		s += fmt.Sprintf(" (entry %d)", f.RestsOn)
	}
	return s
}

func over(from, until time.Time) string {
	switch {
	case from.IsZero() && until.IsZero():
		return ""
	case until.IsZero() || until.Year() >= 9999:
		return ", from " + stamp(from) + " on"
	}
	return ", from " + stamp(from) + " until " + stamp(until)
}

// inWords tells a margin, positive when clear, in the unit that people use.
func inWords(m *MarginTold) string {
	if m == nil {
		return ""
	}
	v, unit := m.Value, " "+m.Unit
	if m.Unit == "rad" {
		v, unit = v*180/math.Pi, "°"
	}
	return " (margin " + figure(v) + unit + ")"
}

func (w *words) replayed(x *Explanation) {
	r := &x.Replayed
	w.b.WriteByte('\n')
	if x.Run != nil {
		w.line("Run of entry %d: start %s, from %s, by %q.", x.Run.Seq, x.Run.BootID, stamp(x.Run.At), x.Run.Build)
	}
	switch {
	case r.From == 0 && r.Note == "":
		return
	case r.From == 0:
		w.line("Not replayed: %s.", r.Note)
		return
	case r.Whole:
		w.line("Replayed from the run's beginning, %s.", count(int(r.Entries), "entry"))
	default:
		w.line("Replayed from entry %d, %s: %s.", r.From, count(int(r.Entries), "entry"), r.Note)
	}
	switch {
	case r.Identical == nil:
	case *r.Identical:
		w.line("The replay gives the recorded decision to the last bit.")
	case !r.Whole:
		w.line("Begun amid the run, it does not come out to the last bit: %s.", r.Differs)
	case r.OtherBuild:
		w.line("Another build recorded it, and this one differs: %s.", r.Differs)
	default:
		w.line("The replay does not give the recorded decision: %s.", r.Differs)
	}
}

func after(before, text, behind string) string {
	if text == "" {
		return ""
	}
	return before + text + behind
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	if strings.HasSuffix(what, "y") {
		return strconv.Itoa(n) + " " + what[:len(what)-1] + "ies"
	}
	return strconv.Itoa(n) + " " + what + "s"
}
