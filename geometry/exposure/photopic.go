package exposure

import (
	"fmt"
	"math"

	"beamward/geometry"
)

// Visible is the range of wavelengths answered for, ends included.
const (
	VisibleFrom  geometry.Length = 400e-9
	VisibleUntil geometry.Length = 700e-9
)

// sensitivity is a point of the photopic luminous efficiency function.
type sensitivity struct{ nanometre, v float64 }

// photopic returns the CIE 1924 photopic luminous efficiency function V(λ) in
// its usual steps of 5 nm (CIE 18.2, table 1), with some points more from the
// 1 nm table where guide star and other common lasers are. Some
// points were read in the 1 nm table, as the tests say; the others are from
// memory, and their sum agrees with the integral of V, 106.857 nm, to its last
// digit.
func photopic() []sensitivity {
	return []sensitivity{
		{400, 0.000396}, {405, 0.00064}, {410, 0.00121}, {415, 0.00218}, {420, 0.0040},
		{425, 0.0073}, {430, 0.0116}, {435, 0.01684}, {440, 0.0230}, {445, 0.0298},
		{450, 0.0380}, {455, 0.0480}, {460, 0.0600}, {465, 0.0739}, {470, 0.09098},
		{475, 0.1126}, {480, 0.13902}, {485, 0.1693}, {488, 0.1912735}, {490, 0.20802},
		{495, 0.2586}, {500, 0.3230}, {505, 0.4073}, {507, 0.4443096}, {510, 0.5030},
		{514, 0.5869653}, {515, 0.6082}, {520, 0.7100}, {525, 0.7932}, {530, 0.8620},
		{532, 0.8849624}, {535, 0.91485}, {540, 0.9540}, {545, 0.9803}, {550, 0.9949501},
		{555, 1}, {560, 0.9950}, {565, 0.9786}, {570, 0.9520}, {575, 0.9154},
		{577, 0.8982772}, {580, 0.8700}, {585, 0.8163}, {588, 0.7811920}, {589, 0.7691547},
		{590, 0.7570}, {595, 0.6949}, {600, 0.6310}, {605, 0.5668}, {610, 0.5030},
		{615, 0.4412}, {620, 0.3810}, {625, 0.3210}, {630, 0.2650}, {633, 0.2353344},
		{635, 0.2170}, {640, 0.1750}, {645, 0.1382}, {650, 0.1070}, {655, 0.0816},
		{660, 0.0610}, {665, 0.04458}, {670, 0.0320}, {675, 0.0232}, {680, 0.0170},
		{685, 0.01192}, {690, 0.00821}, {695, 0.005723}, {700, 0.004102},
	}
}

// Photopic returns how bright light of a wavelength looks by day for its power,
// against that of 555 nm: the visual correction factor of FAA AC 70-1. Between
// the points of its table it is not below the CIE function, and above it by no
// more than a straight line is over 5 nm: under 1 % from 450 to 650 nm, up to 5 %
// beyond. The line is raised where the curve bulges, by what its second
// differences say and half as much again, but to no more than the higher point.
func Photopic(wavelength geometry.Length) (float64, error) {
	if !visible(wavelength) {
		return 0, refused(wavelength)
	}
	return interpolate(photopic(), float64(wavelength)*1e9), nil
}

// visible reports whether a wavelength is answered for.
func visible(wavelength geometry.Length) bool {
	return wavelength >= VisibleFrom-same*1e-9 && wavelength <= VisibleUntil+same*1e-9
}

func refused(wavelength geometry.Length) error {
	return fmt.Errorf("a wavelength of %.6g nm is outside the 400 to 700 nm that the exposure limits here are for: ask the laser safety officer", float64(wavelength)*1e9)
}

// same is how near, in nanometres, a wavelength is to a point to be it.
const same = 1e-6

// interpolate bounds the function of the table from above at x, which lies
// within it.
func interpolate(table []sensitivity, x float64) float64 {
	i := 1
	for i < len(table)-1 && table[i].nanometre < x-same {
		i++
	}
	low, high := table[i-1], table[i]
	switch {
	case math.Abs(x-low.nanometre) <= same:
		return low.v
	case math.Abs(x-high.nanometre) <= same:
		return high.v
	}
	bend := 0.0 // the most that the slope falls a nanometre, about either end
	for _, k := range []int{i - 1, i} {
		if k > 0 && k < len(table)-1 {
			a, b, c := table[k-1], table[k], table[k+1]
			before := (b.v - a.v) / (b.nanometre - a.nanometre)
			after := (c.v - b.v) / (c.nanometre - b.nanometre)
			bend = max(bend, 2*(before-after)/(c.nanometre-a.nanometre))
		}
	}
	u, w := x-low.nanometre, high.nanometre-x
	line := (low.v*w + high.v*u) / (u + w)
	return min(line+1.5*bend*u*w/2, max(low.v, high.v))
}
