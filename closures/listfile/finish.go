package listfile

import (
	"cmp"
	"slices"

	"beamward/closures"
)

// finish makes the checks that need the whole list, and returns the list or
// the refusal.
func (d *draft) finish() (*closures.ListText, error) {
	early := d.settled
	d.settle()
	if !d.full {
		d.counted()
		d.resolve(early)
		d.standing()
		d.repeated()
	}
	if d.any() {
		return nil, d.refusal()
	}
	t := &d.text
	t.Digest = Digest(t)
	if c := d.head.digest; c.set() {
		d.carried(c)
	}
	if d.any() {
		return nil, d.refusal()
	}
	return t, nil
}

// carried holds the digest in the text against the one computed.
func (d *draft) carried(c cell) {
	given, err := closures.ParseDigest(string(c.text))
	switch {
	case c.kind != bare && c.kind != quotedText || err != nil:
		d.addf(c.at, "write sha256: and 64 lower-case hexadecimal digits", "digest %s is not a digest", quoted(c.text))
	case given.IsZero() || given != d.text.Digest:
		d.add(c.at, "the digest does not fit the list: something in it was changed or lost", "ask the authority for the list again")
	default:
		d.text.Proof.Digest = true
	}
}

// resolve turns the windows' names into indexes of regions, and holds the
// windows against what only the whole list can tell.
func (d *draft) resolve(coverageHeld bool) {
	for i := range d.text.Windows {
		w := &d.text.Windows[i]
		name := w.Region
		w.Region = d.byName[name].region
		if w.Region == noRegion {
			if !d.head.regionsSet { // reported as missing
				continue
			}
			d.add(d.windowPlace(i, name), "the window names a region that the list does not define", "define the region")
			continue
		}
		if !coverageHeld && d.outside(w) {
			d.add(d.windowPlace(i, name), outsideCause, outsideMend)
		}
		if w.Region < 0 {
			continue
		}
		if r := &d.text.Regions[w.Region]; r.Shape == closures.TrackCone && len(r.Points) > 1 && !onTrack(r, w.From, w.Until) {
			d.add(d.windowPlace(i, name), "the window reaches beyond the points of its track, where the region is nowhere", "give points for all of the window")
		}
	}
}

// onTrack reports whether the points of a track reach from one instant to
// another.
func onTrack(r *closures.Region, from, until int64) bool {
	return from >= r.Points[0].At.UnixNano() && until <= r.Points[len(r.Points)-1].At.UnixNano()
}

// standing checks what each region says beside its windows.
func (d *draft) standing() {
	c := d.text.Covers
	for _, n := range d.byName {
		if n.region < 0 {
			continue
		}
		r := &d.text.Regions[n.region]
		at := d.regionPlace(r)
		switch {
		case !n.used && r.Throughout == closures.NotThroughout && !d.lost:
			d.add(at, "the region has neither windows nor throughout", "give it windows, or throughout: closed or open")
		case n.used && r.Throughout != closures.NotThroughout:
			d.add(at, "the region has windows and throughout", "give one of them")
		}
		if r.Shape != closures.TrackCone {
			continue
		}
		switch {
		case len(r.Points) < 2:
			d.add(at, "the track has fewer than two points", "give at least two points")
		case r.Throughout != closures.NotThroughout && !c.Empty() && !onTrack(r, c.From.UnixNano(), c.Until.UnixNano()):
			d.add(at, "the track holds throughout, and its points do not reach over covers", "give points for all of covers, or windows")
		}
	}
}

// repeated refuses a window that stands in the list twice. A line copied over
// another would otherwise keep the count and lose a closure.
func (d *draft) repeated() {
	w := d.text.Windows
	order := make([]int32, len(w))
	for i := range order {
		order[i] = int32(i)
	}
	compare := func(a, b int32) int {
		x, y := &w[a], &w[b]
		if c := cmp.Compare(x.Region, y.Region); c != 0 {
			return c
		}
		if c := cmp.Compare(x.From, y.From); c != 0 {
			return c
		}
		if c := cmp.Compare(x.Until, y.Until); c != 0 {
			return c
		}
		if x.Open != y.Open {
			if y.Open {
				return -1
			}
			return 1
		}
		return cmp.Compare(x.Ref, y.Ref)
	}
	if !slices.IsSortedFunc(order, compare) {
		slices.SortFunc(order, func(a, b int32) int { return cmp.Or(compare(a, b), cmp.Compare(a, b)) })
	}
	twice := make(map[int32]bool)
	for i := 1; i < len(order); i++ {
		a, b := order[i-1], order[i]
		if w[a].Region < 0 || compare(a, b) != 0 {
			continue
		}
		if d.dropRepeats {
			twice[b] = true
			continue
		}
		d.addf(d.windowPlace(int(b), -1), "take one of them out, or tell them apart by ref", "the window stands on line %d already", d.text.Lines[a])
	}
	if len(twice) > 0 {
		d.drop(twice)
	}
}

// drop takes windows out.
func (d *draft) drop(out map[int32]bool) {
	kept := 0
	for i := range d.text.Windows {
		if !out[int32(i)] {
			d.text.Windows[kept], d.text.Lines[kept] = d.text.Windows[i], d.text.Lines[i]
			kept++
		}
	}
	d.text.Windows, d.text.Lines = d.text.Windows[:kept], d.text.Lines[:kept]
}

// windowPlace returns where window i stood. name is the index of its region's
// name while Region does not hold the region yet.
func (d *draft) windowPlace(i int, name int32) place {
	at := place{line: d.text.Lines[i]}
	if d.line != nil {
		at.text = d.line(at.line)
		return at
	}
	if len(d.lines) >= KeptLines {
		return at
	}
	w := d.text.Windows[i]
	var id string
	if w.Region >= 0 {
		id = d.text.Regions[w.Region].ID
	} else if name >= 0 {
		for known, index := range d.names {
			if index == name {
				id = known
			}
		}
	}
	at.text = appendWindow(nil, id, &w)
	return at
}

func (d *draft) regionPlace(r *closures.Region) place {
	at := place{line: r.Line}
	if d.line != nil {
		at.text = d.line(at.line)
	} else {
		at.text = []byte(r.ID)
	}
	return at
}
