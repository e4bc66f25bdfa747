package encounter

import "beamward/geometry"

// Motion bounds how an aircraft can move: assumption (M) of the package
// comment, about the aircraft's own vertical. A larger value never makes a
// reach smaller for a report that agrees with it.
type Motion struct {
	// HorizontalAcceleration bounds the horizontal acceleration: 22 m/s² is a
	// turn of 2.4 g, more than a civil aircraft makes outside aerobatics.
	HorizontalAcceleration geometry.Acceleration
	// VerticalAcceleration bounds the rate of change of the climb rate.
	VerticalAcceleration geometry.Acceleration
	// Speed bounds the horizontal speed over ground, wind included.
	Speed geometry.Speed
	// Climb bounds the climb and the descent rate.
	Climb geometry.Speed
}

// Civil returns the default bounds for civil traffic. Published encounter
// models keep within them one by one (600 kt is 309 m/s, 5000 ft/min is
// 25.4 m/s), but for the extreme corners of their tables: 8°/s at 600 kt, and
// the 6000 ft/min (30.5 m/s) that some terminal models allow.
func Civil() Motion {
	return Motion{HorizontalAcceleration: 22, VerticalAcceleration: 4, Speed: 350, Climb: 30}
}

func (m *Motion) valid() bool {
	ah, az, vh, vz := float64(m.HorizontalAcceleration), float64(m.VerticalAcceleration), float64(m.Speed), float64(m.Climb)
	return geometry.Finite(ah, az, vh, vz) && ah >= 0 && az >= 0 && vh >= 0 && vz >= 0
}

// HardHorizontal turns a horizontal accuracy stated as a radius that holds
// 95 % of the errors into a bound to be used as a hard one.
//
// A circular normal error of deviation σ exceeds r with the chance
// exp(-r²/2σ²). The 95 % radius is r95 = σ sqrt(-2 ln 0.05) = 2.4477 σ; the
// radius exceeded once in 10⁷ is σ sqrt(-2 ln 10⁻⁷) = 5.6777 σ, which is
// 2.3196 r95. With the factor 2.32 the chance is 0.05^(2.32²) = 9.9e-8. The
// bound holds as far as errors are normal; a heavier tail exceeds it more
// often, and no factor mends that.
func HardHorizontal(r95 geometry.Length) geometry.Length { return 2.32 * r95 }

// HardVertical does the same for an error along one line. There 95 % are
// within 1.9600 σ and all but 10⁻⁷ within 5.3267 σ: a factor of 2.718, taken
// as 2.72. The factor of the plane would leave 5.4e-6.
func HardVertical(h95 geometry.Length) geometry.Length { return 2.72 * h95 }

// HardSpeed is HardHorizontal for the error of a horizontal velocity.
func HardSpeed(r95 geometry.Speed) geometry.Speed { return 2.32 * r95 }

// HardClimb is HardVertical for the error of a climb rate.
func HardClimb(h95 geometry.Speed) geometry.Speed { return 2.72 * h95 }
