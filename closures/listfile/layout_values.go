package listfile

import (
	"strings"

	"beamward/closures"
)

// name returns a name with what no name can have replaced, where the layout
// says by what.
func (g *reading) name(words string) []byte {
	if g.l.replace == 0 {
		return []byte(words)
	}
	return []byte(strings.Map(func(r rune) rune {
		if r < 0x80 && closures.ValidName("x"+string(r)) {
			return r
		}
		return rune(g.l.replace)
	}, words))
}

// state returns open or closed for what the text calls it.
func (r *rule) stateWord(words string) []byte {
	if s, ok := r.words[words]; ok {
		return []byte(s)
	}
	return []byte(words)
}

func (g *reading) text(f *found, words []byte) cell {
	g.say(f.name, string(words))
	return cell{kind: quotedText, text: words, at: f.at}
}

// moment reads an instant. earlier is the start of the same line's window, for
// an end that lies past midnight.
func (g *reading) moment(f *found, date *written, m midnight, earlier *instant) cell {
	w, ok := g.parse(f)
	if !ok {
		return cell{kind: reported}
	}
	ownDay := w.has&hasAnyDay != 0
	if w.has&hasHour == 0 {
		w.hour, w.minute, w.second = 0, 0, 0
	}
	if !w.fill(date) {
		g.d.addf(f.at, "let the layout read a date above the line", "%s %s stands under no date", f.name, quoted([]byte(f.words)))
		return cell{kind: reported}
	}
	days := 0
	if !ownDay {
		if m == midnightForward {
			days = g.forward
		}
		if m == midnightNight && w.hour < 12 {
			days = 1
		}
	}
	at, cause, mend := w.instant(days, g.l.zone)
	past := false
	switch {
	case cause != "" || ownDay:
	case earlier != nil:
		past = (m == midnightUntil || m == midnightForward) && !earlier.before(at)
	case m == midnightForward && f.name == "from":
		if past = at.early < g.last; past {
			g.forward++
		}
	}
	if past {
		at, cause, mend = w.instant(days+1, g.l.zone)
	}
	if cause != "" {
		g.d.addf(f.at, mend, "%s %s %s", f.name, quoted([]byte(f.words)), cause)
		return cell{kind: reported}
	}
	if m == midnightForward && f.name == "from" {
		g.last = at.early
	}
	g.say(f.name, string(appendTime(nil, at.early)))
	return cell{kind: moment, text: []byte(f.words), at: f.at, when: &at}
}

// after reads a duration that begins at an instant.
func (g *reading) after(f *found, from cell) cell {
	length, ok := parseDuration(f.words, f.unit)
	if !ok {
		g.d.addf(f.at, "a duration is over 0 and at most 400 days; correct the layout, or ask for the list again", "%s %s is not a duration in %s", f.name, quoted([]byte(f.words)), unitNames[f.unit])
		return cell{kind: reported}
	}
	if from.kind != moment {
		return cell{kind: reported}
	}
	end := from.when.plus(length)
	g.say(f.name, length.String())
	return cell{kind: moment, text: []byte(f.words), at: f.at, when: &end}
}

// angle reads an angle in its unit into the degrees that lists are written in.
func (g *reading) angle(all []found, name string) cell {
	f := pick(all, name)
	if f == nil {
		return cell{}
	}
	p, ok := parseAngle(f.words, f.unit)
	if !ok {
		g.d.addf(f.at, "correct the layout, or ask for the list again", "%s %s is not an angle in %s", name, quoted([]byte(f.words)), unitNames[f.unit])
		return cell{kind: reported}
	}
	text := appendDegrees(nil, p)
	g.say(name+"_deg", string(text))
	return cell{kind: bare, text: text, at: f.at}
}
