package listfile

import (
	"slices"
	"time"

	"beamward/closures"
	"beamward/geometry/span"
)

// headText is what a list says of itself, before it is checked. Its cells own
// their text.
type headText struct {
	version, id, authority, issued cell
	covers                         place
	from, until                    cell
	unlisted, count, digest        cell
	replaces, beams                []cell
	beamsSet                       bool
	beamsAt                        place
	regionsSet, windowsSet         bool
}

const (
	maxCovers = 400 * 24 * time.Hour
	maxNames  = 1000 // in replaces, and in beams
)

// settle checks the head. From then on windows are held against the coverage.
func (d *draft) settle() {
	if d.settled {
		return
	}
	d.settled = true
	h, top := &d.head, place{line: 1}

	if v := h.version; !v.set() {
		if !d.full {
			d.add(top, "closure_list is missing", "begin with closure_list: 1")
		}
	} else if v.kind != reported && (v.kind != bare && v.kind != numeral) || string(v.text) != "1" {
		d.addf(v.at, "write closure_list: 1", "closure_list %s is not a version that is read here", quoted(v.text))
	}
	if id, ok := d.name(h.id, top, "id"); ok {
		d.text.ID = closures.ListID(id)
	}
	if a, ok := d.name(h.authority, top, "authority"); ok {
		d.text.Authority = closures.AuthorityID(a)
	}
	if at, ok := d.time(h.issued, top, "issued"); ok {
		d.text.Issued = time.Unix(0, at.early).UTC()
	}
	d.coverage(top)
	if open, ok := d.state(h.unlisted, top, "unlisted_sky"); ok {
		d.text.UnlistedOpen = open
	}
	d.replaced()
	d.beams()
	if !h.regionsSet {
		d.missing(top, "regions")
	}
	if !h.windowsSet {
		d.missing(top, "windows")
	}
}

// coverage reads covers, mapped inward: what is not covered is shuttered.
func (d *draft) coverage(top place) {
	h := &d.head
	at := h.covers
	if at.line == 0 {
		d.missing(top, "covers")
		return
	}
	from, ok1 := d.time(h.from, at, "covers.from")
	until, ok2 := d.time(h.until, at, "covers.until")
	if !ok1 || !ok2 {
		return
	}
	over := span.Span{From: time.Unix(0, from.late).UTC(), Until: time.Unix(0, until.early).UTC()}
	switch {
	case over.Empty():
		d.add(h.until.at, "covers is empty: from is not before until", "correct the times")
	case over.Length() > maxCovers:
		d.add(h.until.at, "covers is longer than 400 days", "split the list")
	default:
		d.text.Covers = over
	}
}

// replaced reads replaces.
func (d *draft) replaced() {
	for i, c := range d.head.replaces {
		if i == maxNames {
			d.add(c.at, "replaces names too many lists", "name at most 1000")
			return
		}
		id, ok := d.name(c, c.at, "replaces")
		if !ok {
			continue
		}
		one := closures.ListID(id)
		if one == d.text.ID && one != "" {
			d.add(c.at, "the list replaces itself", "name an older list, or leave replaces out")
			continue
		}
		if slices.Contains(d.text.Replaces, one) {
			d.addf(c.at, "name each once", "replaces names %s twice", quoted(id))
			continue
		}
		d.text.Replaces = append(d.text.Replaces, one)
	}
}

// beams reads beams. An empty beams is refused, since no beam and every beam
// could both be meant.
func (d *draft) beams() {
	h := &d.head
	if h.beamsSet && len(h.beams) == 0 {
		d.add(h.beamsAt, "beams is empty", "name the beams, or leave beams out for every beam")
	}
	for i, c := range h.beams {
		if i == maxNames {
			d.add(c.at, "beams names too many beams", "name at most 1000")
			return
		}
		id, ok := d.name(c, c.at, "beams")
		if !ok {
			continue
		}
		if slices.Contains(d.text.Beams, closures.BeamID(id)) {
			d.addf(c.at, "name each once", "beams names %s twice", quoted(id))
			continue
		}
		d.text.Beams = append(d.text.Beams, closures.BeamID(id))
	}
}

// counted holds window_count against the windows that were read.
func (d *draft) counted() {
	c := d.head.count
	if !c.set() || c.kind == reported {
		return
	}
	n, ok := whole(c.text)
	if !ok || c.kind != bare && c.kind != numeral {
		d.addf(c.at, "write how many windows the list has", "window_count %s is not a whole number", quoted(c.text))
		return
	}
	if n != d.seen {
		if d.lost {
			return
		}
		d.addf(c.at, "ask for the list again: windows may be lost", "window_count is %d and the list has %d windows", n, d.seen)
		return
	}
	d.text.Proof.Count = true
}

// whole reads one to nine digits without a leading zero.
func whole(text []byte) (n int, ok bool) {
	if len(text) == 0 || len(text) > 9 || len(text) > 1 && text[0] == '0' {
		return 0, false
	}
	for _, c := range text {
		if c < '0' || c > '9' {
			return 0, false
		}
		n = n*10 + int(c-'0')
	}
	return n, true
}
