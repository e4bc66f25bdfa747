package listfile

import (
	"slices"
	"strings"

	"beamward/closures"
)

// check finds what contradicts itself in a layout whose every part is sound.
func (c *compiler) check() {
	c.reachable()
	c.headSources()
	dates := c.dates()
	reads := false
	for i := range c.l.rules {
		r := &c.l.rules[i]
		reads = reads || r.kind == isWindow || r.kind == isRegion
		c.complete(r)
		c.timesOf(r, dates)
	}
	if !reads {
		c.d.add(place{line: 1}, "no rule reads a region or a window", "give the layout one")
	}
	for i := range c.l.rules {
		c.shadowed(i)
	}
	if !c.d.any() {
		for i := range c.l.rules {
			c.readable(i)
		}
	}
}

// reachable finds sections that nothing enters.
func (c *compiler) reachable() {
	entered := []string{topSection}
	for i := range c.l.rules {
		if e := c.l.rules[i].enter; e != "" {
			entered = append(entered, e)
		}
	}
	for i := range c.l.rules {
		for _, s := range c.l.rules[i].in {
			if !slices.Contains(entered, s) {
				c.d.addf(c.l.rules[i].at, "let a rule enter it", "no line ever enters the section %s", quoted([]byte(s)))
			}
		}
	}
}

// headSources wants each part of the head from the layout or from the text,
// and not from both.
func (c *compiler) headSources() {
	sources := func(name string) (fixed, read bool, at place) {
		for _, v := range c.l.head {
			if v.name == name {
				fixed, at = true, v.at
			}
		}
		for i := range c.l.rules {
			read = read || c.l.rules[i].kind == isHead && c.l.rules[i].has(name)
		}
		return fixed, read, at
	}
	for _, name := range []string{"id", "authority", "issued", "covers_from", "covers_until", "covers_for", "unlisted_sky", "replaces", "beams"} {
		fixed, read, at := sources(name)
		if fixed && read {
			c.d.addf(at, "keep one of them", "the layout fixes %s and reads it from the text", name)
		}
		needed := name != "replaces" && name != "beams" && name != "covers_until" && name != "covers_for"
		if needed && !fixed && !read {
			c.d.addf(place{line: 1}, "read it by a head rule, or give it under head", "nothing says %s", name)
		}
	}
	untilFixed, untilRead, _ := sources("covers_until")
	forFixed, forRead, at := sources("covers_for")
	switch until, length := untilFixed || untilRead, forFixed || forRead; {
	case until && length:
		c.d.add(place{line: max(1, at.line)}, "the layout has both covers_until and covers_for", "keep one of them")
	case !until && !length:
		c.d.add(place{line: 1}, "nothing says when the coverage ends", "give covers_until or covers_for")
	}
}

// dates returns what of a date some rule carries down.
func (c *compiler) dates() (parts dateParts) {
	for i := range c.l.rules {
		if v := c.l.rules[i].find("date"); v != nil {
			for _, f := range v.times {
				parts |= f.has
			}
			for _, f := range v.times {
				if f.has&(hasHour|hasZone) != 0 {
					c.d.add(v.at, "the form of a date holds a time of day or a zone", "give dates a form of their own")
				}
			}
		}
	}
	return parts
}

// timesOf holds the times of a rule, and of the head, against the dates that
// are carried and the zone.
func (c *compiler) timesOf(r *rule, dates dateParts) {
	all := slices.Concat(r.match.values, r.fixed, r.spans())
	if r == &c.l.rules[0] {
		all = append(all, c.l.head...)
	}
	for _, v := range all {
		for _, f := range v.times {
			if v.name == "date" {
				continue
			}
			lacksDay, lacksYear := f.has&hasAnyDay == 0, f.has&hasYear == 0
			before := c.d.total
			if lacksDay && dates&hasAnyDay == 0 || lacksYear && dates&hasYear == 0 {
				c.d.addf(v.at, "add a rule with a date, or write the form out", "the form %s of %s lacks a part of its date, and no rule reads one", quoted([]byte(f.text)), v.name)
			}
			if f.has&hasZone == 0 && !c.l.hasZone {
				c.d.addf(v.at, "give zone, such as \"+00:00\"", "the form %s of %s says no zone, nor does the layout", quoted([]byte(f.text)), v.name)
			}
			if f.has&hasHour == 0 && (v.name == "from" || v.name == "until" || v.name == "at") {
				c.d.addf(v.at, "use a form with hh:mm", "the form %s of %s has no time of day", quoted([]byte(f.text)), v.name)
			}
			if v.name == "from" && r.midnight != midnightNone && !lacksDay {
				c.d.addf(r.at, "take midnight out", "midnight is %s, and the form %s of from has its own day", midnights[r.midnight], quoted([]byte(f.text)))
			}
			if c.d.total > before {
				break
			}
		}
	}
}

// complete wants every value that a rule's line must have, and no other.
func (c *compiler) complete(r *rule) {
	want := func(names ...string) {
		for _, n := range names {
			if !r.has(n) {
				c.d.addf(r.at, "name a group of the expression for it", "the %s has no %s", r.kind, n)
			}
		}
	}
	shaped := []string{"ra", "dec", "radius", "az_from", "az_to", "el_from", "el_to"}
	var own []string
	switch r.shape {
	case closures.ICRSCone:
		own = shaped[:3]
	case closures.TrackCone:
		own = shaped[2:3]
	case closures.HorizonBox:
		own = shaped[3:]
	}
	if r.kind == isRegion || r.kind == isWindow {
		want(own...)
		for _, n := range shaped {
			if v := r.find(n); v != nil && !slices.Contains(own, n) {
				c.d.addf(v.at, "correct shape", "a %s of shape %s has no %s", r.kind, r.shape, n)
			}
		}
	} else if r.shape != closures.NoShape {
		c.d.addf(r.at, "take shape out", "a %s has no shape", r.kind)
	}
	switch r.kind {
	case isHead:
		if len(r.match.values) == 0 {
			c.d.add(r.at, "the head line says nothing", "name a group, or make it a mark")
		}
	case isRegion:
		if r.shape == closures.NoShape {
			c.d.missing(r.at, "shape")
		}
		if r.shape == closures.TrackCone {
			want("region")
			if !slices.ContainsFunc(c.l.rules, func(o rule) bool { return o.kind == isPoint }) {
				c.d.add(r.at, "the region is a track, and no rule reads points", "add a rule for points")
			}
		}
	case isPoint:
		want("at", "ra", "dec")
		if !slices.ContainsFunc(c.l.rules, func(o rule) bool { return o.kind == isRegion && o.shape == closures.TrackCone }) {
			c.d.add(r.at, "points belong to tracks, and no rule reads one", "add a rule for a region of shape track")
		}
	case isWindow:
		c.completeWindow(r, want)
	case isDate:
		want("date")
	}
	c.strayKeys(r)
}

func (c *compiler) completeWindow(r *rule, want func(...string)) {
	want("state", "from")
	if r.has("until") == r.has("for") {
		c.d.add(r.at, "the window has neither until nor for, or both", "give one of them")
	}
	if r.shape == closures.TrackCone {
		c.d.add(r.at, "a track cannot be described on the line of a window", "add a rule for the region")
	}
	if r.shape == closures.NoShape && !r.has("region") && !slices.ContainsFunc(c.l.rules, func(o rule) bool { return o.kind == isRegion }) {
		c.d.add(r.at, "nothing says what region the window is of", "name a group region, give shape, or add a rule for regions")
	}
	if (r.each != nil) != r.match.has("spans") {
		c.d.add(r.at, "each is read from the group spans; one of them is missing", "give both, or neither")
	}
	if r.each != nil && r.each.re.MatchString("") {
		c.d.add(r.at, "each matches nothing at all", "let it match at least one character")
	}
}

// strayKeys refuses keys that mean nothing in a rule.
func (c *compiler) strayKeys(r *rule) {
	stray := func(when bool, key string) {
		if when {
			c.d.addf(r.at, "take it out", "%s means nothing in this rule", key)
		}
	}
	stray(r.each != nil && r.kind != isWindow, "each")
	stray(r.midnight != midnightNone && r.kind != isWindow && r.kind != isHead, "midnight")
	stray(r.observed && r.shape != closures.HorizonBox, "observed")
	stray(len(r.words) > 0 && !r.has("state") && !r.has("throughout") && !r.has("unlisted_sky"), "words")
	stray(r.enter != "" && (r.kind == isWindow || r.kind == isPoint || r.kind == isIgnore), "enter")
	stray(r.need != needAny && r.kind == isIgnore, "need")
	if c.l.before != nil && slices.ContainsFunc(r.examples, func(e cell) bool { return c.l.before.match.re.Match(e.text) }) {
		c.d.add(r.at, "an example of the rule is taken for the continuation of the line before", "tell them apart")
	}
}

// has reports whether the pattern has a group of that name.
func (p *pattern) has(name string) bool {
	return slices.ContainsFunc(p.values, func(v value) bool { return v.name == name })
}

// overlap reports whether two rules are tried in one section.
func overlap(a, b *rule) bool {
	if len(a.in) == 0 || len(b.in) == 0 {
		return true
	}
	return slices.ContainsFunc(a.in, func(s string) bool { return slices.Contains(b.in, s) })
}

// shadowed holds the examples of a rule against the rules before it, and those
// of an ignore rule against all others.
func (c *compiler) shadowed(i int) {
	r := &c.l.rules[i]
	for j := range c.l.rules {
		o := &c.l.rules[j]
		if j == i || !overlap(r, o) || j > i && (r.kind != isIgnore || o.kind == isIgnore) {
			continue
		}
		for _, e := range r.examples {
			if !o.match.re.Match(e.text) {
				continue
			}
			if j < i {
				c.d.addf(e.at, "narrow that rule, or put this one before it", "the rule on line %d takes this example first", o.at.line)
			} else {
				c.d.addf(e.at, "narrow one of the rules", "the example is ignored, and the rule on line %d reads it", o.at.line)
			}
		}
	}
}

// readable reads each example of a rule under an invented date and region, so
// that a form or a unit that does not fit is found before the first night.
func (c *compiler) readable(i int) {
	r := &c.l.rules[i]
	for _, e := range r.examples {
		d := newDraft(Limits{}.filled())
		g := newReading(c.l, d, nil)
		g.date = written{has: hasYear | hasDay, year: 2031, month: 2, day: 14}
		g.region = "example"
		g.regions[g.region] = &described{line: 1, track: &regionText{}}
		if f := r.find("region"); f != nil && r.kind == isPoint {
			if m := r.match.re.FindSubmatch(e.text); f.group > 0 && m != nil {
				g.regions[string(g.name(strings.TrimSpace(string(m[f.group]))))] = g.regions[g.region]
			}
		}
		from := firstInstant
		d.head.from = cell{kind: moment, when: &instant{from, from, from}}
		if r.has("covers_from") {
			d.head.from = cell{}
		}
		g.apply(r, r.match.re.FindSubmatchIndex(e.text), place{1, e.text})
		for _, fault := range d.lines {
			c.d.addf(e.at, "correct the example or the layout", "the example cannot be read: %s", fault.Cause)
		}
	}
}
