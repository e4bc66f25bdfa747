package listfile

import (
	"beamward/closures"
)

// cells reads an object of scalars into the cells that a function names.
func (j *jsonReader) cells(what string, dst func(key string) *cell) (ok bool, err error) {
	return j.object(what, func(key []byte) error {
		at := j.place(key)
		to := dst(string(key))
		switch {
		case to == nil:
			j.d.unknownKey(at, key)
			return j.s.skip()
		case to.set():
			j.d.twice(at, key)
			return j.s.skip()
		}
		c, err := j.s.scalar()
		*to = c
		return err
	})
}

// region reads one region.
func (j *jsonReader) region() error {
	r := regionText{}
	var seen keys
	if _, err := j.s.peek(); err != nil { // to the line it begins on
		return err
	}
	r.at = j.place([]byte("a region"))
	ok, err := j.object("a region", func(key []byte) error {
		n := regionKey(string(key))
		at := j.place(key)
		if n < 0 {
			j.d.unknownKey(at, key)
			return j.s.skip()
		}
		if !seen.take(j.d, n, at, key) {
			return j.s.skip()
		}
		return j.regionValue(&r, n, at)
	})
	if ok && err == nil {
		if r.id.set() {
			r.at.text = r.id.text
		}
		j.d.region(&r)
	}
	return err
}

func (j *jsonReader) regionValue(r *regionText, n int, at place) (err error) {
	var ok bool
	switch n {
	case keyID:
		r.id, err = j.s.scalar()
		return err
	case keyThroughout:
		r.throughout, err = j.s.scalar()
		return err
	case keyWholeSky:
		var c cell
		if c, err = j.s.scalar(); err == nil {
			j.d.wholeSky(r, c, at)
		}
		return err
	case keyICRS:
		j.d.setShape(r, closures.ICRSCone, at)
		ok, err = j.cells("icrs", r.coneCell)
	case keyHorizon:
		j.d.setShape(r, closures.HorizonBox, at)
		ok, err = j.cells("horizon", r.boxCell)
	case keyTrack:
		j.d.setShape(r, closures.TrackCone, at)
		ok, err = j.track(r)
	}
	r.bad = r.bad || !ok
	return err
}

// track reads the radius and the points.
func (j *jsonReader) track(r *regionText) (ok bool, err error) {
	var seen keys
	return j.object("track", func(key []byte) error {
		at := j.place(key)
		switch string(key) {
		case "radius_deg":
			if !seen.take(j.d, 0, at, key) {
				return j.s.skip()
			}
			c, err := j.s.scalar()
			r.radius = c
			return err
		case "points":
			if !seen.take(j.d, 1, at, key) {
				return j.s.skip()
			}
			return j.array("points", func() error { return j.point(r) })
		}
		j.d.unknownKey(at, key)
		return j.s.skip()
	})
}

func (j *jsonReader) point(r *regionText) error {
	var p pointText
	if _, err := j.s.peek(); err != nil {
		return err
	}
	p.at = j.place([]byte("a point"))
	before := j.d.total
	ok, err := j.cells("a point", p.cell)
	if !ok || err != nil {
		r.bad = true
		return err
	}
	if r.points, ok = j.d.point(r.points, &p); !ok || j.d.total > before {
		r.bad = true
	}
	return nil
}

// window reads one window.
func (j *jsonReader) window() error {
	var w windowText
	if _, err := j.s.peek(); err != nil {
		return err
	}
	w.at = j.place([]byte("a window"))
	var seen keys
	before := j.d.total
	ok, err := j.object("a window", func(key []byte) error {
		at := j.place(key)
		n := windowKey(string(key))
		if n < 0 {
			j.d.unknownKey(at, key)
			return j.s.skip()
		}
		if !seen.take(j.d, n, at, key) {
			return j.s.skip()
		}
		var err error
		switch n {
		case keyRegion:
			w.region, err = j.s.scalar()
		case keyRef:
			w.ref, err = j.s.scalar()
		default:
			if j.d.setState(&w, n == keyOpen, at) {
				ok := false
				ok, err = j.cells(string(key), w.spanCell)
				w.bad = w.bad || !ok
			} else {
				err = j.s.skip()
			}
		}
		return err
	})
	if err != nil {
		return err
	}
	if !ok {
		j.d.seen++
		return nil
	}
	w.bad = w.bad || j.d.total > before
	if w.region.set() {
		w.at.text = w.region.text
	}
	j.d.window(&w)
	return nil
}
