package listfile

import (
	"gopkg.in/yaml.v3"

	"beamward/closures"
)

// list reads the list from its root. The head comes first wherever it stands,
// so that windows are held against the coverage as they are read.
func (y *yamlReader) list(root *yaml.Node) {
	h := &y.d.head
	var regions, windows *yaml.Node
	if root.Kind != yaml.MappingNode {
		y.d.stop(y.place(root), "the list is not a mapping", "write it as keys and values")
		return
	}
	y.mapping(root, "the list", func(key string, at place, value *yaml.Node) {
		switch key {
		case "covers":
			h.covers = at
			y.cells(value, key, func(key string) *cell {
				switch key {
				case "from":
					return &h.from
				case "until":
					return &h.until
				}
				return nil
			})
		case "replaces":
			y.names(value, key, &h.replaces)
		case "beams":
			h.beamsAt = at
			h.beamsSet = y.names(value, key, &h.beams)
		case "regions":
			regions, h.regionsSet = value, true
		case "windows":
			windows, h.windowsSet = value, true
		default:
			if dst := h.scalar(key); dst != nil {
				*dst = y.scalar(value)
			} else {
				y.d.unknownKey(at, []byte(key))
			}
		}
	})
	y.d.settle()
	if regions != nil {
		y.sequence(regions, "regions", y.region)
	}
	if windows != nil {
		y.sequence(windows, "windows", y.window)
	}
}

func (y *yamlReader) names(n *yaml.Node, key string, dst *[]cell) (ok bool) {
	return y.sequence(n, key, func(item *yaml.Node) { *dst = append(*dst, y.scalar(item)) })
}

func (y *yamlReader) region(n *yaml.Node) {
	r := regionText{at: y.place(n)}
	before := y.d.total
	ok := y.mapping(n, "a region", func(key string, at place, value *yaml.Node) {
		ok := true
		switch regionKey(key) {
		case keyID:
			r.id = y.scalar(value)
		case keyThroughout:
			r.throughout = y.scalar(value)
		case keyWholeSky:
			y.d.wholeSky(&r, y.scalar(value), at)
		case keyICRS:
			y.d.setShape(&r, closures.ICRSCone, at)
			ok = y.cells(value, key, r.coneCell)
		case keyHorizon:
			y.d.setShape(&r, closures.HorizonBox, at)
			ok = y.cells(value, key, r.boxCell)
		case keyTrack:
			y.d.setShape(&r, closures.TrackCone, at)
			ok = y.track(&r, value)
		default:
			y.d.unknownKey(at, []byte(key))
		}
		r.bad = r.bad || !ok
	})
	r.bad = r.bad || !ok || y.d.total > before
	y.d.region(&r)
}

func (y *yamlReader) track(r *regionText, n *yaml.Node) bool {
	good := true
	ok := y.mapping(n, "track", func(key string, at place, value *yaml.Node) {
		switch key {
		case "radius_deg":
			r.radius = y.scalar(value)
		case "points":
			good = y.sequence(value, "points", func(item *yaml.Node) {
				p := pointText{at: y.place(item)}
				if !y.cells(item, "a point", p.cell) {
					r.bad = true
					return
				}
				var ok bool
				if r.points, ok = y.d.point(r.points, &p); !ok {
					r.bad = true
				}
			}) && good
		default:
			y.d.unknownKey(at, []byte(key))
			good = false
		}
	})
	return ok && good
}

func (y *yamlReader) window(n *yaml.Node) {
	w := windowText{at: y.place(n)}
	before := y.d.total
	ok := y.mapping(n, "a window", func(key string, at place, value *yaml.Node) {
		switch k := windowKey(key); k {
		case keyRegion:
			w.region = y.scalar(value)
		case keyRef:
			w.ref = y.scalar(value)
			if w.ref.kind == bare && len(w.ref.text) == 0 {
				w.ref.kind = null
			}
		case keyClosed, keyOpen:
			if y.d.setState(&w, k == keyOpen, at) {
				ok := y.cells(value, key, w.spanCell)
				w.bad = w.bad || !ok
			}
		default:
			y.d.unknownKey(at, []byte(key))
		}
	})
	w.bad = w.bad || !ok || y.d.total > before
	y.d.window(&w)
}
