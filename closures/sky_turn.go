package closures

import (
	"math"

	"github.com/golang/geo/r3"

	"beamward/geometry/sky"
)

// turning knows for how long at least a direction that turns with the sky stays
// on its side of an elevation, where a rate alone would make a plan's search
// step toward the edge many times.
type turning struct {
	pole  r3.Vector
	turns float64 // bounds how fast the direction leaves the sky's turn, rad/s
	is    bool
}

// turning prepares that for the question's aim. A decision goes by the rate.
func (q *Question) turning(f *Foreseen) turning {
	if !q.Now.IsZero() || !q.Aim.followsSky() {
		return turning{}
	}
	sin, cos := math.Sincos(f.Rules.Site.Position.Lat.Radians())
	_, rate := q.overhead()
	return turning{pole: r3.Vector{Y: cos, Z: sin}, turns: rate - sky.SkyRate + together, is: true}
}

// stays returns a time in seconds for which the elevation of d surely does not
// reach any of the levels, all in rad; 0 where that cannot be told. It looks
// ahead no farther than some times soon, which is a time that is sure anyhow.
//
// In the frame of the sky the direction stands still and the vertical turns, so
// the sine of the elevation is k + x cos φ + y sin φ.
func (t *turning) stays(d r3.Vector, soon float64, levels ...float64) float64 {
	if !t.is {
		return 0
	}
	const farthest = math.Pi // rad
	most := min(farthest/skyTurn, 30*soon)
	k := t.pole.Z * t.pole.Dot(d)
	x, y := d.Z-k, d.Dot(t.pole.Cross(r3.Vector{Z: 1}))
	size, phase := math.Hypot(x, y), math.Atan2(y, x)
	spare := t.turns*most + 1e-12
	el := math.Atan2(d.Z, math.Hypot(d.X, d.Y))
	for _, level := range levels {
		switch {
		case el > level+spare:
			level += spare
		case el < level-spare:
			level -= spare
		default:
			return 0
		}
		if at := math.Sin(level); level < math.Pi/2 && math.Abs(at-k) <= size {
			half := math.Acos((at - k) / size)
			most = min(most, ahead(phase-half)/skyTurn, ahead(phase+half)/skyTurn)
		}
	}
	if !(most > 0) {
		return 0
	}
	return most
}

// rate returns a rate for a search whose margin, m now, is used up where the
// elevation of d reaches one of the levels: the one given, or a lower one.
func (t *turning) rate(m, rate float64, d r3.Vector, levels ...float64) float64 {
	if !t.is {
		return rate
	}
	size := math.Abs(m)
	if sure := t.stays(d, size/rate, levels...); sure*rate > size {
		return size / sure
	}
	return rate
}

// ahead brings an angle to [0, 2π).
func ahead(a float64) float64 {
	a = math.Mod(a, 2*math.Pi)
	if a < 0 {
		a += 2 * math.Pi
	}
	return a
}
