package modes

import "math"

// CPR is a position within its zone, as a frame of the even or the odd format
// states it (compact position reporting, 17 bits a coordinate).
type CPR struct {
	Lat, Lon uint32
	Odd      bool
	Surface  bool // zones are a quarter as wide
}

const cprUnit = 1.0 / (1 << 17)

// latZone is the height of a zone in degrees.
func (c *CPR) latZone() float64 {
	d := 360.0 / 60
	if c.Odd {
		d = 360.0 / 59
	}
	if c.Surface {
		d /= 4
	}
	return d
}

// lonZone is the width of a zone in degrees at a latitude.
func (c *CPR) lonZone(lat float64) float64 {
	n := zonesAt(lat)
	if c.Odd {
		n--
	}
	d := 360 / float64(max(n, 1))
	if c.Surface {
		d /= 4
	}
	return d
}

// Near returns the position that c stands for nearest to a reference, in
// degrees: the true one if that is less than half a zone away, 330 km in the
// air and 83 km on the surface.
func (c *CPR) Near(refLat, refLon float64) (lat, lon float64, ok bool) {
	lat = nearest(refLat, c.latZone(), float64(c.Lat)*cprUnit)
	if !(lat >= -90 && lat <= 90) {
		return 0, 0, false
	}
	lon = nearest(refLon, c.lonZone(lat), float64(c.Lon)*cprUnit)
	return lat, around(lon), true
}

// nearest returns the value at a fraction of its zone that lies nearest to the
// reference.
func nearest(ref, zone, fraction float64) float64 {
	j := math.Floor(ref/zone) + math.Floor(0.5+modulo(ref, zone)/zone-fraction)
	return zone * (j + fraction)
}

func modulo(x, y float64) float64 { return x - y*math.Floor(x/y) }

// around brings a longitude into [-180, 180).
func around(lon float64) float64 {
	if lon >= 180 {
		return lon - 360
	}
	if lon < -180 {
		return lon + 360
	}
	return lon
}

// Pair is a frame of each format from one aircraft, close together in time.
type Pair struct {
	Even, Odd CPR
	OddNewest bool
}

// Position returns the position of the newer frame, in degrees. In the air it
// is unique; on the surface that nearest to the reference is taken of the
// eight there are. Pairs whose latitudes contradict, lie beyond a pole or
// belong to different numbers of zones have none.
func (p *Pair) Position(refLat, refLon float64) (lat, lon float64, ok bool) {
	even, odd := p.latitudes()
	if p.Even.Surface {
		// Latitudes repeat every 90°: the northern answer is in [0°, 90°].
		even, odd = modulo(even, 90), modulo(odd, 90)
		if math.Abs(even-90-refLat) < math.Abs(even-refLat) {
			even, odd = even-90, odd-90
		}
	}
	if !(even >= -90 && even <= 90 && odd >= -90 && odd <= 90) {
		return 0, 0, false
	}
	n := zonesAt(even)
	if zonesAt(odd) != n {
		return 0, 0, false
	}
	x0, x1 := float64(p.Even.Lon)*cprUnit, float64(p.Odd.Lon)*cprUnit
	m := math.Floor(x0*float64(n-1) - x1*float64(n) + 0.5)
	lat, x, ni := even, x0, max(n, 1)
	if p.OddNewest {
		lat, x, ni = odd, x1, max(n-1, 1)
	}
	whole := 360.0
	if p.Even.Surface {
		whole = 90
	}
	lon = whole / float64(ni) * (modulo(m, float64(ni)) + x)
	if p.Even.Surface {
		lon += 90 * math.Round((refLon-lon)/90)
		lon = modulo(lon+180, 360) - 180
	}
	return lat, around(lon), true
}

func (p *Pair) latitudes() (even, odd float64) {
	y0, y1 := float64(p.Even.Lat)*cprUnit, float64(p.Odd.Lat)*cprUnit
	j := math.Floor(59*y0 - 60*y1 + 0.5)
	d0, d1 := p.Even.latZone(), p.Odd.latZone()
	even, odd = d0*(modulo(j, 60)+y0), d1*(modulo(j, 59)+y1)
	if p.Even.Surface {
		return even, odd
	}
	if even >= 270 {
		even -= 360
	}
	if odd >= 270 {
		odd -= 360
	}
	return even, odd
}

// narrowings[n] is the latitude, in degrees, up to which n zones of longitude
// lie around the Earth.
var narrowings = func() (t [60]float64) {
	for n := 2; n <= 59; n++ {
		t[n] = math.Acos(math.Sqrt((1-math.Cos(math.Pi/30))/(1-math.Cos(2*math.Pi/float64(n))))) * 180 / math.Pi
	}
	t[2] = 87 // by definition
	return t
}()

// zonesAt returns the number of even zones of longitude at a latitude in
// degrees, NL in the literature: 59 at the equator, 1 beyond 87°.
func zonesAt(lat float64) int {
	lat = math.Abs(lat)
	low, high := 1, 59 // the answer lies within
	for low < high {
		if mid := (low + high + 1) / 2; lat <= narrowings[mid] {
			low = mid
		} else {
			high = mid - 1
		}
	}
	return low
}
