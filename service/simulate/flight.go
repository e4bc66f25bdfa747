package simulate

import (
	"math"
	"math/rand/v2"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
)

// flight is one aircraft: straight and level or climbing, but for one turn, no
// harder than the site's bound of acceleration.
type flight struct {
	address string
	from    time.Time // when the turn begins
	at      r3.Vector // where, metres east, north and up of the site
	speed   float64   // m/s over ground
	track   float64   // radians from north through east, before the turn
	climb   float64   // m/s
	rate    float64   // rad/s in the turn; 0: none
	turns   time.Duration
	network bool // the second source hears it as well
}

// place returns where it is and its velocity.
func (f *flight) place(at time.Time) (x, v r3.Vector) {
	t := at.Sub(f.from).Seconds()
	x, track := f.at, f.track
	if t > 0 && f.rate != 0 {
		d := min(t, f.turns.Seconds())
		radius := f.speed / f.rate
		s0, c0 := math.Sincos(track)
		s1, c1 := math.Sincos(track + f.rate*d)
		x.X += radius * (c0 - c1)
		x.Y += radius * (s1 - s0)
		track += f.rate * d
		t -= d
	}
	sin, cos := math.Sincos(track)
	v = r3.Vector{X: f.speed * sin, Y: f.speed * cos, Z: f.climb}
	x.X += v.X * t
	x.Y += v.Y * t
	x.Z += f.climb * at.Sub(f.from).Seconds()
	return x, v
}

// heardWithin is how far aircraft are heard, metres: well beyond what a minute
// of flight can bring into a beam.
const heardWithin = 120e3

// report is what a source says of it: where it was at an instant, wrong by no
// more than the source's bounds.
func (f *flight) report(source closures.Source, was, said time.Time, rng *rand.Rand) (closures.AircraftSeen, bool) {
	horizontal, vertical, speed, climb := 100.0, 50.0, 5.0, 2.0
	if source == "rx-2" {
		horizontal, vertical, speed, climb = 1500, 200, 25, 8
	}
	x, v := f.place(was)
	wrong := func(bound float64) r3.Vector {
		sin, cos := math.Sincos(rng.Float64() * 2 * math.Pi)
		r := 0.95 * bound * rng.Float64()
		return r3.Vector{X: r * sin, Y: r * cos}
	}
	off, slip := wrong(horizontal), wrong(speed)
	up, rise := vertical*0.95*(2*rng.Float64()-1), climb*0.95*(2*rng.Float64()-1)
	if x.Norm() > heardWithin {
		return closures.AircraftSeen{}, false
	}
	site := earth.FrameAt(skerry)
	there := earth.FrameAt(earth.FromECEF(site.ECEF(x)))
	// Errors are stated in the aircraft's own horizontal and vertical.
	p := earth.FromECEF(there.ECEF(off.Add(r3.Vector{Z: up})))
	own := there.Turn(site.TurnBack(v)).Add(slip)
	return closures.AircraftSeen{
		Source: source, Said: said, Aircraft: f.address, Located: true, Position: p, AltitudeFrom: closures.AboveEllipsoid,
		Speed: geometry.Speed(math.Hypot(own.X, own.Y)), Track: s1.Angle(math.Mod(math.Atan2(own.X, own.Y)+2*math.Pi, 2*math.Pi)), Climb: geometry.Speed(own.Z + rise),
		Error: geometry.Length(horizontal), VerticalError: geometry.Length(vertical), VelocityError: geometry.Speed(speed), VerticalVelError: geometry.Speed(climb),
	}, true
}
