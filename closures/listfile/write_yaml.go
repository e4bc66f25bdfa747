package listfile

import (
	"io"
	"strconv"
	"strings"

	"beamward/closures"
)

// WriteYAML writes t in the native YAML form. A list of more than 50,000
// windows is written all the same, but cannot be read back.
func WriteYAML(w io.Writer, t *closures.ListText) error {
	if err := writable(t); err != nil {
		return err
	}
	out := sink{w: w}
	b := []byte("closure_list: 1\nid: " + yamlName(string(t.ID)) + "\nauthority: " + yamlName(string(t.Authority)) + "\nissued: ")
	b = append(appendTime(b, t.Issued.UnixNano()), "\ncovers: "...)
	b = append(appendYAMLSpan(b, t.Covers.From.UnixNano(), t.Covers.Until.UnixNano()), '\n')
	b = appendYAMLNames(b, "replaces: [", t.Replaces)
	b = appendYAMLNames(b, "beams: [", t.Beams)
	b = append(b, "unlisted_sky: "+stateWord(t.UnlistedOpen)+"\nwindow_count: "...)
	b = strconv.AppendInt(b, int64(len(t.Windows)), 10)
	b = append(b, "\ndigest: \""+Digest(t).String()+"\"\nregions:"...)
	b = append(b, emptyMark(len(t.Regions))...)
	for i := range t.Regions {
		b = append(b, "  - "...)
		b = out.spill(append(appendYAMLRegion(b, &t.Regions[i]), '\n'))
	}
	b = append(b, "windows:"...)
	b = append(b, emptyMark(len(t.Windows))...)
	for i := range t.Windows {
		x := &t.Windows[i]
		b = append(b, "  - {region: "+yamlName(regionID(t, x))+", "+stateWord(x.Open)+": "...)
		b = appendYAMLSpan(b, x.From, x.Until)
		if x.Ref != "" {
			b = appendString(append(b, ", ref: "...), x.Ref)
		}
		b = out.spill(append(b, "}\n"...))
	}
	out.write(b)
	return out.err
}

func emptyMark(n int) string {
	if n == 0 {
		return " []\n"
	}
	return "\n"
}

func appendYAMLNames[T ~string](b []byte, key string, names []T) []byte {
	for i, n := range names {
		if i == 0 {
			b = append(b, key...)
		} else {
			b = append(b, ", "...)
		}
		b = append(b, yamlName(string(n))...)
	}
	if len(names) > 0 {
		b = append(b, "]\n"...)
	}
	return b
}

// yamlName returns a name as every YAML reader takes it for text: in quotes
// unless it begins with a letter and is none of the words that some version of
// YAML has for true, false, null or a number.
func yamlName(s string) string {
	plain := len(s) > 0 && (s[0] >= 'A' && s[0] <= 'Z' || s[0] >= 'a' && s[0] <= 'z')
	switch strings.ToLower(s) {
	case "true", "false", "yes", "no", "on", "off", "y", "n", "null", "nan", "inf":
		plain = false
	}
	if !plain {
		return `"` + s + `"`
	}
	return s
}

func appendYAMLSpan(b []byte, from, until int64) []byte {
	b = appendTime(append(b, "{from: "...), from)
	b = appendTime(append(b, ", until: "...), until)
	return append(b, '}')
}

// appendYAMLRegion appends a region as a flow mapping.
func appendYAMLRegion(b []byte, r *closures.Region) []byte {
	b = append(b, "{id: "+yamlName(r.ID)...)
	key := func(lead, name string, p picodegrees) { b = appendDegrees(append(b, lead+name+": "...), p) }
	switch r.Shape {
	case closures.ICRSCone:
		ra, dec := unitsOfEquator(r.Direction)
		key(", icrs: {", "ra_deg", ra)
		key(", ", "dec_deg", dec)
		key(", ", "radius_deg", unitsOf(r.Radius))
		b = append(b, '}')
	case closures.HorizonBox:
		key(", horizon: {", "az_from_deg", unitsOf(r.Box.AzFrom))
		key(", ", "az_to_deg", unitsOf(r.Box.AzTo))
		key(", ", "el_from_deg", unitsOf(r.Box.ElFrom))
		key(", ", "el_to_deg", unitsOf(r.Box.ElTo))
		if r.Observed {
			b = append(b, ", observed: true"...)
		}
		b = append(b, '}')
	case closures.TrackCone:
		key(", track: {", "radius_deg", unitsOf(r.Radius))
		b = append(b, ", points: ["...)
		for i, p := range r.Points {
			if i > 0 {
				b = append(b, ", "...)
			}
			ra, dec := unitsOfEquator(p.Direction)
			b = appendTime(append(b, "{at: "...), p.At.UnixNano())
			key(", ", "ra_deg", ra)
			key(", ", "dec_deg", dec)
			b = append(b, '}')
		}
		b = append(b, "]}"...)
	case closures.WholeSky:
		b = append(b, ", whole_sky: true"...)
	}
	if r.Throughout != closures.NotThroughout {
		b = append(b, ", throughout: "+stateWord(r.Throughout == closures.ThroughoutOpen)...)
	}
	return append(b, '}')
}
