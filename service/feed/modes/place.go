package modes

import "math"

// place is a position on the globe: degrees, and the unit vector toward it.
type place struct {
	lat, lon float64
	x, y, z  float64
}

func placeAt(lat, lon float64) place {
	sinLat, cosLat := math.Sincos(lat * math.Pi / 180)
	sinLon, cosLon := math.Sincos(lon * math.Pi / 180)
	return place{lat, lon, cosLat * cosLon, cosLat * sinLon, sinLat}
}

// meanRadius is the Earth's, in metres.
const meanRadius = 6.371e6

// from is the distance between two places in metres, to within 1 % up to
// 1,000 km: the chord.
func (p *place) from(o *place) float64 {
	dx, dy, dz := p.x-o.x, p.y-o.y, p.z-o.z
	return meanRadius * math.Sqrt(dx*dx+dy*dy+dz*dz)
}
