package exposure

import (
	"math"

	"beamward/geometry"

	"github.com/golang/geo/s1"
)

// FarField is a beam as the standards reckon with it: a cone from an aperture.
type FarField struct {
	Power Power
	// Diameter of the beam at the aperture and Divergence, its full angle, both
	// where the irradiance is 1/e of the peak (ANSI Z136.1). With these the
	// formulas give the irradiance on the axis of a Gaussian beam.
	Diameter   geometry.Length
	Divergence s1.Angle
}

// FarFieldOf returns the cone of a profile, whose widths are at 1/e².
func FarFieldOf(power Power, p geometry.Profile) FarField {
	return FarField{Power: power, Diameter: p.Aperture / math.Sqrt2, Divergence: p.Divergence() / math.Sqrt2}
}

// DistanceTo returns the distance beyond which the irradiance is below a limit,
// 0 where it never is above:
//
//	(√(4 P / (π E)) - a) / φ
//
// With the MPE it is the nominal ocular hazard distance (ANSI Z136.1, App. B;
// IEC 60825-14; clause numbers from memory); with a = 0 and the limits of
// Levels, the distances of FAA AC 70-1B, equations 70-1.1 to 70-1.5, in metres
// (from a digest of its appendices; its feet are rounded, 0.026 % short).
// Subtracting the aperture for beams wider than 1 cm is ANSI Z136.6, App. B, to
// which it refers. A beam that is not valid gives NaN.
func (f FarField) DistanceTo(limit Irradiance) geometry.Length {
	if !(f.Power >= 0 && f.Diameter >= 0 && f.Divergence >= 0 && limit > 0) {
		return geometry.Length(math.NaN())
	}
	over := math.Sqrt(4*float64(f.Power)/(math.Pi*float64(limit))) - float64(f.Diameter)
	if over <= 0 {
		return 0
	}
	return geometry.Length(over / f.Divergence.Radians())
}

// Level is an irradiance that a beam must not exceed somewhere.
type Level struct {
	Name string
	// Irradiance is the limit of the beam's own irradiance, the photopic
	// correction in it.
	Irradiance Irradiance
	Clause     string
}

// The effective irradiances of FAA AC 70-1B's zones, the correction not in them:
// 100 µW/cm², 5 µW/cm² and 50 nW/cm² (from a digest of its appendices A to C).
const (
	Sensitive Irradiance = 1
	Critical  Irradiance = 0.05
	LaserFree Irradiance = 5e-4
)

// Levels returns the MPE and the three levels of visual interference for light
// of a photopic efficiency, from the highest. A level of interference is never
// above the MPE, however little of the light is seen.
func Levels(mpe Limit, photopic float64) []Level {
	level := func(name string, effective Irradiance, clause string) Level {
		return Level{name, min(effective/Irradiance(photopic), mpe.Irradiance), clause}
	}
	return []Level{
		{"eye hazard (MPE)", mpe.Irradiance, mpe.Rule.String()},
		level("sensitive: afterimages", Sensitive, "FAA AC 70-1B, sensitive flight zone, 100 µW/cm²"),
		level("critical: glare", Critical, "FAA AC 70-1B, critical flight zone, 5 µW/cm²"),
		level("laser-free: distraction", LaserFree, "FAA AC 70-1B, laser-free flight zone, 50 nW/cm²"),
	}
}
