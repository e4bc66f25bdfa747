package listfile

import (
	"fmt"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
)

// writable says why a list cannot be written so that reading it gives it back:
// a list that Read did not make may hold what no text can. Nothing is written
// of such a list, since what a reader would make of it is not what it says.
func writable(t *closures.ListText) error {
	fail := func(what string, args ...any) error {
		return fmt.Errorf("write closure list %.64q: "+what, append([]any{t.ID}, args...)...)
	}
	if !closures.ValidName(string(t.ID)) || !closures.ValidName(string(t.Authority)) {
		return fail("its id or its authority is not a name")
	}
	for _, id := range t.Replaces {
		if !closures.ValidName(string(id)) {
			return fail("replaces holds %.64q, which is not a name", id)
		}
	}
	for _, b := range t.Beams {
		if !closures.ValidName(string(b)) {
			return fail("beams holds %.64q, which is not a name", b)
		}
	}
	for _, at := range []time.Time{t.Issued, t.Covers.From, t.Covers.Until} {
		if !wholeTime(at) {
			return fail("%v is not on a millisecond from 2000 to 2199", at)
		}
	}
	for i := range t.Regions {
		if !writableRegion(&t.Regions[i]) {
			return fail("region %d is not one", i)
		}
	}
	for i := range t.Windows {
		w := &t.Windows[i]
		if w.Region < 0 || int(w.Region) >= len(t.Regions) || !wholeMilliseconds(w.From) || !wholeMilliseconds(w.Until) {
			return fail("window %d has no region, or is not on milliseconds from 2000 to 2199", i)
		}
		if n := len(w.Ref); n > maxRef || n > 0 && (w.Ref[0] == ' ' || w.Ref[n-1] == ' ' || !printable(w.Ref)) {
			return fail("the ref of window %d is not usable", i)
		}
	}
	return nil
}

func wholeMilliseconds(ns int64) bool {
	return ns%int64(time.Millisecond) == 0 && ns >= firstInstant && ns < lastInstant
}

func wholeTime(at time.Time) bool {
	return at.Year() >= 2000 && at.Year() < 2200 && wholeMilliseconds(at.UnixNano())
}

func writableRegion(r *closures.Region) bool {
	if !closures.ValidName(r.ID) {
		return false
	}
	radius := r.Radius > 0 && r.Radius <= 90*s1.Degree
	switch r.Shape {
	case closures.ICRSCone:
		return radius && unitVector(r.Direction)
	case closures.HorizonBox:
		return r.Box.Valid()
	case closures.TrackCone:
		for _, p := range r.Points {
			if !wholeTime(p.At) || !unitVector(p.Direction) {
				return false
			}
		}
		return radius
	case closures.WholeSky:
		return true
	}
	return false
}

func unitVector(v r3.Vector) bool {
	n := v.Norm2()
	return n > 1-1e-9 && n < 1+1e-9
}
