package listfile

import (
	"strings"

	"beamward/closures"
)

// What becomes of each kind of line. What is wrong with a value is reported,
// and the value then counts as reported rather than missing.

// headLine notes what a line says of the head. What stands in the text again
// must be the same.
func (g *reading) headLine(r *rule, all []found) {
	h := &g.d.head
	for i := range all {
		f := &all[i]
		c := cell{}
		switch f.name {
		case "date":
			continue
		case "issued":
			c = g.moment(f, &g.date, midnightNone, nil)
		case "covers_from":
			c = g.moment(f, &g.date, r.midnight, nil)
		case "covers_until":
			c = g.moment(f, &g.date, r.midnight, h.from.when)
		case "covers_for":
			c = g.after(f, h.from)
			if h.from.kind == absent {
				c = cell{kind: reported}
				g.d.add(f.at, "the coverage's duration stands before its beginning", "let the layout read covers_from on an earlier line or in front of it")
			}
		case "id", "authority":
			c = g.text(f, g.name(f.words))
		case "unlisted_sky":
			c = g.text(f, r.stateWord(f.words))
		case "window_count":
			c = g.text(f, []byte(strings.TrimLeft(f.words[:len(f.words)-1], "0")+f.words[len(f.words)-1:]))
			c.kind = bare
		case "digest":
			c = g.text(f, []byte(f.words))
		case "replaces", "beams":
			g.names(f)
			continue
		}
		dst := g.headCell(f.name)
		if dst.set() && !sameCell(*dst, c) {
			g.d.addf(f.at, "ask for the list again: two may have been joined", "%s stands a second time, and otherwise", f.name)
			continue
		}
		*dst = c
	}
}

func sameCell(a, b cell) bool {
	if a.kind == moment && b.kind == moment {
		return *a.when == *b.when
	}
	return a.kind == b.kind && string(a.text) == string(b.text)
}

func (g *reading) headCell(name string) *cell {
	h := &g.d.head
	switch name {
	case "covers_from":
		return &h.from
	case "covers_until", "covers_for":
		return &h.until
	}
	return h.scalar(name)
}

// names reads names parted by commas or blanks.
func (g *reading) names(f *found) {
	h := &g.d.head
	dst := &h.replaces
	if f.name == "beams" {
		dst, h.beamsSet, h.beamsAt = &h.beams, true, f.at
	}
	for _, w := range strings.FieldsFunc(f.words, func(r rune) bool { return r == ',' || r == ' ' || r == '\t' }) {
		c := g.text(f, g.name(w))
		again := false
		for _, had := range *dst {
			again = again || had.at.line != f.at.line && sameCell(had, c)
		}
		if !again {
			*dst = append(*dst, c)
		}
	}
}

// fixedHead adds what the layout itself says of the head. Times of day there
// are of the first date.
func (g *reading) fixedHead() {
	h := &g.d.head
	h.version = cell{kind: bare, text: []byte("1")}
	var length *found
	for i := range g.l.head {
		v := &g.l.head[i]
		f := &found{v, v.text, place{}}
		switch v.name {
		case "issued", "covers_from", "covers_until":
			*g.headCell(v.name) = g.moment(f, &g.first, midnightNone, nil)
		case "covers_for":
			length = f
		case "replaces", "beams":
			g.names(f)
		default:
			*g.headCell(v.name) = g.text(f, []byte(v.text))
		}
	}
	if length != nil {
		h.until = g.after(length, h.from)
	}
	h.covers = place{line: 1}
}

// describe reads a region, and returns its id. A region that was described
// before must be described the same.
func (g *reading) describe(r *rule, all []found, at place) (id string, ok bool) {
	t := &regionText{at: at, shape: r.shape}
	switch r.shape {
	case closures.ICRSCone:
		t.ra, t.dec, t.radius = g.angle(all, "ra"), g.angle(all, "dec"), g.angle(all, "radius")
	case closures.TrackCone:
		t.radius = g.angle(all, "radius")
	case closures.HorizonBox:
		t.azFrom, t.azTo, t.elFrom, t.elTo = g.angle(all, "az_from"), g.angle(all, "az_to"), g.angle(all, "el_from"), g.angle(all, "el_to")
		if r.observed {
			t.observed = cell{kind: bare, text: []byte("true"), at: at}
		}
	}
	if f := pick(all, "throughout"); f != nil {
		t.throughout = g.text(f, r.stateWord(f.words))
	}
	shape := t.shapeText()
	if f := pick(all, "region"); f != nil {
		t.id = g.text(f, g.name(f.words))
	} else {
		t.id = cell{kind: quotedText, text: []byte(shape), at: at}
		g.say("region", shape)
	}
	id = string(t.id.text)
	shape += "/" + string(t.throughout.text)
	if was := g.regions[id]; was != nil {
		if was.shape != shape {
			g.d.addf(at, "ask for the list again, or let the layout read its name more closely", "the region %s is described otherwise than on line %d", quoted([]byte(id)), was.line)
			return id, false
		}
		return id, true
	}
	one := &described{line: at.line, shape: shape}
	g.regions[id] = one
	if r.shape == closures.TrackCone {
		one.track = t
		g.tracks = append(g.tracks, one)
	} else {
		g.d.region(t)
	}
	return id, true
}

// shapeText describes a region by its place, which can be its name where the
// text gives none.
func (t *regionText) shapeText() string {
	var parts []string
	switch t.shape {
	case closures.ICRSCone:
		parts = []string{"icrs", string(t.ra.text), string(t.dec.text), string(t.radius.text)}
	case closures.HorizonBox:
		parts = []string{"az", string(t.azFrom.text), string(t.azTo.text), "el", string(t.elFrom.text), string(t.elTo.text)}
		if t.observed.set() {
			parts[0] = "observed_az"
		}
	case closures.TrackCone:
		parts = []string{"track", string(t.radius.text)}
	case closures.WholeSky:
		parts = []string{"sky"}
	}
	return strings.Join(parts, "_")
}

// owner returns the region that a window or a point is of.
func (g *reading) owner(all []found, at place, what string) (id string, ok bool) {
	if f := pick(all, "region"); f != nil {
		return string(g.text(f, g.name(f.words)).text), true
	}
	if g.region == "" {
		g.d.add(at, what+" stands under no region", "let the layout read its region on a line above or on its own")
		return "", false
	}
	g.say("region", g.region)
	return g.region, true
}

// pointLine reads one point of a track.
func (g *reading) pointLine(all []found, at place) {
	id, ok := g.owner(all, at, "the point")
	if !ok {
		return
	}
	one := g.regions[id]
	if one == nil || one.track == nil {
		g.d.addf(at, "define the track above its points", "the point is of %s, which is no track above it", quoted([]byte(id)))
		return
	}
	p := pointText{at: at, ra: g.angle(all, "ra"), dec: g.angle(all, "dec")}
	if f := pick(all, "at"); f != nil {
		p.when = g.moment(f, &g.date, midnightNone, nil)
	}
	if one.track.points, ok = g.d.point(one.track.points, &p); !ok {
		one.track.bad = true
	}
}

// windowLine reads the window or the windows of a line.
func (g *reading) windowLine(r *rule, all []found, at place) {
	var id string
	ok := true
	if r.shape != closures.NoShape {
		id, ok = g.describe(r, all, at)
	} else {
		id, ok = g.owner(all, at, "the window")
	}
	if !ok {
		g.d.lost = true
		return
	}
	if r.each == nil {
		g.oneWindow(r, all, id, at)
		return
	}
	spans := pick(all, "spans")
	if spans == nil {
		g.d.add(at, "the line has no window", "let the layout ignore it, or ask for the list again")
		return
	}
	rest := []byte(spans.words)
	for len(rest) > 0 {
		if !g.spend(r.each, len(rest)) {
			return
		}
		m := r.each.re.FindSubmatchIndex(rest)
		if m == nil || m[1] == 0 {
			g.d.addf(at, "correct the layout, or ask for the list again", "%s cannot be read as a window", quoted(rest))
			g.d.lost = true
			return
		}
		own := g.values(all[:len(all):len(all)], r.each.values, m, place{at.line, rest})
		for i := len(all); i < len(own); i++ {
			own[i].at = at
		}
		g.oneWindow(r, own, id, at)
		rest = rest[m[1]:]
	}
}

func (g *reading) oneWindow(r *rule, all []found, id string, at place) {
	w := windowText{at: at, region: cell{kind: quotedText, text: []byte(id), at: at}}
	if f := pick(all, "state"); f != nil {
		s := g.text(f, r.stateWord(f.words))
		w.open, w.state = g.d.state(s, at, "state")
		w.bad = !w.state
	}
	if f := pick(all, "from"); f != nil {
		w.from = g.moment(f, &g.date, r.midnight, nil)
	}
	var start *instant
	if w.from.kind == moment {
		start = w.from.when
	}
	if f := pick(all, "until"); f != nil {
		w.until = g.moment(f, &g.date, r.midnight, start)
	} else if f := pick(all, "for"); f != nil {
		w.until = g.after(f, w.from)
	}
	if f := pick(all, "ref"); f != nil {
		w.ref = g.text(f, []byte(f.words))
	}
	g.d.window(&w)
}
