// Package exposure computes the numbers about a laser beam that a laser safety
// officer and an aviation authority ask for: the maximum permissible exposure
// (MPE) of the eye, the nominal ocular hazard distance (NOHD), and the
// distances beyond which the beam is too dim to disturb a pilot's sight, for
// the far field and for a beam that is focused high up, whose irradiance rises
// before it falls.
//
// It covers what a guide star's beam is: visible light of 400 to 700 nm,
// continuous or in pulses of a nanosecond or more, seen as a small source by
// the naked eye for 10 s at most. Anything else is refused, never estimated.
// Irradiances are those on the axis of a Gaussian beam in clear air.
//
// Where sources differ, the zero value of a setting takes the stricter one.
// Each formula names its clause; where this is not the standard's own text the
// comment says so. The results are for planning: Cautions says what they leave
// out, and belongs on every output.
package exposure
