package api

import (
	"net/http"
	"strings"

	"beamward/closures/wire"
)

// negotiate picks the answer's media type (RFC 9110, section 12.5.1): the one
// that the client wants most, and of equals the route's first.
func negotiate(accept []string, gives []string) (string, error) {
	if len(accept) == 0 {
		return gives[0], nil
	}
	ranges := strings.Split(strings.Join(accept, ","), ",")
	if len(ranges) > 64 {
		return "", notAcceptable(gives)
	}
	best, bestQ := "", 0.0
	for _, t := range gives {
		if q := quality(ranges, t); q > bestQ {
			best, bestQ = t, q
		}
	}
	if best == "" {
		return "", notAcceptable(gives)
	}
	return best, nil
}

func notAcceptable(gives []string) *refusal {
	return refuse(http.StatusNotAcceptable, "the answer has none of the media types in Accept", "accept "+strings.Join(gives, ", "))
}

// quality is how much the client wants a media type: that of the most specific
// range that holds it.
func quality(ranges []string, mediaType string) float64 {
	kind, _, _ := strings.Cut(mediaType, "/")
	q, specific := 0.0, -1
	for _, one := range ranges {
		parts := strings.Split(one, ";")
		level := -1
		switch name := strings.ToLower(strings.TrimSpace(parts[0])); name {
		case mediaType:
			level = 2
		case kind + "/*":
			level = 1
		case "*/*":
			level = 0
		}
		if level <= specific {
			continue
		}
		weight := 1.0
		for _, p := range parts[1:] {
			name, value, _ := strings.Cut(strings.TrimSpace(p), "=")
			if strings.EqualFold(name, "q") {
				v, err := wire.ParseNumber(value)
				if err != nil || !(v >= 0 && v <= 1) {
					v = 0
				}
				weight = v
			}
		}
		q, specific = weight, level
	}
	return q
}
