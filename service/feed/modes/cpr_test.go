package modes

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// What is encoded is found again by a reference within half a zone, and by a
// pair, all over the globe, to within the width of a step (5.1 m in latitude).
func TestPositionsThereAndBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		lat := rapid.Float64Range(-89.9, 89.9).Draw(t, "lat")
		lon := rapid.Float64Range(-180, 179.999).Draw(t, "lon")
		surface := rapid.Bool().Draw(t, "surface")
		truth := placeAt(lat, lon)
		even, odd := encode(lat, lon, false, surface), encode(lat, lon, true, surface)
		for _, c := range []CPR{even, odd} {
			reach := 320e3
			if surface {
				reach = 80e3
			}
			bearing := rapid.Float64Range(0, 2*math.Pi).Draw(t, "bearing")
			away := rapid.Float64Range(0, reach).Draw(t, "away")
			refLat := lat + away*math.Cos(bearing)/111195
			if math.Abs(refLat) > 89 || math.Abs(lat) > 86 {
				refLat = lat
			}
			refLon := lon
			if math.Abs(lat) < 86 {
				// The parallel nearer to the pole is the shorter one.
				refLon += away * math.Sin(bearing) / (111195 * math.Cos(min(math.Abs(refLat), math.Abs(lat))*math.Pi/180))
			}
			gotLat, gotLon, ok := c.Near(refLat, refLon)
			got := placeAt(gotLat, gotLon)
			if !ok || got.from(&truth) > 20 {
				t.Fatalf("%+v near %v, %v: %v, %v, %v", c, refLat, refLon, gotLat, gotLon, ok)
			}
		}
		for _, newest := range []bool{false, true} {
			p := Pair{Even: even, Odd: odd, OddNewest: newest}
			gotLat, gotLon, ok := p.Position(lat+0.3, lon-0.3)
			if !ok { // allowed only where the two lie in different numbers of zones, at an edge
				e, o := p.latitudes()
				if zonesAt(e) == zonesAt(o) && !surface {
					t.Fatalf("no position for %v, %v", lat, lon)
				}
				continue
			}
			got := placeAt(gotLat, gotLon)
			if got.from(&truth) > 20 {
				t.Fatalf("a pair for %v, %v: %v, %v", lat, lon, gotLat, gotLon)
			}
		}
	})
}

// A position alone never stands for another place within half a zone of the
// reference: what is nearer than 330 km cannot be mistaken.
func TestWhatIsNearCannotBeMistaken(t *testing.T) {
	g := random()
	for range 200_000 {
		lat, lon := 140*g.Float64()-70, 360*g.Float64()-180
		refLat := lat + 3*(2*g.Float64()-1)
		refLon := lon + 3*(2*g.Float64()-1)/math.Cos(lat*math.Pi/180)
		truth, ref := placeAt(lat, lon), placeAt(refLat, refLon)
		if truth.from(&ref) > 325e3 {
			continue
		}
		c := encode(lat, lon, g.IntN(2) == 0, false)
		gotLat, gotLon, ok := c.Near(refLat, refLon)
		if got := placeAt(gotLat, gotLon); !ok || got.from(&truth) > 20 {
			t.Fatalf("%v, %v seen from %v, %v: %v, %v", lat, lon, refLat, refLon, gotLat, gotLon)
		}
	}
}
