package geometry

import (
	"math"

	"github.com/golang/geo/s1"
)

// Profile is a Gaussian beam: how wide it is along its way. Its radii are
// where the irradiance has fallen to 1/e² of the peak.
//
// The beam leaves through an aperture with a wavefront whose centre of
// curvature lies Focus away. With W half the aperture, the radius w at a
// distance s is
//
//	w(s)² = W² (1 - s/F)² + s² (θ² + σ²)   θ = M² λ / (π W)
//
// which is the Gaussian beam of Siegman, Lasers, ch. 17, with the quality M²
// of ISO 11146-1, and the seeing σ added in quadrature. It takes no account of
// what the aperture's rim cuts off.
type Profile struct {
	// Aperture is the 1/e² diameter of the beam where it leaves.
	Aperture Length
	// Focus is the distance along the beam at which it is focused, +Inf for a
	// beam that leaves collimated.
	Focus Length
	// Wavelength is in metres.
	Wavelength Length
	// Quality is M², 1 for a perfect beam.
	Quality float64
	// Seeing is the full width at half maximum by which the air broadens the
	// beam. Zero is the safe side for irradiance, the largest expected for
	// how far the beam's light reaches.
	Seeing s1.Angle
}

// fwhm is the full width at half maximum of a Gaussian over its 1/e² radius,
// √(2 ln 2).
const fwhm = 1.1774100225154747

// Valid reports whether p describes a beam. Every answer of one that does not
// is NaN or says so.
func (p Profile) Valid() bool {
	return Finite(float64(p.Aperture), float64(p.Wavelength), p.Quality, p.Seeing.Radians()) &&
		p.Aperture > 0 && p.Focus > 0 && p.Wavelength > 0 && p.Quality >= 1 && p.Seeing >= 0
}

// spread returns the half angles by which the beam widens: of diffraction, and
// of diffraction and seeing together.
func (p Profile) spread() (diffraction, all float64) {
	diffraction = p.Quality * float64(p.Wavelength) / (math.Pi * float64(p.Aperture) / 2)
	return diffraction, math.Hypot(diffraction, p.Seeing.Radians()/fwhm)
}

// Radius returns the 1/e² radius at a distance along the beam. It is NaN for a
// profile that is not valid or a distance that is negative or NaN. Between two
// distances it is nowhere larger than at the wider of them.
func (p Profile) Radius(at Length) Length {
	if !p.Valid() || !(at >= 0) {
		return Length(math.NaN())
	}
	_, spread := p.spread()
	return Length(math.Hypot(float64(p.Aperture)/2*(1-float64(at/p.Focus)), float64(at)*spread))
}

// RayleighLength returns π W² / (M² λ): the distance at which a beam that left
// collimated has widened by the square root of 2. Seeing is left out.
func (p Profile) RayleighLength() Length {
	if !p.Valid() {
		return Length(math.NaN())
	}
	diffraction, _ := p.spread()
	return Length(float64(p.Aperture) / 2 / diffraction)
}

// Divergence returns the full 1/e² angle of the beam far beyond its focus.
func (p Profile) Divergence() s1.Angle {
	if !p.Valid() {
		return s1.Angle(math.NaN())
	}
	_, spread := p.spread()
	return s1.Angle(2 * math.Hypot(float64(p.Aperture)/2/float64(p.Focus), spread))
}

// Waist returns the distance at which the beam is narrowest. Diffraction and
// seeing bring it nearer than Focus; a collimated beam has it at the aperture.
func (p Profile) Waist() Length {
	if !p.Valid() {
		return Length(math.NaN())
	}
	_, spread := p.spread()
	converging := float64(p.Aperture) / 2 / float64(p.Focus)
	return Length(float64(p.Aperture) / 2 * converging / (converging*converging + spread*spread))
}

// Narrower returns the distances between which the beam is no wider than
// radius, ends included; near is zero where it leaves the aperture so. Where it
// is nowhere so narrow ok is false and both are zero; where the profile is not
// valid or the radius is NaN ok is false and both are NaN.
func (p Profile) Narrower(radius Length) (near, far Length, ok bool) {
	waist := p.Waist()
	least := p.Radius(waist)
	switch {
	case radius >= least:
		// About its least, w² grows by the square of the far half angle.
		reach := Length(math.Sqrt(float64(radius-least)*float64(radius+least)) / (float64(p.Divergence()) / 2))
		return max(waist-reach, 0), waist + reach, true
	case radius < least:
		return 0, 0, false
	}
	return Length(math.NaN()), Length(math.NaN()), false
}

// FWHM returns the full width at half maximum of a beam of a 1/e² radius.
func FWHM(radius Length) Length { return radius * fwhm }

// PeakIrradiance returns the irradiance on the axis, in W/m², of a beam of a
// power in watts where its 1/e² radius is radius: 2P/(πw²).
func PeakIrradiance(power float64, radius Length) float64 {
	return 2 * power / (math.Pi * float64(radius) * float64(radius))
}

// Enclosed returns the part of a beam's power within r of its axis where its
// 1/e² radius is radius: 1 - exp(-2r²/w²).
func Enclosed(r, radius Length) float64 {
	return -math.Expm1(-2 * float64(r/radius) * float64(r/radius))
}
