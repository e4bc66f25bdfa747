package render

import (
	"slices"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures/plan"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Twilight returns the bands of a chart's sky: day, civil, nautical and
// astronomical twilight, and night, by the Sun's centre at the horizon (-0.833°,
// for its radius and the air), -6°, -12° and -18°.
func Twilight(nights []*sky.Night, over span.Span) []Band {
	words := [...]string{"day", "civil", "nautical", "astronomical", "night"}
	below := [...]s1.Angle{-0.833 * s1.Degree, -6 * s1.Degree, -12 * s1.Degree, -18 * s1.Degree}
	rest := span.Make(over)
	var out []Band
	for i, word := range words {
		here := rest
		if i < len(below) {
			darker := plan.SunBelow(nights, over, below[i])
			here, rest = rest.Subtract(darker), rest.Intersect(darker)
		}
		for _, s := range here {
			if s.Length() >= time.Second {
				out = append(out, Band{Over: s, Word: word, Dark: i})
			}
		}
	}
	slices.SortFunc(out, func(a, b Band) int { return a.Over.From.Compare(b.Over.From) })
	return out
}
