package modes

import (
	"math"
	"testing"

	"beamward/closures"
)

// Aircraft that turn, climb and speed up within the bounds, that state the
// worst quality which their errors allow, and whose frames get lost: each
// report holds the truth within its bounds, in position, height and velocity.
func TestReportsHoldTheTruth(t *testing.T) {
	g := random()
	reports := 0
	for range 150 {
		l, c := newListener(t), near(g)
		c.address = 0xA0B1C2
		nacp := uint8(6 + g.IntN(6))
		c.tc = map[uint8]uint8{6: 13, 7: 12}[nacp] // no worse than the accuracy
		if c.tc == 0 {
			c.tc = 11
		}
		nacv := uint8(g.IntN(5))
		status := Status{Version: 2, NACp: nacp, SIL: uint8(g.IntN(4)), GVA: uint8(g.IntN(3))}
		above := float64(g.IntN(3000) - 1500) // ft, of the ellipsoid's height over the pressure altitude
		climb := 0.0                          // m/s
		const dt = 0.1
		for step := range 600 {
			turn := 0.07 * math.Sin(float64(step)/40) // rad/s: 20 m/s² at the most, 283 m/s
			sin, cos := math.Sincos(turn * dt)
			c.north, c.east = c.north*cos-c.east*sin, c.north*sin+c.east*cos
			climb = max(-25, min(25, climb+4*dt*(2*g.Float64()-1)))
			if c.feet > 40000 && climb > 0 || c.feet < 1000 && climb < 0 {
				climb = -climb / 4
			}
			c.feet += climb * dt / foot
			c.fly(dt)
			l.after(dt)
			if g.IntN(4) == 0 {
				continue
			}
			switch step % 5 {
			case 0:
				// The error is within what the quality states as 95 %.
				was := *c
				e := accuracies[nacp] * g.Float64()
				sin, cos := math.Sincos(2 * math.Pi * g.Float64())
				c.lat += e * sin / 111195
				c.lon += e * cos / 111195 / math.Cos(c.lat*math.Pi/180)
				s, ok := l.hear(c.position())
				c.lat, c.lon = was.lat, was.lon
				if !ok || !s.Located {
					continue
				}
				reports++
				where, got := c.where(), placeOf(s)
				if away := got.from(&where); !(away <= float64(s.Error)) {
					t.Fatalf("%v m away, error %v", away, s.Error)
				}
				switch height := c.feet * foot; s.AltitudeFrom {
				case closures.PressureAltitude:
					if math.Abs(float64(s.Position.Height)-height) > 13*foot {
						t.Fatalf("pressure altitude %v, not %v", s.Position.Height, height)
					}
				case closures.AboveEllipsoid:
					// The difference drifts as it climbs, by less than a tenth.
					if off := math.Abs(float64(s.Position.Height) - height - above*foot); !(off <= float64(s.VerticalError)) {
						t.Fatalf("height %v m off, error %v", off, s.VerticalError)
					}
				default:
					t.Fatalf("no altitude: %+v", s)
				}
				if !math.IsNaN(float64(s.Speed)) {
					sin, cos := math.Sincos(s.Track.Radians())
					if off := math.Hypot(float64(s.Speed)*sin-c.east, float64(s.Speed)*cos-c.north); !(off <= float64(s.VelocityError)) {
						t.Fatalf("velocity %v m/s off, error %v", off, s.VelocityError)
					}
				}
				if !math.IsNaN(float64(s.Climb)) {
					if off := math.Abs(float64(s.Climb) - climb); !(off <= float64(s.VerticalVelError)) {
						t.Fatalf("climb %v m/s off, error %v", off, s.VerticalVelError)
					}
				}
			case 2:
				e := 20.0
				if nacv > 0 {
					e = speeds[nacv][0]
				}
				sin, cos := math.Sincos(2 * math.Pi * g.Float64())
				east, north := int(math.Round((c.east+e*cos)/knot)), int(math.Round((c.north+e*sin)/knot))
				l.hear(squitterOf(df17, c.address, velocityMessage(east, north, 64*int(math.Round(climb/fpm/64)), 25*int(math.Round(above/25)), nacv, g.IntN(2) == 0)))
			case 4:
				if step%50 == 4 {
					l.hear(squitterOf(df17, c.address, statusMessage(status)))
				}
			}
		}
	}
	if reports < 5000 {
		t.Errorf("only %d reports", reports)
	}
}
