package listfile

import (
	"io"
	"strconv"

	"beamward/closures"
)

// The writers below write a list as an authority would send it, one region or
// window on a line, with its window count and its digest.

// WriteJSON writes t in the native JSON form.
func WriteJSON(w io.Writer, t *closures.ListText) error {
	if err := writable(t); err != nil {
		return err
	}
	out := sink{w: w}
	b := appendHead(nil, t)
	b = append(b, `,"window_count":`...)
	b = strconv.AppendInt(b, int64(len(t.Windows)), 10)
	b = append(b, `,"digest":"`...)
	b = append(b, Digest(t).String()...)
	b = append(b, "\",\n\"regions\":["...)
	for i := range t.Regions {
		b = append(b, separator(i)...)
		b = out.spill(appendRegion(b, &t.Regions[i]))
	}
	b = append(b, "],\n\"windows\":["...)
	for i := range t.Windows {
		b = append(b, separator(i)...)
		b = out.spill(appendWindow(b, regionID(t, &t.Windows[i]), &t.Windows[i]))
	}
	out.write(append(b, "]}\n"...))
	return out.err
}

func separator(i int) string {
	if i == 0 {
		return "\n"
	}
	return ",\n"
}

// WriteCSV writes t in the native CSV form: each region, with the points of
// its track, before any window.
func WriteCSV(w io.Writer, t *closures.ListText) error {
	if err := writable(t); err != nil {
		return err
	}
	out := sink{w: w}
	b := []byte("# closure_list: 1\n# id: " + string(t.ID) + "\n# authority: " + string(t.Authority) + "\n# issued: ")
	b = appendTime(b, t.Issued.UnixNano())
	b = append(b, "\n# covers: "...)
	b = appendTime(b, t.Covers.From.UnixNano())
	b = append(b, '/')
	b = appendTime(b, t.Covers.Until.UnixNano())
	b = append(b, '\n')
	b = appendNames(b, "# replaces: ", t.Replaces)
	b = appendNames(b, "# beams: ", t.Beams)
	b = append(b, "# unlisted_sky: "+stateWord(t.UnlistedOpen)+"\n# window_count: "...)
	b = strconv.AppendInt(b, int64(len(t.Windows)), 10)
	b = append(b, "\n# digest: "+Digest(t).String()+"\n"+csvHeader+"\n"...)
	for i := range t.Regions {
		b = out.spill(appendRegionRows(b, &t.Regions[i]))
	}
	for i := range t.Windows {
		x := &t.Windows[i]
		b = append(b, regionID(t, x)...)
		b = append(b, ",,,,,,,,,,"...)
		b = append(b, stateWord(x.Open)...)
		b = append(b, ',')
		b = appendTime(b, x.From)
		b = append(b, ',')
		b = appendTime(b, x.Until)
		b = append(b, ',')
		b = out.spill(append(appendField(b, x.Ref), '\n'))
	}
	out.write(b)
	return out.err
}

func appendNames[T ~string](b []byte, key string, names []T) []byte {
	for i, n := range names {
		if i == 0 {
			b = append(b, key...)
		} else {
			b = append(b, ", "...)
		}
		b = append(b, n...)
	}
	if len(names) > 0 {
		b = append(b, '\n')
	}
	return b
}

// appendRegionRows appends the row that defines a region, and rows for the
// points of a track.
func appendRegionRows(b []byte, r *closures.Region) []byte {
	b = append(append(b, r.ID...), ',')
	none := func(n int) {
		for range n {
			b = append(b, ',')
		}
	}
	degrees := func(p picodegrees) { b = append(appendDegrees(b, p), ',') }
	switch r.Shape {
	case closures.ICRSCone:
		b = append(b, "icrs,"...)
		ra, dec := unitsOfEquator(r.Direction)
		degrees(ra)
		degrees(dec)
		degrees(unitsOf(r.Radius))
		none(4)
	case closures.HorizonBox:
		b = append(b, "horizon"...)
		if r.Observed {
			b = append(b, "_observed"...)
		}
		none(4)
		degrees(unitsOf(r.Box.AzFrom))
		degrees(unitsOf(r.Box.AzTo))
		degrees(unitsOf(r.Box.ElFrom))
		degrees(unitsOf(r.Box.ElTo))
	case closures.TrackCone:
		b = append(b, "track,,,"...)
		degrees(unitsOf(r.Radius))
		none(4)
	default:
		b = append(b, r.Shape.String()...)
		none(8)
	}
	if r.Throughout != closures.NotThroughout {
		b = append(b, stateWord(r.Throughout == closures.ThroughoutOpen)...)
	}
	b = append(b, ",,,,\n"...)
	for _, p := range r.Points {
		ra, dec := unitsOfEquator(p.Direction)
		b = append(append(b, r.ID...), ",,"...)
		degrees(ra)
		degrees(dec)
		b = append(b, ",,,,,,point,"...)
		b = append(appendTime(b, p.At.UnixNano()), ",,\n"...)
	}
	return b
}

// appendField appends text as a field, in quotes where it needs them.
func appendField(b []byte, s string) []byte {
	quote := false
	for i := 0; i < len(s); i++ {
		quote = quote || s[i] == ',' || s[i] == '"'
	}
	if !quote {
		return append(b, s...)
	}
	b = append(b, '"')
	for i := 0; i < len(s); i++ {
		if s[i] == '"' {
			b = append(b, '"')
		}
		b = append(b, s[i])
	}
	return append(b, '"')
}
