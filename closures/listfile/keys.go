package listfile

import "beamward/closures"

// What the YAML and the JSON form have in common: which keys an object has,
// and where each value goes.

// scalar returns where the value of a head key that holds one scalar goes.
func (h *headText) scalar(key string) *cell {
	switch key {
	case "closure_list":
		return &h.version
	case "id":
		return &h.id
	case "authority":
		return &h.authority
	case "issued":
		return &h.issued
	case "unlisted_sky":
		return &h.unlisted
	case "window_count":
		return &h.count
	case "digest":
		return &h.digest
	}
	return nil
}

// The keys of a region.
const (
	keyID = iota
	keyICRS
	keyHorizon
	keyTrack
	keyWholeSky
	keyThroughout
)

func regionKey(key string) int {
	switch key {
	case "id":
		return keyID
	case "icrs":
		return keyICRS
	case "horizon":
		return keyHorizon
	case "track":
		return keyTrack
	case "whole_sky":
		return keyWholeSky
	case "throughout":
		return keyThroughout
	}
	return -1
}

// coneCell returns where the value of a key of icrs goes, nil for no such key.
func (r *regionText) coneCell(key string) *cell {
	switch key {
	case "ra_deg":
		return &r.ra
	case "dec_deg":
		return &r.dec
	case "radius_deg":
		return &r.radius
	}
	return nil
}

// boxCell does so for horizon.
func (r *regionText) boxCell(key string) *cell {
	switch key {
	case "az_from_deg":
		return &r.azFrom
	case "az_to_deg":
		return &r.azTo
	case "el_from_deg":
		return &r.elFrom
	case "el_to_deg":
		return &r.elTo
	case "observed":
		return &r.observed
	}
	return nil
}

// cell does so for a point of a track.
func (p *pointText) cell(key string) *cell {
	switch key {
	case "at":
		return &p.when
	case "ra_deg":
		return &p.ra
	case "dec_deg":
		return &p.dec
	}
	return nil
}

// wholeSky reads whole_sky, which can only be true.
func (d *draft) wholeSky(r *regionText, c cell, at place) {
	if c.kind == reported {
		r.bad = true
		return
	}
	if (c.kind != bare && c.kind != truthValue) || string(c.text) != "true" {
		d.addf(c.at, "write whole_sky: true, or give another shape", "whole_sky %s is not true", quoted(c.text))
		r.bad = true
		return
	}
	d.setShape(r, closures.WholeSky, at)
}

// The keys of a window.
const (
	keyRegion = iota
	keyRef
	keyClosed
	keyOpen
)

func windowKey(key string) int {
	switch key {
	case "region":
		return keyRegion
	case "ref":
		return keyRef
	case "closed":
		return keyClosed
	case "open":
		return keyOpen
	}
	return -1
}

// setState notes whether the window is open; saying both is a fault, and then
// the second span must not be read over the first.
func (d *draft) setState(w *windowText, open bool, at place) bool {
	if w.state {
		d.add(at, "the window is both closed and open", "write two windows")
		w.bad = true
		return false
	}
	w.state, w.open = true, open
	return true
}

// spanCell returns where the value of a key of a window's span goes.
func (w *windowText) spanCell(key string) *cell {
	switch key {
	case "from":
		return &w.from
	case "until":
		return &w.until
	}
	return nil
}
