package listfile

import (
	"crypto/sha256"
	"io"
	"strconv"

	"beamward/closures"
)

// Canonical writes the one form that everybody who holds the list writes to
// the byte: the native JSON on a single line without spaces, keys in the order
//
//	closure_list id authority issued covers{from until} replaces beams
//	unlisted_sky window_count digest regions windows
//	id icrs{ra_deg dec_deg radius_deg}
//	   horizon{az_from_deg az_to_deg el_from_deg el_to_deg observed}
//	   track{radius_deg points[at ra_deg dec_deg]} whole_sky throughout
//	region closed|open{from until} ref
//
// keys that say nothing left out (replaces and beams when empty, observed when
// false, throughout, ref), regions and windows in the order of the list. Angles
// are plain decimals of degrees rounded to 12 places, without trailing zeros;
// times carry milliseconds only when there are any; in strings only the quote
// and the backslash are escaped.
//
// window_count and digest stand in it exactly when the list had proved them,
// so that reading it back gives the same list with the same proof. Digest
// leaves both out. It can be half as long again as the text it came from, so
// read it back under the limits of Recorded.
//
// Canonical and the other writers write nothing of a list that its text could
// not give back, which Read never makes, and return an error.
func Canonical(w io.Writer, t *closures.ListText) error {
	if err := writable(t); err != nil {
		return err
	}
	return writeCanonical(w, t, t.Proof)
}

// Digest returns the SHA-256 of the canonical form without window_count and
// digest: what the list says, whatever the format it came in.
func Digest(t *closures.ListText) closures.Digest {
	h := sha256.New()
	_ = writeCanonical(h, t, closures.Proof{}) // a hash never errs
	var d closures.Digest
	h.Sum(d[:0])
	return d
}

func writeCanonical(w io.Writer, t *closures.ListText, proof closures.Proof) error {
	out := sink{w: w}
	b := appendHead(nil, t)
	if proof.Count {
		b = append(b, `,"window_count":`...)
		b = strconv.AppendInt(b, int64(len(t.Windows)), 10)
	}
	if proof.Digest {
		b = append(b, `,"digest":"`...)
		b = append(b, t.Digest.String()...)
		b = append(b, '"')
	}
	b = append(b, `,"regions":[`...)
	for i := range t.Regions {
		if i > 0 {
			b = append(b, ',')
		}
		b = out.spill(appendRegion(b, &t.Regions[i]))
	}
	b = append(b, `],"windows":[`...)
	for i := range t.Windows {
		if i > 0 {
			b = append(b, ',')
		}
		b = out.spill(appendWindow(b, regionID(t, &t.Windows[i]), &t.Windows[i]))
	}
	out.write(append(b, "]}"...))
	return out.err
}

// sink collects small pieces into large writes and keeps the first error.
type sink struct {
	w   io.Writer
	err error
}

const spillAt = 64 << 10

// spill writes b once it is large, and returns what is left to fill.
func (s *sink) spill(b []byte) []byte {
	if len(b) < spillAt {
		return b
	}
	s.write(b)
	return b[:0]
}

func (s *sink) write(b []byte) {
	if s.err == nil {
		_, s.err = s.w.Write(b)
	}
}

func regionID(t *closures.ListText, w *closures.Window) string {
	if w.Region >= 0 && int(w.Region) < len(t.Regions) {
		return t.Regions[w.Region].ID
	}
	return ""
}

// appendHead appends the opening brace and the head up to unlisted_sky.
func appendHead(b []byte, t *closures.ListText) []byte {
	b = append(b, `{"closure_list":1,"id":`...)
	b = appendString(b, string(t.ID))
	b = append(b, `,"authority":`...)
	b = appendString(b, string(t.Authority))
	b = append(b, `,"issued":"`...)
	b = appendTime(b, t.Issued.UnixNano())
	b = append(b, `","covers":`...)
	b = appendSpan(b, t.Covers.From.UnixNano(), t.Covers.Until.UnixNano())
	for i, id := range t.Replaces {
		b = appendItem(b, "replaces", i, string(id), len(t.Replaces))
	}
	for i, id := range t.Beams {
		b = appendItem(b, "beams", i, string(id), len(t.Beams))
	}
	b = append(b, `,"unlisted_sky":"`...)
	b = append(b, stateWord(t.UnlistedOpen)...)
	return append(b, '"')
}

// appendItem appends item i of n of an array of strings with its brackets.
func appendItem(b []byte, key string, i int, id string, n int) []byte {
	if i == 0 {
		b = append(b, `,"`...)
		b = append(b, key...)
		b = append(b, `":[`...)
	} else {
		b = append(b, ',')
	}
	b = appendString(b, id)
	if i == n-1 {
		b = append(b, ']')
	}
	return b
}

func stateWord(open bool) string {
	if open {
		return "open"
	}
	return "closed"
}

func appendSpan(b []byte, from, until int64) []byte {
	b = append(b, `{"from":"`...)
	b = appendTime(b, from)
	b = append(b, `","until":"`...)
	b = appendTime(b, until)
	return append(b, `"}`...)
}

// appendRegion appends a region as an object.
func appendRegion(b []byte, r *closures.Region) []byte {
	b = append(b, `{"id":`...)
	b = appendString(b, r.ID)
	switch r.Shape {
	case closures.ICRSCone:
		ra, dec := unitsOfEquator(r.Direction)
		b = appendKey(append(b, `,"icrs":{`...), "ra_deg", ra)
		b = appendKey(append(b, ','), "dec_deg", dec)
		b = appendKey(append(b, ','), "radius_deg", unitsOf(r.Radius))
		b = append(b, '}')
	case closures.HorizonBox:
		b = appendKey(append(b, `,"horizon":{`...), "az_from_deg", unitsOf(r.Box.AzFrom))
		b = appendKey(append(b, ','), "az_to_deg", unitsOf(r.Box.AzTo))
		b = appendKey(append(b, ','), "el_from_deg", unitsOf(r.Box.ElFrom))
		b = appendKey(append(b, ','), "el_to_deg", unitsOf(r.Box.ElTo))
		if r.Observed {
			b = append(b, `,"observed":true`...)
		}
		b = append(b, '}')
	case closures.TrackCone:
		b = appendKey(append(b, `,"track":{`...), "radius_deg", unitsOf(r.Radius))
		b = append(b, `,"points":[`...)
		for i, p := range r.Points {
			if i > 0 {
				b = append(b, ',')
			}
			b = appendPoint(b, p)
		}
		b = append(b, "]}"...)
	case closures.WholeSky:
		b = append(b, `,"whole_sky":true`...)
	}
	if r.Throughout != closures.NotThroughout {
		b = append(b, `,"throughout":"`...)
		b = append(b, stateWord(r.Throughout == closures.ThroughoutOpen)...)
		b = append(b, '"')
	}
	return append(b, '}')
}

func appendPoint(b []byte, p closures.AimPoint) []byte {
	ra, dec := unitsOfEquator(p.Direction)
	b = append(b, `{"at":"`...)
	b = appendTime(b, p.At.UnixNano())
	b = appendKey(append(b, `",`...), "ra_deg", ra)
	b = appendKey(append(b, ','), "dec_deg", dec)
	return append(b, '}')
}

func appendKey(b []byte, key string, p picodegrees) []byte {
	b = append(b, '"')
	b = append(b, key...)
	b = append(b, `":`...)
	return appendDegrees(b, p)
}

// appendWindow appends a window of the region id as an object.
func appendWindow(b []byte, id string, w *closures.Window) []byte {
	b = append(b, `{"region":`...)
	b = appendString(b, id)
	b = append(b, `,"`...)
	b = append(b, stateWord(w.Open)...)
	b = append(b, `":`...)
	b = appendSpan(b, w.From, w.Until)
	if w.Ref != "" {
		b = append(b, `,"ref":`...)
		b = appendString(b, w.Ref)
	}
	return append(b, '}')
}

// appendString appends s, which has no control characters, as a JSON string.
func appendString(b []byte, s string) []byte {
	b = append(b, '"')
	for i := 0; i < len(s); i++ {
		if s[i] == '"' || s[i] == '\\' {
			b = append(b, '\\')
		}
		b = append(b, s[i])
	}
	return append(b, '"')
}
