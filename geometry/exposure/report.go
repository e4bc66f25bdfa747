package exposure

import (
	"errors"
	"fmt"
	"math"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/s1"
)

// Setup is a beam to report on.
type Setup struct {
	Power Power
	// Profile is the beam. Its Seeing is left out, the safe side here.
	Profile geometry.Profile
	// FocusHeight, where not 0, is the height above the ellipsoid at which the
	// beam is focused at every elevation; the profile's Focus is then not used.
	FocusHeight geometry.Length
	// Site is the height of the launch above the ellipsoid.
	Site geometry.Length
	// Elevations are those to report, above 0 and up to the zenith.
	Elevations []s1.Angle
	// Pulse, Repetition, Exposure and Edition are as in Emission. A beam with
	// pulses needs its repetition; Power is the average.
	Pulse      time.Duration
	Repetition float64
	Exposure   time.Duration
	Edition    Edition
}

// Report is all the numbers about one beam. Distances are for the naked eye in
// clear air; who rounds them rounds Until and Distance up and From down.
type Report struct {
	Wavelength geometry.Length
	Power      Power
	Limit      Limit
	Photopic   float64
	Levels     []Level
	Elevations []AtElevation
	// Cautions are to be shown wherever any of the numbers is.
	Cautions []string
}

// AtElevation is the beam at one elevation.
type AtElevation struct {
	Elevation s1.Angle
	// Focus is the distance at which the beam is focused, +Inf if collimated.
	Focus geometry.Length
	// Waist is where the beam is narrowest, and Peak the irradiance there, the
	// highest anywhere.
	Waist geometry.Length
	Peak  Irradiance
	Far   FarField
	// Reaches has one for each of the report's levels, in their order.
	Reaches []Reach
}

// Reach is how far a beam is at or above a level.
type Reach struct {
	// Stretch is that of the beam as it narrows and widens.
	Stretch
	// FarField is the standards' distance for a cone (FarField.DistanceTo).
	FarField geometry.Length
	// Distance is the slant range to keep: the larger of Until and FarField. The
	// cone's formula alone is too short for a beam that is focused.
	Distance geometry.Length
	// Horizontal is Distance cos(el) (FAA AC 70-1B, equation 70-1.6), which is
	// above the distance along the ground; Height is that of the end of
	// Distance above the ellipsoid, with the Earth's curvature (above equation
	// 70-1.7), and FromHeight that of Stretch.From.
	Horizontal, Height, FromHeight geometry.Length
}

// Assess returns the report on a beam. It refuses a setup that it has no limits
// or formulas for.
func Assess(s Setup) (Report, error) {
	if s.FocusHeight != 0 {
		s.Profile.Focus = s.FocusHeight - s.Site
	}
	s.Profile.Seeing = 0
	switch {
	case !(s.Power > 0) || !geometry.Finite(float64(s.Power)):
		return Report{}, errors.New("a beam's power must be above 0 W")
	case !(s.Site >= -10e3 && s.Site <= 100e3):
		return Report{}, fmt.Errorf("a launch at a height of %.0f m is not on Earth", float64(s.Site))
	case s.FocusHeight != 0 && !(s.FocusHeight > s.Site && s.FocusHeight <= 1000e3):
		return Report{}, fmt.Errorf("a focus at a height of %.0f m is not above the launch at %.0f m and within 1000 km", float64(s.FocusHeight), float64(s.Site))
	case !s.Profile.Valid():
		return Report{}, errors.New("the beam's aperture, focus, wavelength and quality do not describe a beam: they must be above 0, and the quality 1 or more")
	case s.Pulse > 0 && s.Repetition == 0:
		return Report{}, errors.New("a beam with pulses needs the pulses a second")
	case len(s.Elevations) == 0:
		return Report{}, errors.New("a report needs an elevation")
	}
	mpe, err := MPE(Emission{Wavelength: s.Profile.Wavelength, Pulse: s.Pulse, Repetition: s.Repetition, Exposure: s.Exposure, Edition: s.Edition})
	if err != nil {
		return Report{}, err
	}
	photopic, err := Photopic(s.Profile.Wavelength)
	if err != nil {
		return Report{}, err
	}
	r := Report{
		Wavelength: s.Profile.Wavelength, Power: s.Power, Limit: mpe, Photopic: photopic,
		Levels: Levels(mpe, photopic), Cautions: Cautions(),
	}
	for _, el := range s.Elevations {
		if !(el > 0 && el <= math.Pi/2+1e-12) {
			return Report{}, fmt.Errorf("an elevation of %.6g° is not above 0° and up to 90°", el.Degrees())
		}
		r.Elevations = append(r.Elevations, s.at(el, r.Levels))
	}
	return r, nil
}

// at returns the beam of a valid setup at one elevation.
func (s Setup) at(el s1.Angle, levels []Level) AtElevation {
	if s.FocusHeight != 0 {
		s.Profile.Focus = earth.ShellRange(s.Site, s.FocusHeight, el)
	}
	beam := Along{s.Power, s.Profile}
	a := AtElevation{
		Elevation: el, Focus: s.Profile.Focus, Waist: s.Profile.Waist(),
		Peak: beam.Irradiance(s.Profile.Waist()), Far: FarFieldOf(s.Power, s.Profile),
	}
	for _, l := range levels {
		reach := Reach{Stretch: beam.Above(l.Irradiance), FarField: a.Far.DistanceTo(l.Irradiance)}
		reach.Distance = max(reach.Until, reach.FarField)
		reach.Horizontal = reach.Distance * geometry.Length(math.Cos(el.Radians()))
		reach.Height = heightAt(s.Site, el, reach.Distance)
		reach.FromHeight = heightAt(s.Site, el, reach.From)
		a.Reaches = append(a.Reaches, reach)
	}
	return a
}

// Cautions returns what must be said with every number of this package.
func Cautions() []string {
	return []string{
		"For planning only. Defer to the laser safety officer and to the aviation authority: they decide, from the standards' own texts.",
		"The naked eye only. Binoculars and telescopes gather more light, and every distance grows with them.",
		"The exposure limit counts on an eye that turns away within the stated time, and on a small source of 400 to 700 nm.",
		"Clear air that takes nothing away. The air's unrest can make the beam brighter than this for moments.",
		"A Gaussian beam, its axis only. Light scattered, reflected, or beside the beam, skin, fire, and work at the launch are not covered.",
		"The photopic correction is that of an eye by day: one used to the dark is more sensitive to blue and green light.",
	}
}
