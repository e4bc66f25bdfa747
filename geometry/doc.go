// Package geometry holds what is true of shapes and motion: quantities with
// their units as types, directions, cones, boxes of azimuth and elevation,
// and the profile of a laser beam.
//
// Directions are unit vectors in a local frame with X east, Y north and Z up;
// azimuth runs from north through east. Every shape answers with a signed
// margin, positive when clear; a touch is a hit, so a margin of zero is not
// clear. The package and all below it are pure: no clock, no input or output,
// no state.
package geometry
